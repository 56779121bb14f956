"""What to do after a check, in plain sentences, and which check comes next."""

from dataclasses import dataclass

from webapp.meters.words import value_text

_SAME_PLACE = "Lift the probe out, put it back, let it settle."
_STAYS = "If it stays, change the cap or membrane, or take another meter."


@dataclass(frozen=True)
class Step:
    """What to do now; kind is the check that comes next, empty where none must."""

    says: str
    kind: str = ""


def next_step(show, judged, zero_due=False):
    """Return the Step after a JudgedCheck; zero_due is whether its meter lacks a check in zero solution."""
    check, verdict = judged.check, judged.verdict
    if judged.set_aside:
        return Step("This check is set aside: make it again.", check.kind)
    if verdict.passes is None:
        return Step("It can't be judged without what the meter should show. Make it again.", check.kind)
    if check.action == "withdrawn":
        return Step("The meter is out of use. Mark it out of service in the register, and go on with another.")
    if judged.of_zero:
        return _after_zero(verdict)
    if check.kind == "adjusted" or check.action == "adjusted":
        return Step(f"Read it back now, as if it were a sample. {_SAME_PLACE}", "read_back")
    if check.kind == "end_of_day":
        return _after_the_day(check, verdict)
    if check.kind == "after_cleaning":
        return Step("What it was off before cleaning and is not now was fouling; the rest is drift of the sensor.")
    if verdict.passes:
        return _after_passing(check, zero_due)
    says = _FAILED[check.kind].format(to=value_text(show, check.parameter, judged.expected))
    return Step(f"{says} {_STAYS}" if check.kind == "read_back" else says, _NEXT[check.kind])


_PASSED = {
    "as_found": "It reads right as it is: no need to adjust. Readings before it are closed by this check.",
    "read_back": "It is ready for the first station. Check it again between stations, and at the end of the day.",
    "field": "It is fit to go on. Readings before it are closed by this check.",
}
_FAILED = {
    "as_found": "Adjust it to {to}, then read it back.",
    "read_back": "It does not hold. Adjust it to {to} once more, and read it back.",
    "field": "Wait a minute and check again. If it stays, adjust it to {to} and read it back.",
}
_NEXT = {"as_found": "adjusted", "read_back": "adjusted", "field": "field"}


def _after_passing(check, zero_due):
    if zero_due and check.parameter == "do" and check.kind in ("as_found", "read_back"):
        return Step(f"{_PASSED[check.kind]} A zero check is due: make it now.", "zero")
    return Step(_PASSED[check.kind])


def _after_zero(verdict):
    if verdict.passes:
        return Step("Rinse well now: what is left of the solution makes the next readings low.")
    return Step(f"Rinse, take fresh solution, wait until it settles, and check again. {_STAYS}", "zero")


def _after_the_day(check, verdict):
    if verdict.closes:
        return Step("The readings before it are closed. Clean the meter, then check it once more.", "after_cleaning")
    if check.parameter != "do":
        return Step(
            "Repeat the check. If it stays, note it: readings of the day are off by up to that much.", "end_of_day"
        )
    if verdict.correctable:
        return Step(
            "Repeat it once. If it stays, do not adjust or clean yet: a zero check now tells how readings of the day "
            "can be corrected. Lead or office decide on the correction; what was read stays.",
            "zero",
        )
    return Step(
        "Repeat it once. If it stays, the readings since the check before are too far off to be reported.", "end_of_day"
    )
