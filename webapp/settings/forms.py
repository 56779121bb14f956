"""The settings form: what somebody typed over the values they saw, into changes or a message beside each field."""

from dataclasses import dataclass

from webapp.forms import Fields, NotANumber, read_number, whole_number
from webapp.settings.topics import LOW_AND_HIGH, SETTINGS, limits_of, title_of, typed, values_of


@dataclass(frozen=True)
class Change:
    """New values by key, why, and the number of the version that whoever typed them saw."""

    values: dict
    reason: str
    based_on: int


def based_on(source, default):
    """Return the number of the version the form was filled in on."""
    return whole_number(source.get("based_on"), default)


def typed_values(thresholds):
    """Return every setting's value of a version as somebody would type it."""
    return {key: typed(value) for key, value in values_of(thresholds).items()}


def touched(source, seen):
    """Return the texts that are not what the form held when it was opened; seen is typed_values of its version."""
    return {
        key: text for key, was in seen.items() if (text := str(source.get(key, was)).replace("\x00", "").strip()) != was
    }


def parse_change(source, version):
    """Return (Change, {}) or (None, {key: message}); version is the one that the form was filled in on."""
    before = values_of(version.thresholds)
    texts = touched(source, typed_values(version.thresholds))
    values, errors = {}, {}
    for one in SETTINGS:
        if one.key in texts:
            value, message = _read(one, texts[one.key])
            if message:
                errors[one.key] = message
            elif value != before[one.key]:
                values[one.key] = value
    errors |= _out_of_order(before | values, values, errors)
    fields = Fields(source)
    reason = fields.text("reason", "reason: whoever reads the results later must see why", 500)
    errors |= fields.errors
    if not values and not errors:
        errors["nothing"] = "Every value is as it was. Change one, then save."
    return (None, errors) if errors else (Change(values, reason, version.number), {})


def _read(setting, text):
    """Return (value, "") or (None, what to do)."""
    if not text:
        return None, f"Enter a number; the trade's default is {typed(setting.default)}."
    try:
        value = read_number(text)
    except NotANumber as trouble:
        if "two ways" in str(trouble):
            return None, f"Say which you mean: {trouble}."
        return None, f"Enter a number, for example {typed(setting.default)}."
    low, high = limits_of(setting)
    if not low <= value <= high:
        return None, f"This must lie between {typed(low)} and {typed(high)} {setting.unit}".rstrip() + "; check it."
    return value, ""


def _out_of_order(values, changed, errors):
    """Return a message for each changed value that is no longer below, or above, its partner."""
    found = {}
    for low, high in LOW_AND_HIGH:
        if values[low] < values[high] or errors.keys() & {low, high}:
            continue
        if low in changed:
            found.setdefault(low, f"This must be below “{title_of(high)}”, which is {typed(values[high])}.")
        if high in changed:
            found.setdefault(high, f"This must be above “{title_of(low)}”, which is {typed(values[low])}.")
    return found
