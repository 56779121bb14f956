"""Meter checks judged by today's settings, and the readings that lie between two of them."""

import math
from dataclasses import dataclass

from calc.quality_bracket import brackets
from calc.quality_meter import Bracket, CheckVerdict, MeterCheckTime, check_verdict, expected_value
from webapp.models import MeterCheck

_HOUR = 3600


@dataclass(frozen=True)
class JudgedCheck:
    """A check with what today's settings say of it; expected is what the meter should have shown, None unknown.

    reason is why it is set aside, empty where it is not.
    """

    check: MeterCheck
    expected: float | None
    verdict: CheckVerdict
    set_aside: bool
    reason: str

    @property
    def of_zero(self):
        """Return whether it is a check in zero solution, which brackets nothing."""
        return self.check.kind == "zero" or self.check.standard == "zero_solution"


def judged_checks(checks, settings):
    """Return a JudgedCheck for each MeterCheck, in the same order."""
    return [_judged(check, settings) for check in checks]


def _judged(check, settings):
    expected = expected_value(
        check.standard,
        water_temp_c=_known(check.water_temp_c),
        pressure_mmhg=_known(check.pressure_mmhg),
        conductance_us_cm=_known(check.conductance_us_cm),
        compared=_known(check.compared),
    )
    verdict = check_verdict(check.parameter, check.kind, check.standard, expected, check.value, settings)
    events = sorted(check.events, key=lambda event: (event.made_at, event.id))
    aside = bool(events) and events[-1].kind == "set_aside"
    expected = expected if math.isfinite(expected) else None
    return JudgedCheck(check, expected, verdict, aside, events[-1].reason if aside else "")


def _known(value):
    return math.nan if value is None else value


def hours(instant):
    """Return an instant on the axis that checks and readings share. [h]"""
    return instant.timestamp() / _HOUR


class Brackets:
    """The oxygen checks of a survey by meter, for the readings that lie between them."""

    def __init__(self, judged, settings):
        self._settings = settings
        self._by_meter = {}
        for one in judged:
            if one.check.parameter == "do" and not one.set_aside and not one.of_zero:
                self._by_meter.setdefault(one.check.meter.name.casefold(), []).append(one)
        self._times = {
            name: [MeterCheckTime.of(hours(one.check.checked_at), one.check.kind, one.verdict) for one in some]
            for name, some in self._by_meter.items()
        }

    def of(self, meter_name, taken_at):
        """Return (Bracket, JudgedCheck before or None, JudgedCheck after or None) of a reading.

        A reading without a meter's name belongs to the only meter that was checked, where there is just one.
        """
        return self.of_many([(meter_name, taken_at)])[0]

    def of_many(self, meters_and_times):
        """Return what of does for each (meter's name, time): the checks of a meter are put in order once."""
        places = {}
        for place, (meter_name, _) in enumerate(meters_and_times):
            places.setdefault(meter_name, []).append(place)
        found = [None] * len(meters_and_times)
        for meter_name, some in places.items():
            times_h = [hours(meters_and_times[place][1]) for place in some]
            for place, one in zip(some, self._between(meter_name.casefold(), times_h), strict=True):
                found[place] = one
        return found

    def _between(self, name, times_h):
        if not name and len(self._by_meter) == 1:
            (name,) = self._by_meter
        checks = self._by_meter.get(name)
        if not checks:
            return [(Bracket("no_check_before", None, None), None, None)] * len(times_h)
        return [
            (one, *(None if place is None else checks[place] for place in (one.before, one.after)))
            for one in brackets(times_h, self._times[name], self._settings)
        ]
