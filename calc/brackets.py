"""The trade's own rule for a bracketed low point, clause by clause, from readings alone."""

from dataclasses import dataclass

import numpy as np

from calc.travel import travel_time_h

_LEAST_U_MG_L = 0.2
_RISE_MG_L, _RISE_U = 0.3, 1.5
_GAP_SHARE = 0.25
_STEP_MG_L = 1.0
_DIFFERENCE_MG_L, _DIFFERENCE_U = 0.5, 2.0


@dataclass(frozen=True)
class Clause:
    """One clause of the rule: key "a" to "f", holds True, False or None where it is not known, and a sentence."""

    key: str
    holds: bool | None
    said: str


@dataclass(frozen=True)
class BracketCheck:
    """Whether the lowest station is bracketed: all clauses hold, or are not known. u is the smallest difference that
    counts [mg/L].

    lowest_km: the lowest station; between_km: the stations within u of it, from first to last. flat: the stations about
    the lowest differ by less than 1.5 u. add: where the rule asks for another station, each a sentence.
    """

    bracketed: bool
    clauses: tuple[Clause, ...]
    u_mg_l: float
    lowest_km: float | None
    lowest_mg_l: float | None
    between_km: tuple[float, float] | None
    flat: bool
    add: tuple[str, ...]


def bracket_check(
    plan,
    stations_km,
    do_mg_l,
    *,
    replicate_spread_mg_l=0.0,
    check_error_mg_l=0.0,
    section_checked=None,
    replicated=None,
    predicted_mg_l=None,
):
    """Return the BracketCheck of readings along a river.

    Parameters
    ----------
    plan : River
        For travel times, inflows and weirs.
    stations_km, do_mg_l : array_like, shape (m,)
        Readings; several at one distance are averaged, NaN is missing, those above the outfall are left out.
    replicate_spread_mg_l, check_error_mg_l : float
        Spread of replicates and error at the last meter check; u is the largest of these and 0.2 mg/L.
    section_checked, replicated : bool, optional
        Whether the lowest station has a section check, and a replicate.
    predicted_mg_l : array_like, shape (m,), optional
        Predictions at the readings, for the rule on adjacent differences.

    Notes
    -----
    Bracketed when the lowest station (a) has a station upstream and two downstream, (b) those lie at least
    max(0.3 mg/L, 1.5 u) higher, (c) the last two downstream rise in order, (d) the gap on each side is at most a
    quarter of its travel time from the outfall, (e) no inflow or weir between it and the rise explains the rise, and
    (f) it has a section check and a replicate.
    """
    u = max(_LEAST_U_MG_L, replicate_spread_mg_l, check_error_mg_l)
    outfall_km = plan.from_km if plan.outfall_km is None else plan.outfall_km
    km, do, predicted = _stations(plan, outfall_km, stations_km, do_mg_l, predicted_mg_l)
    if not len(km):
        clauses = (Clause("a", False, "no station below the outfall has a reading"),)
        return BracketCheck(False, clauses, u, None, None, None, False, ())
    low = int(do.argmin())
    rise = max(_RISE_MG_L, _RISE_U * u)
    hours = np.atleast_1d(travel_time_h(plan, km)) - float(travel_time_h(plan, outfall_km))
    clauses = (
        _enough(low, len(km)),
        _higher(do, low, rise),
        _rising(do, low),
        _gaps(hours, low),
        _explained(plan, km, do, low, rise),
        _checked(section_checked, replicated),
    )
    close = km[do <= do[low] + u]
    return BracketCheck(
        bracketed=all(clause.holds is not False for clause in clauses),
        clauses=clauses,
        u_mg_l=u,
        lowest_km=float(km[low]),
        lowest_mg_l=float(do[low]),
        between_km=(float(close.min()), float(close.max())),
        flat=_flat(do, low, u),
        add=_additions(km, do, hours, predicted, low, u),
    )


def _stations(plan, outfall_km, stations_km, do_mg_l, predicted_mg_l):
    """Return distance, oxygen and prediction of each station below the outfall, upstream first."""
    km, do = (np.atleast_1d(np.asarray(values, dtype=float)) for values in (stations_km, do_mg_l))
    predicted = np.full(len(km), np.nan) if predicted_mg_l is None else np.asarray(predicted_mg_l, dtype=float)
    valid = np.isfinite(km) & np.isfinite(do)
    valid[valid] &= (km[valid] >= outfall_km) & (km[valid] <= plan.to_km)
    places, row = np.unique(km[valid], return_inverse=True)
    count = np.maximum(np.bincount(row, minlength=len(places)), 1)
    means = [np.bincount(row, weights=values[valid], minlength=len(places)) / count for values in (do, predicted)]
    return places, *means


def _enough(low, count):
    lacks = ["a station upstream"] if low < 1 else []
    below = count - 1 - low
    if below < 2:
        lacks.append("two stations downstream" if below == 0 else "a second station downstream")
    said = "the lowest station has one upstream and two downstream" if not lacks else f"it lacks {' and '.join(lacks)}"
    return Clause("a", not lacks, said)


def _higher(do, low, rise):
    """The station upstream and one downstream are clearly higher; some may have to be well away, for sags are flat."""
    sides = [
        name
        for name, part in (("upstream", do[:low]), ("downstream", do[low + 1 :]))
        if not (part >= do[low] + rise).any()
    ]
    if not sides:
        return Clause("b", True, f"stations on both sides are at least {rise:.2f} mg/L higher")
    return Clause("b", False, f"no station {' or '.join(sides)} is at least {rise:.2f} mg/L higher")


def _rising(do, low):
    last = do[max(low + 1, len(do) - 2) :]
    if len(last) < 2:
        return Clause("c", False, "two stations downstream that rise in order are missing")
    rises = bool(last[1] > last[0])
    return Clause("c", rises, f"the last two stations downstream {'rise' if rises else 'do not rise'} in order")


def _gaps(hours, low):
    """The gap on each side of the lowest station is small against its travel time."""
    limit = _GAP_SHARE * hours[low]
    gaps = np.abs([hours[at] - hours[low] for at in (low - 1, low + 1) if 0 <= at < len(hours)])
    wide = bool((gaps > limit + 1e-9).any())
    said = f"the gaps beside the lowest station are {'not all' if wide else 'all'} within {limit:.1f} h of travel"
    return Clause("d", not wide, said)


def _explained(plan, km, do, low, rise):
    """Nothing that joins between the lowest station and the rise explains it."""
    risen = [at for at in range(low + 1, len(km)) if do[at] >= do[low] + rise]
    until = km[risen[0]] if risen else km[-1]
    between = [
        feature.name or "an inflow or weir"
        for feature in (*plan.inflows, *plan.weirs)
        if km[low] < feature.distance_km <= until and getattr(feature, "kind", "") != "withdrawal"
    ]
    if between:
        return Clause(
            "e", False, f"recovery is not proven: {', '.join(between)} lies between the low point and the rise"
        )
    return Clause("e", True, "nothing joins between the low point and the rise")


def _checked(section_checked, replicated):
    lacks = [name for name, done in (("section check", section_checked), ("replicate", replicated)) if done is False]
    if lacks:
        return Clause("f", False, f"the lowest station lacks a {' and a '.join(lacks)}")
    if section_checked and replicated:
        return Clause("f", True, "the lowest station has a section check and a replicate")
    return Clause("f", None, "whether the lowest station has a section check and a replicate is not known")


def _flat(do, low, u):
    """The lowest station and its neighbours on both sides differ by less than counts."""
    central = do[max(low - 1, 0) : low + 2]
    return bool(0 < low < len(do) - 1 and central.max() - central.min() < 1.5 * u)


def _additions(km, do, hours, predicted, low, u):
    """Return where the rule asks for another station."""
    asked = []
    if low in (0, len(km) - 1) and len(km) > 0:
        side = "downstream" if low == len(km) - 1 else "upstream"
        end = "last" if low else "first"
        asked.append(f"The lowest station is the {end}: go on {side} by a quarter to half its travel time.")
    for at in (low - 1, low):
        if 0 <= at < len(km) - 1 and hours[at + 1] - hours[at] > _GAP_SHARE * hours[low] + 1e-9:
            asked.append(f"The gap from {km[at]:.1f} to {km[at + 1]:.1f} km is wide: halve it.")
    steps = np.flatnonzero(np.abs(np.diff(do)) > _STEP_MG_L)
    asked += [
        f"Oxygen steps by more than {_STEP_MG_L:.0f} mg/L from {km[at]:.1f} to {km[at + 1]:.1f} km." for at in steps
    ]
    far = np.abs(do - predicted) > max(_DIFFERENCE_MG_L, _DIFFERENCE_U * u)
    asked += [
        f"Two stations in a row, {km[at]:.1f} and {km[at + 1]:.1f} km, are far from the prediction."
        for at in np.flatnonzero(far[:-1] & far[1:])
    ]
    return tuple(asked)
