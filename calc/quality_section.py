"""The cross-section: is the water mixed from bank to bank, is it layered, and how deep to hang the sensor."""

import math
from dataclasses import dataclass

from calc.findings import Finding, exceeds, known, reaches, shown

# Fewer may show that water is not mixed; left, centre and right are needed to show that it is.
_POSITIONS_TO_BE_MIXED = 3
# The lowest point of a profile is left out where the last regular one is within this part of a step of it.
_NEAR_LOWEST = 0.25
# However deep the water and small the step, nobody reads more depths than about this.
_MOST_STEPS = 50


@dataclass(frozen=True)
class SectionPoint:
    """Values at one point of a cross-section; NaN or None where missing.

    position is "left", "centre", "right" looking downstream, or any other name of a vertical; empty where not told.
    do_mg_l [mg/L], water_temp_c [°C], conductance_us_cm [µS/cm at 25 °C]; sensor_depth_m and depth_m are the depths of
    the sensor and of the water. [m]
    """

    position: str
    do_mg_l: float
    water_temp_c: float
    conductance_us_cm: float
    sensor_depth_m: float = math.nan
    depth_m: float = math.nan


@dataclass(frozen=True)
class SectionVerdict:
    """Whether the water of a cross-section is mixed.

    Attributes
    ----------
    mixed : bool or None
        None where too little is known to tell.
    points : int
        How many different positions were compared.
    do_spread, temp_spread : float
        Highest less lowest; NaN where fewer than two are known. [mg/L, °C]
    conductance_spread_percent : float
        Highest less lowest, as a share of the mean. [%]
    says : str
        The verdict as plain sentences.
    """

    mixed: bool | None
    points: int
    do_spread: float
    temp_spread: float
    conductance_spread_percent: float
    says: str


def section_verdict(points, settings, expected_conductance_us_cm=math.nan):
    """Return whether the water is mixed across the section.

    Parameters
    ----------
    points : iterable of SectionPoint
        One visit's points. Several at one position, at other depths or repeated, are averaged first. Points without a
        position are left out.
    settings : Settings
    expected_conductance_us_cm : float
        Conductance of the mix from the mass balance. [µS/cm at 25 °C]

    Returns
    -------
    SectionVerdict
        Mixed when oxygen, temperature and, where measured, conductance at each of three or more positions lie within
        their limits of the mean, and mean conductance lies near the mass balance where that is given. Two positions
        can only show that water is not mixed.
    """
    (balance,) = known(expected_conductance_us_cm)
    do, temp, conductance = columns = _means_by_position(points)
    positions = max(map(len, columns))
    mean = _mean(conductance)
    do_off, temp_off, conductance_off = (_furthest(values) for values in columns)
    conductance_off = 100 * conductance_off / mean if mean > 0 else math.nan
    balance_off = 100 * abs(mean / balance - 1) if balance > 0 else math.nan
    apart = [
        says
        for off, limit, says in (
            (do_off, settings.mixed_mg_l, f"oxygen is up to {shown(do_off, 2)} mg/L from the mean"),
            (temp_off, settings.mixed_c, f"the water is up to {shown(temp_off, 1)} °C warmer or colder than the mean"),
            (
                conductance_off,
                settings.mixed_conductance_percent,
                f"conductance is up to {shown(conductance_off, 1)} % from the mean",
            ),
            (
                balance_off,
                settings.mixed_balance_percent,
                f"mean conductance is {shown(balance_off, 0)} % from the mass balance",
            ),
        )
        if exceeds(off, limit)
    ]
    enough = min(len(do), len(temp)) >= _POSITIONS_TO_BE_MIXED
    mixed = (True if enough else None) if not apart else False
    # A mean of one position says nothing of the section, however far it lies from the balance.
    mixed = mixed if positions > 1 else None
    return SectionVerdict(
        mixed=mixed,
        points=positions,
        do_spread=_spread(do),
        temp_spread=_spread(temp),
        conductance_spread_percent=100 * _spread(conductance) / mean if mean > 0 else math.nan,
        says=_says(mixed, positions, apart, len(conductance) > 1),
    )


def _says(mixed, positions, apart, with_conductance):
    if mixed is None:
        return f"Too little to tell: {positions} position{'' if positions == 1 else 's'} with oxygen and temperature."
    if not mixed:
        return f"Not mixed: {', '.join(apart)}."
    without = "" if with_conductance else " Conductance was not measured."
    return f"Mixed: {positions} positions agree.{without}"


def _means_by_position(points):
    """Return the mean oxygen, temperature and conductance of each position, missing ones left out."""
    rows = {}
    for point in points:
        if point.position and point.position.strip():
            row = known(point.do_mg_l, point.water_temp_c, point.conductance_us_cm)
            rows.setdefault(point.position.strip().casefold(), []).append(row)
    means = [_means(row) for row in rows.values()]
    return tuple([row[column] for row in means if not math.isnan(row[column])] for column in range(3))


def _means(rows):
    return [_mean(column) for column in zip(*rows, strict=True)]


def _mean(values):
    values = [value for value in values if not math.isnan(value)]
    return sum(values) / len(values) if values else math.nan


def _furthest(values):
    return max(abs(value - _mean(values)) for value in values) if len(values) > 1 else math.nan


def _spread(values):
    return max(values) - min(values) if len(values) > 1 else math.nan


def not_mixed(verdict):
    """Return a finding when a section is not mixed; none for None, or where it can't be told."""
    if verdict is None or verdict.mixed is not False:
        return ()
    return (
        Finding(
            name="not_mixed",
            field="position",
            says=verdict.says,
            cause="An inflow is still along its bank, or one point was in slack water or had not settled.",
            do="Read the point that differs again. If it stays, keep every point, and read the next station at three "
            "points too.",
        ),
    )


@dataclass(frozen=True)
class Layers:
    """Whether the water of one vertical is layered; None where it can't be told.

    do_difference and temp_difference are top less bottom, NaN where not known. [mg/L, °C]
    """

    stratified: bool | None
    do_difference: float
    temp_difference: float
    says: str


def stratification(points, settings):
    """Return whether the water is layered, from the highest and the lowest reading of one vertical.

    Parameters
    ----------
    points : iterable of SectionPoint
        Points of one vertical; those of several give the vertical where top and bottom differ most.
    settings : Settings

    Returns
    -------
    Layers
    """
    verticals = {}
    for point in points:
        (depth,) = known(point.sensor_depth_m)
        if not math.isnan(depth):
            vertical = verticals.setdefault((point.position or "").strip().casefold(), {})
            vertical.setdefault(depth, []).append(known(point.do_mg_l, point.water_temp_c))
    differences = [_top_less_bottom(vertical) for vertical in verticals.values() if len(vertical) > 1]
    differences = [(do, temp) for do, temp in differences if not (math.isnan(do) and math.isnan(temp))]
    if not differences:
        return Layers(None, math.nan, math.nan, "Too little to tell: two depths of one vertical are needed.")
    do, temp = max(differences, key=lambda pair: _beyond(*pair, settings))
    stratified = exceeds(abs(do), settings.stratified_mg_l) or exceeds(abs(temp), settings.stratified_c)
    return Layers(stratified, do, temp, f"{'Layered' if stratified else 'Not layered'}: {_layers_say(do, temp)}.")


def _top_less_bottom(vertical):
    """Return the difference in oxygen and in temperature of a vertical: depth to the list of its values."""
    top, bottom = _means(vertical[min(vertical)]), _means(vertical[max(vertical)])
    return tuple(above - below for above, below in zip(top, bottom, strict=True))


def _beyond(do, temp, settings):
    """Return how far a vertical is layered, in multiples of the limits; what is missing counts as none."""
    limits = (settings.stratified_mg_l, settings.stratified_c)
    shares = [abs(value) / max(limit, 1e-9) for value, limit in zip((do, temp), limits, strict=True)]
    return max(0.0 if math.isnan(share) else share for share in shares)


def _layers_say(do, temp):
    warmth = f"is {shown(abs(temp), 1)} °C {'warmer' if temp > 0 else 'colder'}"
    oxygen = f"holds {shown(abs(do), 2)} mg/L {'more' if do > 0 else 'less'} oxygen"
    told = [says for value, says in ((temp, warmth), (do, oxygen)) if not math.isnan(value)]
    return f"the top {' and '.join(told)} than the bottom"


def stratified(layers):
    """Return a finding when the water is layered; none for None, or where it can't be told."""
    if layers is None or not layers.stratified:
        return ()
    return (
        Finding(
            name="stratified",
            field="sensor_depth_m",
            says=layers.says,
            cause="A pool or backwater, slow deep water, sun on the surface, or a cold or salty inflow along the bed.",
            do="Read the whole profile, keep every depth, and say which depths stand for the river here.",
        ),
    )


def depths_wanted(depth_m, settings, *, still=False):
    """Return the depths under the surface at which to hang the sensor. [m]

    Parameters
    ----------
    depth_m : float
        Depth of the water. [m]
    settings : Settings
    still : bool
        A pool, a backwater, or work from a boat: where it is deep, a profile.

    Returns
    -------
    tuple of float
        Rounded to the centimetre, the highest first. Empty where the depth is not known, or there is no water.
    """
    (depth,) = known(depth_m)
    if not depth > 0:
        return ()
    lowest = depth - settings.profile_bed_m
    if still and exceeds(depth, settings.profile_depth_m) and lowest > settings.profile_top_m:
        return _profile(settings.profile_top_m, lowest, settings.profile_step_m)
    if reaches(depth, settings.two_depths_m):
        percents = (settings.upper_depth_percent, settings.lower_depth_percent)
    else:
        percents = (settings.single_depth_percent,)
    return tuple(round(depth * percent / 100, 2) for percent in percents)


def _profile(top, lowest, step):
    step = max(step, (lowest - top) / _MOST_STEPS)
    regular = math.floor((lowest - top) / step + 1e-9) + 1
    depths = [top + place * step for place in range(regular)]
    if exceeds(lowest - depths[-1], _NEAR_LOWEST * step):
        depths.append(lowest)
    return tuple(round(one, 2) for one in depths)
