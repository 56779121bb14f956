"""What a decision keeps of the screen it was made on: numbers in SI and the sentences as they were read."""


def screen_of(plan, today, leave, where, budget, now):
    """Return the sag page's answer, intervals, rates, places and time as plain values for the record."""
    screen = {"at": now.isoformat(timespec="seconds"), "plan_version": plan.number if plan else None}
    if not today.ready:
        return screen | {"missing": list(today.missing)}
    estimate = today.estimate
    return screen | {
        "values_used": len(today.counted),
        "stations_read": today.stations_read,
        "answer": {
            "word": leave.word,
            "headline": leave.headline,
            "missing": list(leave.missing),
            "p_between": _rounded(leave.answer.p_between),
            "regret_mg_l": _rounded(leave.answer.regret_mg_l),
        },
        "intervals": {
            "lowest_mg_l": _interval(estimate.critical_do_mg_l),
            "place_km": _interval(estimate.critical_km),
            "travel_time_h": _interval(estimate.critical_travel_time_h),
        },
        "rates": {one.key: {**_interval(one), "planned": _rounded(one.planned)} for one in estimate.rates},
        "fit": leave.fit,
        "trade": {one.key: {"holds": one.holds, "said": one.said} for one in leave.trade},
        "disagreement": leave.disagreement,
        "closing": [{"done": one.done, "says": one.says} for one in leave.closing],
        "places": [_place(one) for one in (*where.offers, *where.breaks)],
        "declined": list(where.declined),
        "time": {"remaining_min": _rounded(budget.remaining_min), "because": budget.because},
    }


def _place(offer):
    return {
        "place": offer.place,
        "distance_km": _rounded(offer.distance_km),
        "code": offer.code,
        "why": offer.why,
        "gain": _rounded(offer.gain),
        "drive_min": offer.drive_min,
        "parcel_at": offer.parcel_at.isoformat(timespec="seconds") if offer.parcel_at else None,
        "allowed": offer.allowed,
        "budget": offer.budget,
    }


def _interval(found):
    return {name: _rounded(getattr(found, name)) for name in ("low", "median", "high")}


def _rounded(value):
    return None if value is None else round(float(value), 4)
