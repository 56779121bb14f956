"""What a sag chart says in words: its sentence, its description for who can't see it, and its table."""

from dataclasses import dataclass

from webapp.display import hours, signed


@dataclass(frozen=True)
class Row:
    """A row of the chart's table, as text; what names the row's kind, today is empty without an estimate."""

    what: str
    place: str
    travel_time: str
    predicted: str
    band: str
    today: str
    reading: str
    difference: str


def sentence_of(show, prediction, readings, today=None):
    """Return the chart's numbers in a few words."""
    said = [_today_words(show, today)] if today is not None else []
    return " ".join([*said, _predicted_words(show, prediction), _lowest_words(show, readings)]).strip()


def _today_words(show, today):
    lowest, place = today.estimate.critical_do_mg_l, today.estimate.critical_km
    further = " or further" if today.interval_is_open_below else ""
    return (
        f"Today's sag is lowest with {show.text('oxygen', lowest.median, 1)} at {show.place(place.median)} (90 %: "
        f"{show.number('oxygen', lowest.low, 1)} to {show.text('oxygen', lowest.high, 1)}, "
        f"{between(show, place.low, place.high)}{further})."
    )


def _predicted_words(show, prediction):
    point, interval = prediction.critical, prediction.critical_interval
    band = (
        f"(90 %: {show.number('oxygen', interval.low_mg_l, 1)} to {show.text('oxygen', interval.high_mg_l, 1)}, "
        f"{between(show, interval.low_km, interval.high_km)}{' or further' if interval.open_below else ''})"
    )
    if prediction.never_sags:
        lowest = show.text("oxygen", point.do_mg_l, 1)
        return f"No sag is predicted: oxygen is lowest where the outfall mixes, {lowest} {band}."
    where = f"at {show.place(point.distance_km)}, {hours(point.travel_time_h)} after it"
    if show.distance_rule != "downstream":
        where = f"at {show.place(point.distance_km)}, {hours(point.travel_time_h)} after the outfall"
    if point.anoxic:
        return (
            f"The plan predicts that the river runs out of oxygen {where}, and has none "
            f"from there to {show.place(point.anoxic_to_km)} {band}."
        )
    words = f"Predicted lowest oxygen {show.text('oxygen', point.do_mg_l, 1)} {where} {band}."
    if prediction.still_falling:
        words += " It still falls where the last reach ends, so the true lowest point lies further down."
    return words


def between(show, low_km, high_km):
    """Return a stretch of river in words: "8.1 to 19.0 km", "river mile 34.2 to 29.4"."""
    first, last = (show.number("place", km, 1) for km in (low_km, high_km))
    if show.distance_rule != "downstream":
        return f"{show.place_label().lower()} {first} to {last}"
    return f"{first} to {last} {show.unit_label('place')}"


def lowest_used(readings):
    """Return the lowest reading that counts, or None."""
    return min((one for one in readings if one.state == "used"), key=lambda one: one.do_mg_l, default=None)


def _lowest_words(show, readings):
    lowest = lowest_used(readings)
    return f"Lowest reading so far {show.text('oxygen', lowest.do_mg_l)} at {lowest.label}." if lowest else ""


def description(show, prediction, readings, criterion, today=None):
    """Return what the picture shows, for a screen reader."""
    words = [
        f"Oxygen in mg/L along the river from {show.place(prediction.river.from_km)} to "
        f"{show.place(prediction.river.to_km)}, as the plan predicts it, with a 90 % band."
    ]
    if today is not None:
        words.append("Today's sag, estimated from the readings, is drawn over it with its own 90 % band.")
    if readings:
        words.append(f"{len(readings)} {'reading' if len(readings) == 1 else 'readings'}.")
    if criterion is not None:
        words.append(f"The criterion is {show.text('oxygen', criterion, 1)}.")
    words.append("The same numbers stand in the table below the plot.")
    return " ".join(words)


def rows_of(show, prediction, readings, marked, axis_km, today=None, candidates=()):
    """Return the table's Rows, down the river: the places of the axis, the lowest points, where next, every reading."""
    rows = [(km, 0, "along the river", None) for km, _ in axis_km]
    rows.append((prediction.critical.distance_km, 1, "predicted lowest", None))
    if today is not None:
        rows.append((today.estimate.critical_km.median, 1, "today's lowest", None))
    rows += [(one.distance_km, 3, f"where next, {number}", None) for number, one in enumerate(candidates, start=1)]
    for one in readings:
        what = f"reading at {one.label}" + (", set aside" if one.state != "used" else "")
        what += ", this one" if marked is not None and getattr(one, "id", None) == marked else ""
        rows.append((one.distance_km, 2, what, one.do_mg_l))
    rows.sort(key=lambda row: row[:3])
    predicted = prediction.along([row[0] for row in rows])
    return tuple(
        _row(show, here, today and today.at(km), km, what, do)
        for here, (km, _, what, do) in zip(predicted, rows, strict=True)
    )


def _row(show, here, now, km, what, do_mg_l):
    place = show.number("place", km)
    reading = show.number("oxygen", do_mg_l)
    today = _with_band(show, now) if now else ""
    if here is None:
        return Row(what, place, "–", "–", "–", today, reading, "–")
    return Row(
        what=what,
        place=place,
        travel_time=("\u2212" if here.travel_time_h < 0 else "") + hours(here.travel_time_h),
        predicted=show.number("oxygen", here.do_mg_l),
        band=_band(show, here),
        today=today,
        reading=reading,
        difference="–" if do_mg_l is None else signed(do_mg_l - here.do_mg_l),
    )


def _with_band(show, point):
    return f"{show.number('oxygen', point.do_mg_l)} ({_band(show, point)})"


def _band(show, point):
    return f"{show.number('oxygen', point.low_mg_l, 1)} to {show.number('oxygen', point.high_mg_l, 1)}"
