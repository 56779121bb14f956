"""Today's rates as a page shows them, beside those planned."""

from dataclasses import dataclass

QUANTITIES = {
    "kd": "rate",
    "ka": "rate",
    "velocity": "velocity",
    "cbod": "demand",
    "nbod": "demand",
    "deficit": "oxygen",
    "net": "volumetric",
}


@dataclass(frozen=True)
class RateRow:
    """One rate as text: planned, today's middle value and 90 % interval, and whether the plan lies outside that."""

    label: str
    unit: str
    planned: str
    median: str
    interval: str
    outside: bool


def rate_rows(show, today):
    """Return the RateRows of Today; none before there is an estimate."""
    if not today.ready or not today.enough:
        return ()
    return tuple(_row(show, rate) for rate in today.estimate.rates)


def _row(show, rate):
    quantity = QUANTITIES[rate.key]
    planned, median, low, high = (
        show.number(quantity, value, 2) for value in (rate.planned, rate.median, rate.low, rate.high)
    )
    return RateRow(
        label=rate.label,
        unit=show.unit_label(quantity),
        planned=planned,
        median=median,
        interval=f"{low} to {high}",
        outside=not rate.low <= rate.planned <= rate.high,
    )
