"""What is odd about a bottle that was just filled: asked about once, while the crew can still do something about it."""

from calc.findings import Finding
from calc.quality_bottle import bottle_without_reading, not_on_ice
from webapp.bottles.judged import ON_ICE
from webapp.readings.asking import THIS_MOMENT
from webapp.readings.layers import final


def asks(settings, new, readings, bottles, now, saved_at=None):
    """Return the findings to ask about before a NewBottle is stored; readings and bottles are all of the survey.

    saved_at is when it was saved on a phone without signal: later nobody stands there to answer. Nor is anything asked
    about that is stored already.
    """
    if now - (saved_at or now) > THIS_MOMENT or any(one.id == new.id for one in bottles):
        return []
    return [*_ice(settings, new, now), *_reading(settings, new, readings), *_replicate(new, bottles)]


def _ice(settings, new, now):
    if new.analysis not in ON_ICE:
        return ()
    until = new.on_ice_at or now
    return not_on_ice((until - new.collected_at).total_seconds() / 60, settings)


def _reading(settings, new, readings):
    """Return a question where oxygen was not read at the bottle's point about when it was filled."""
    if new.kind == "blank":
        return ()
    there = [one for one in map(final, readings) if _same_point(one, new)]
    minutes = [(one.taken_at - new.collected_at).total_seconds() / 60 for one in there]
    if minutes:
        return bottle_without_reading(min(minutes, key=abs), settings)
    return (
        Finding(
            name="bottle_without_reading",
            field="collected_at",
            says=f"No oxygen was read at this point of {new.station_code} yet.",
            cause="The reading is still to come, was taken at another point, or waits on another phone.",
            do="Read oxygen and temperature here now.",
        ),
    )


def _same_point(reading, new):
    """Return whether a FinalReading was taken where the bottle was filled; a point that was not told is any."""
    if reading.station_code != new.station_code or reading.set_aside or reading.do_mg_l is None:
        return False
    return not new.position or not reading.position or reading.position == new.position


def _replicate(new, bottles):
    """Return a question where the bottle that it repeats is not here."""
    if not new.replicate_of:
        return ()
    other = next((one for one in bottles if one.code.casefold() == new.replicate_of.casefold()), None)
    if other is not None and other.analysis == new.analysis:
        return ()
    says = (
        f"There is no bottle {new.replicate_of} here yet."
        if other is None
        else (f"Bottle {other.code} is for another analysis, so the two can't be compared.")
    )
    cause = "A letter is mistyped, or the other bottle waits on another phone."
    return (Finding("replicate_unknown", "replicate_of", says, cause, "Compare both labels."),)
