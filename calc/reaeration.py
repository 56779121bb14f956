"""Reaeration: published equations with the ranges they were published for, weirs, and temperature.

Every coefficient is base e, per day, at 20 °C. An equation used outside its range returns its value all the same;
range_warnings names what lies outside. A measured coefficient always beats an equation.

References
----------
.. [1] D. J. O'Connor and W. E. Dobbins, "Mechanism of reaeration in natural streams", Trans. ASCE, vol. 123,
   pp. 641-684, 1958.
.. [2] M. A. Churchill, H. L. Elmore and R. A. Buckingham, "The prediction of stream reaeration rates", J. Sanit. Eng.
   Div. ASCE, vol. 88, no. SA4, pp. 1-46, 1962.
.. [3] M. Owens, R. W. Edwards and J. W. Gibbs, "Some reaeration studies in streams", Int. J. Air Water Pollut., vol. 8,
   pp. 469-486, 1964.
.. [4] A. P. Covar, "Selecting the proper reaeration coefficient for use in water quality models", Proc. Conf. on
   Environmental Modeling and Simulation, US EPA-600/9-76-016, pp. 340-343, 1976.
.. [5] E. C. Tsivoglou and L. A. Neal, "Tracer measurement of reaeration: III. Predicting the reaeration capacity of
   inland streams", J. Water Pollut. Control Fed., vol. 48, no. 12, pp. 2669-2689, 1976.
.. [6] C. S. Melching and H. E. Flores, "Reaeration equations derived from U.S. Geological Survey database", J. Environ.
   Eng., vol. 125, no. 5, pp. 407-414, 1999. doi:10.1061/(ASCE)0733-9372(1999)125:5(407)
.. [7] UK Water Research Laboratory, "Aeration at weirs", Notes on Water Pollution 61, 1973; T. A. Butts and R. L.
   Evans, "Aeration characteristics of flow release controls on Illinois waterway dams", ISWS Circular 145, 1983.
.. [8] H. L. Elmore and W. F. West, "Effect of water temperature on stream reaeration", J. Sanit. Eng. Div. ASCE,
   vol. 87, no. SA6, pp. 59-72, 1961: θ = 1.0241.
"""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from calc.checks import require_positive, require_range
from calc.errors import OutOfRangeError
from calc.units import FOOT_M

WEIR_QUALITY = {"clean": 1.8, "slightly polluted": 1.6, "moderately polluted": 1.0, "grossly polluted": 0.65}
WEIR_SHAPE = {
    "flat broad crest, irregular step": 0.7,
    "flat broad crest, vertical face": 0.8,
    "flat broad crest, straight slope": 0.9,
    "sharp crest, straight slope": 1.05,
    "sharp crest, vertical face": 0.8,
    "submerged gate": 0.05,
}

_COVAR_SHALLOW_M = 0.61
_CFS_M3_S = FOOT_M**3
_SMALL_STREAMS_M3_S = (_CFS_M3_S, 10 * _CFS_M3_S)
_LARGE_STREAMS_M3_S = (25 * _CFS_M3_S, 3000 * _CFS_M3_S)
_MELCHING_FLORES_LOW_FLOW_M3_S = 0.556


def oconnor_dobbins_per_day(velocity_m_s, depth_m):
    """Return ka20 = 3.93 U^0.5 / H^1.5 of O'Connor and Dobbins [1]_. [1/d]

    Parameters
    ----------
    velocity_m_s : float or array_like, shape (...)
        Mean velocity, above 0. [m/s] Published for 0.15 to 0.5.
    depth_m : float or array_like, broadcastable
        Mean depth, above 0. [m] Published for 0.3 to 9.

    Raises
    ------
    OutOfRangeError
        If a velocity or depth is not above 0. Outside the published range the value is returned; see range_warnings.
    """
    velocity, depth = _velocity_and_depth(velocity_m_s, depth_m)
    return 3.93 * velocity**0.5 / depth**1.5


def churchill_per_day(velocity_m_s, depth_m):
    """Return ka20 = 5.026 U / H^1.67 of Churchill, Elmore and Buckingham [2]_. [1/d]

    Published for velocities of 0.55 to 1.5 m/s and depths of 0.6 to 3 m; other texts print 5.23 for 5.026. Arguments
    and what they raise as in oconnor_dobbins_per_day.
    """
    velocity, depth = _velocity_and_depth(velocity_m_s, depth_m)
    return 5.026 * velocity / depth**1.67


def owens_gibbs_per_day(velocity_m_s, depth_m):
    """Return ka20 = 5.32 U^0.67 / H^1.85 of Owens, Edwards and Gibbs [3]_. [1/d]

    Published for velocities of 0.03 to 1.5 m/s and depths of 0.1 to 3 m. Arguments and what they raise as in
    oconnor_dobbins_per_day.
    """
    velocity, depth = _velocity_and_depth(velocity_m_s, depth_m)
    return 5.32 * velocity**0.67 / depth**1.85


def covar_choice(velocity_m_s, depth_m):
    """Return the key of the equation that Covar [4]_ chooses: owens_gibbs, oconnor_dobbins or churchill.

    Shallower than 0.61 m Owens; else deeper than 3.45 U^2.5 O'Connor; else Churchill. A str for scalars, else an array
    of str. The coefficient jumps where the choice changes. Raises as oconnor_dobbins_per_day does.
    """
    velocity, depth = _velocity_and_depth(velocity_m_s, depth_m)
    deep = np.where(depth > 3.45 * velocity**2.5, "oconnor_dobbins", "churchill")
    choice = np.where(depth < _COVAR_SHALLOW_M, "owens_gibbs", deep)
    return choice if choice.ndim else str(choice)


def covar_per_day(velocity_m_s, depth_m):
    """Return ka20 by the equation that covar_choice names. [1/d] Arguments and what they raise are the same."""
    choice = np.asarray(covar_choice(velocity_m_s, depth_m))
    return np.select(
        [choice == "owens_gibbs", choice == "oconnor_dobbins"],
        [owens_gibbs_per_day(velocity_m_s, depth_m), oconnor_dobbins_per_day(velocity_m_s, depth_m)],
        churchill_per_day(velocity_m_s, depth_m),
    )[()]


def tsivoglou_neal_per_day(velocity_m_s, slope, flow_m3_s):
    """Return ka20 = 31183 S U up to 10 ft³/s, 15308 S U above, of Tsivoglou and Neal [5]_. [1/d]

    Parameters
    ----------
    velocity_m_s : float or array_like, shape (...)
        Mean velocity, above 0. [m/s]
    slope : float or array_like, broadcastable
        Fall of the water surface over distance, above 0. [m/m]
    flow_m3_s : float or array_like, broadcastable
        Flow, above 0. [m³/s] Published for 0.028 to 0.283 and 0.708 to 85 (1-10 and 25-3000 ft³/s); between the two
        the coefficient of the larger streams is used.

    Raises
    ------
    OutOfRangeError
        If an argument is not above 0. Outside the published ranges the value is returned; see range_warnings.
    """
    velocity, slope, flow = _velocity_slope_flow(velocity_m_s, slope, flow_m3_s)
    return np.where(flow <= _SMALL_STREAMS_M3_S[1], 31183.0, 15308.0) * slope * velocity


def melching_flores_pool_riffle_per_day(velocity_m_s, slope, flow_m3_s):
    """Return ka20 of pool-and-riffle streams. [1/d]

    517 (US)^0.524 Q^-0.242 up to 0.556 m³/s, else 596 (US)^0.528 Q^-0.136, Melching and Flores [6]_. Arguments and
    what they raise as in tsivoglou_neal_per_day.
    """
    velocity, slope, flow = _velocity_slope_flow(velocity_m_s, slope, flow_m3_s)
    power = velocity * slope
    low = 517 * power**0.524 * flow**-0.242
    return np.where(flow <= _MELCHING_FLORES_LOW_FLOW_M3_S, low, 596 * power**0.528 * flow**-0.136)[()]


def melching_flores_channel_control_per_day(velocity_m_s, slope, flow_m3_s, depth_m, width_m):
    """Return ka20 of channel-control streams. [1/d]

    88 (US)^0.313 H^-0.353 up to 0.556 m³/s, else 142 (US)^0.333 H^-0.66 W^-0.243, Melching and Flores [6]_. Depth and
    width are means, above 0 [m]; the other arguments and what they raise as in tsivoglou_neal_per_day.
    """
    velocity, slope, flow = _velocity_slope_flow(velocity_m_s, slope, flow_m3_s)
    depth, width = require_positive("depth_m", depth_m, "m"), require_positive("width_m", width_m, "m")
    power = velocity * slope
    low = 88 * power**0.313 * depth**-0.353
    return np.where(flow <= _MELCHING_FLORES_LOW_FLOW_M3_S, low, 142 * power**0.333 * depth**-0.66 * width**-0.243)[()]


def weir_deficit_ratio(drop_m, water_temp_c, quality, shape):
    """Return the deficit above a weir over the deficit below it, r = 1 + 0.38 a b h (1 - 0.11 h)(1 + 0.046 t). [-]

    Parameters
    ----------
    drop_m : float or array_like, shape (...)
        Difference of water level. [m] Valid from 0 to 4.5; the equation turns down beyond.
    water_temp_c : float or array_like, broadcastable
        Water temperature. [°C] Valid from -1 to 45.
    quality, shape : float or array_like, broadcastable
        a, see WEIR_QUALITY, above 0 to 2; b, see WEIR_SHAPE, above 0 to 1.5. [-]

    Raises
    ------
    OutOfRangeError
        If an argument leaves its range.

    Notes
    -----
    From [7]_. It was found in water short of oxygen: where the water above is supersaturated the ratio does not apply.
    """
    drop = require_range("drop_m", drop_m, 0, 4.5, "m")
    celsius = require_range("water_temp_c", water_temp_c, -1, 45, "°C")
    factors = _weir_factor("quality", quality, 2.0) * _weir_factor("shape", shape, 1.5)
    return 1 + 0.38 * factors * drop * (1 - 0.11 * drop) * (1 + 0.046 * celsius)


def at_temperature(rate_20c_per_day, water_temp_c, theta):
    """Return a rate at the water's temperature, rate · theta^(t - 20). [1/d]

    water_temp_c is in °C, valid from -1 to 45 so that kelvin is refused; theta from 0.9 to 1.2, 1.024 for reaeration
    [8]_. OutOfRangeError outside.
    """
    celsius = require_range("water_temp_c", water_temp_c, -1, 45, "°C")
    factor = require_range("theta", theta, 0.9, 1.2, "")
    return np.asarray(rate_20c_per_day, dtype=float) * factor ** (celsius - 20)


@dataclass(frozen=True)
class RangeWarning:
    """A value outside the range an equation was published for: low to high, or inside the gap low to high."""

    method: str
    argument: str
    value: float
    low: float
    high: float
    message: str


@dataclass(frozen=True)
class Formula:
    """A published equation: its key in a plan, the label people read, its arguments and the range of each."""

    key: str
    label: str
    function: Callable
    arguments: tuple[str, ...]
    valid: dict[str, tuple[float, float]]


@dataclass(frozen=True)
class FormulaResult:
    """What one equation gives for a reach. [1/d at 20 °C]"""

    key: str
    label: str
    ka20_per_day: float
    warnings: tuple[RangeWarning, ...]


_HYDRAULIC = ("velocity_m_s", "depth_m")
_ENERGY = ("velocity_m_s", "slope", "flow_m3_s")
_CHANNEL = (*_ENERGY, "depth_m", "width_m")
_TSIVOGLOU_FLOWS = {"flow_m3_s": (_SMALL_STREAMS_M3_S[0], _LARGE_STREAMS_M3_S[1])}

FORMULAS = {
    formula.key: formula
    for formula in (
        Formula(
            "oconnor_dobbins",
            "O'Connor & Dobbins 1958",
            oconnor_dobbins_per_day,
            _HYDRAULIC,
            {"velocity_m_s": (0.15, 0.5), "depth_m": (0.3, 9.0)},
        ),
        Formula(
            "churchill",
            "Churchill, Elmore & Buckingham 1962",
            churchill_per_day,
            _HYDRAULIC,
            {"velocity_m_s": (0.55, 1.5), "depth_m": (0.6, 3.0)},
        ),
        Formula(
            "owens_gibbs",
            "Owens, Edwards & Gibbs 1964",
            owens_gibbs_per_day,
            _HYDRAULIC,
            {"velocity_m_s": (0.03, 1.5), "depth_m": (0.1, 3.0)},
        ),
        Formula("covar", "Covar 1976 choice", covar_per_day, _HYDRAULIC, {}),
        Formula("tsivoglou_neal", "Tsivoglou & Neal 1976", tsivoglou_neal_per_day, _ENERGY, _TSIVOGLOU_FLOWS),
        Formula(
            "melching_flores_pool_riffle",
            "Melching & Flores 1999, pool and riffle",
            melching_flores_pool_riffle_per_day,
            _ENERGY,
            {},
        ),
        Formula(
            "melching_flores_channel_control",
            "Melching & Flores 1999, channel control",
            melching_flores_channel_control_per_day,
            _CHANNEL,
            {},
        ),
    )
}
VALID = {key: formula.valid for key, formula in FORMULAS.items()}

_SPOKEN = {"velocity_m_s": ("velocity", "m/s"), "depth_m": ("depth", "m"), "flow_m3_s": ("flow", "m³/s")}


def ka20(key, **values):
    """Return ka20 by the equation a plan names. [1/d] Further values than it needs may be given.

    Raises
    ------
    OutOfRangeError
        If the key is not in FORMULAS, an argument is missing or None, or as the equation itself does.
    """
    formula = _formula(key)
    for name in formula.arguments:
        if values.get(name) is None:
            raise OutOfRangeError(f"{name} must be given for {formula.label}, got none")
    return formula.function(**{name: values[name] for name in formula.arguments})


def all_formulas(velocity_m_s, depth_m, slope=None, flow_m3_s=None, width_m=None):
    """Return a FormulaResult for every equation whose arguments are known. All are single numbers."""
    values = {
        "velocity_m_s": velocity_m_s,
        "depth_m": depth_m,
        "slope": slope,
        "flow_m3_s": flow_m3_s,
        "width_m": width_m,
    }
    known = {name: value for name, value in values.items() if value is not None}
    return tuple(
        FormulaResult(key, formula.label, float(ka20(key, **known)), range_warnings(key, **known))
        for key, formula in FORMULAS.items()
        if known.keys() >= set(formula.arguments)
    )


def range_warnings(method, **values):
    """Return what lies outside the range an equation was published for, as RangeWarnings; () when all is inside.

    method is a key of FORMULAS; values are single numbers named velocity_m_s, depth_m, slope, flow_m3_s or width_m.
    Those not given, not used or NaN are passed over. Covar's choice is judged by the equation it chooses.
    """
    formula = _formula(method)
    if method == "covar" and all(values.get(name) is not None for name in formula.arguments):
        formula = FORMULAS[covar_choice(values["velocity_m_s"], values["depth_m"])]
    warnings = [
        _outside(formula, name, values[name], low, high)
        for name, (low, high) in formula.valid.items()
        if values.get(name) is not None and (values[name] < low or values[name] > high)
    ]
    flow = values.get("flow_m3_s")
    if method == "tsivoglou_neal" and flow is not None and _SMALL_STREAMS_M3_S[1] < flow < _LARGE_STREAMS_M3_S[0]:
        warnings.append(_between_streams(formula, flow))
    return tuple(warnings)


def _outside(formula, name, value, low, high):
    spoken, unit = _SPOKEN[name]
    message = f"{formula.label}: {spoken} {value:.3g} {unit} lies outside the published {low:.2g} to {high:.2g} {unit}"
    return RangeWarning(formula.key, name, float(value), low, high, message)


def _between_streams(formula, flow):
    low, high = _SMALL_STREAMS_M3_S[1], _LARGE_STREAMS_M3_S[0]
    message = (
        f"{formula.label}: flow {flow:.3g} m³/s lies between the published small streams (up to {low:.2g} m³/s) "
        f"and larger ones (from {high:.2g} m³/s); the coefficient of the larger ones is used"
    )
    return RangeWarning(formula.key, "flow_m3_s", float(flow), low, high, message)


def _formula(key):
    if key not in FORMULAS:
        raise OutOfRangeError(f"method must be one of {', '.join(FORMULAS)}, got {key}")
    return FORMULAS[key]


def _velocity_and_depth(velocity_m_s, depth_m):
    return require_positive("velocity_m_s", velocity_m_s, "m/s"), require_positive("depth_m", depth_m, "m")


def _velocity_slope_flow(velocity_m_s, slope, flow_m3_s):
    return (
        require_positive("velocity_m_s", velocity_m_s, "m/s"),
        require_positive("slope", slope, ""),
        require_positive("flow_m3_s", flow_m3_s, "m³/s"),
    )


def _weir_factor(name, value, high):
    return require_positive(name, require_range(name, value, 0, high, ""), "")
