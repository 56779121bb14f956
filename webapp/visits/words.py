"""What a visit may tell, what it is called and how it is shown."""

import math
from dataclasses import dataclass

PLATFORMS = {
    "": "Not noted",
    "wade": "Wading",
    "boat": "From a boat",
    "bridge": "From a bridge",
    "bank": "From the bank",
}
WEATHERS = {
    "": "Not noted",
    "dry": "Dry",
    "fog": "Fog",
    "showers": "Showers",
    "rain": "Rain",
    "thunder": "Thunder",
    "snow": "Snow or sleet",
}
STATUSES = {"": "Not said yet", "complete": "Complete", "partial": "Partial"}
FLOW_METHODS = {
    "": "Not noted",
    "section": "Velocities across the section",
    "gauge": "A gauge with its rating",
    "profiler": "Acoustic profiler",
    "dilution": "Dilution of a tracer",
    "volume": "Volume and time",
    "other": "Another way",
}
CHOICES = {"platform": PLATFORMS, "weather": WEATHERS, "status": STATUSES, "flow_method": FLOW_METHODS}


@dataclass(frozen=True)
class Number:
    """A number that a visit may tell: its words, how it is shown, its limits (SI, included) and decimals as shown."""

    label: str
    quantity: str
    low: float
    high: float
    digits: int | None = None


NUMBERS = {
    "wading_depth_m": Number("depth where one would wade", "depth", 0, 100),
    "wading_velocity_m_s": Number("velocity there", "velocity", 0, 10),
    "stage_m": Number("stage", "depth", -100, 9000, 3),
    "width_m": Number("width of the water", "depth", 0, 20000, 1),
    "flow_m3_s": Number("flow", "flow", 0, 100000),
    "flow_uncertainty_percent": Number("uncertainty of the flow", "percent", 0, 100),
    "air_temp_c": Number("air temperature", "temperature", -50, 55),
    "cloud_oktas": Number("cloud, in eighths of the sky", "plain", 0, 8, 0),
    "rain_mm": Number("rain in the last 24 hours", "plain", 0, 1000, 1),
}
LABELS = {
    "arrived_at": "Arrived",
    "left_at": "Left",
    "platform": "How",
    "wading_depth_m": "Depth to wade",
    "wading_velocity_m_s": "Velocity to wade",
    "stage_m": "Stage",
    "width_m": "Width",
    "float_distance_m": "Float",
    "flow_m3_s": "Flow",
    "air_temp_c": "Air",
    "weather": "Weather",
    "cloud_oktas": "Cloud",
    "rain_mm": "Rain, 24 h",
    "water_look": "Water",
    "crew": "Crew",
    "status": "Visit",
    "note": "Note",
}
# What belongs together is said together: one of a group is never taken from another entry than the rest.
GROUPS = tuple(
    {
        "float_distance_m": ("float_distance_m", "float_time_s", "surface_velocity_m_s", "velocity_m_s"),
        "flow_m3_s": ("flow_m3_s", "flow_method", "flow_uncertainty_percent"),
        "status": ("status", "partial_reason"),
    }.get(name, (name,))
    for name in LABELS
)


def group_of(name):
    """Return the facts that are said together with one; alone where nobody knows it."""
    return next((group for group in GROUPS if name in group), (name,))


def told(show, facts):
    """Return (label, words) of each fact that was told, in their order; facts as FinalVisit holds them."""
    lines = ((LABELS[group[0]], words_of(show, group, facts)) for group in GROUPS)
    return [(label, words) for label, words in lines if words]


def words_of(show, group, facts):
    """Return what is told of one group, as people read it; nothing where nothing is."""
    name = group[0]
    value = facts.get(name)
    if value in (None, ""):
        return ""
    if name in ("arrived_at", "left_at"):
        return show.day_clock(value)
    if name == "float_distance_m":
        return _float(show, facts)
    if name == "flow_m3_s":
        return _flow(show, facts)
    if name == "status" and value == "partial":
        return f"partial: {facts.get('partial_reason') or 'no reason was given'}"
    if name in CHOICES:
        return CHOICES[name].get(value, str(value)).lower()
    if name in NUMBERS:
        number = NUMBERS[name]
        unit = {"cloud_oktas": " of 8", "rain_mm": " mm"}.get(name, "")
        return show.text(number.quantity, value, number.digits) + unit
    return str(value)


def _float(show, facts):
    run = f"{show.text('depth', facts['float_distance_m'])} in {facts.get('float_time_s') or 0:.1f} s"
    if facts.get("velocity_m_s") is None:
        return run
    surface, mean = (show.text("velocity", facts.get(name)) for name in ("surface_velocity_m_s", "velocity_m_s"))
    return f"{run}: {surface} at the surface, {mean} on average (0.85 of it)"


def _flow(show, facts):
    said = [flow_text(show, facts["flow_m3_s"])]
    if facts.get("flow_method"):
        said.append(FLOW_METHODS.get(facts["flow_method"], facts["flow_method"]).lower())
    if (percent := facts.get("flow_uncertainty_percent")) is not None:
        said.append(f"{uncertainty_class(percent)} (within {percent:g} %)")
    return ", ".join(said)


def flow_text(show, flow_m3_s):
    """Return a flow to three figures, with its unit: no gauging knows more. [m³/s]"""
    size = abs(show.shown("flow", flow_m3_s))
    digits = 3 if size < 1 else max(0, 2 - math.floor(math.log10(size)))
    return show.text("flow", flow_m3_s, digits)


def uncertainty_class(percent):
    """Return the trade's word for how well a flow is known. [%]"""
    for limit, word in ((2, "excellent"), (5, "good"), (8, "fair")):
        if percent <= limit:
            return word
    return "poor"
