"""The table of laboratory results that an import understands, and how its result column is read."""

from webapp.bottles.words import CONTROLS
from webapp.columns import Column, Table
from webapp.forms import NotANumber, read_number

HIGHEST = 1e6
_SIGNS = {"<": "less_than", ">": "greater_than"}

RESULTS = Table(
    "results",
    "Laboratory results",
    "result",
    "One line for each bottle, as the laboratory reports it.",
    (
        Column("code", "Bottle", required=True, longest=40, also=("bottle code", "sample", "sample id", "label")),
        Column("laboratory", "Laboratory", longest=100, also=("lab",)),
        Column("lab_number", "Laboratory's number", longest=40, also=("lab id", "lab number", "lab no")),
        Column("method", "Method", longest=60),
        Column("arrived_at", "Arrived", "time", also=("received", "received at", "receipt")),
        Column("arrival_temp_c", "Temperature on arrival", "temperature", False, -30, 60, ("receipt temperature",)),
        Column("started_at", "Started", "time", also=("set up", "set up at", "analysis started", "analysed")),
        Column("finished_at", "Finished", "time", also=("read", "read at", "analysis finished")),
        Column("result", "Result", longest=40, also=("value", "bod", "bod5", "concentration"),
               help="A number, or one after < or >."),
        Column("limit_value", "Reporting limit", "plain", False, 0, HIGHEST, ("rl", "limit", "detection limit")),
        *(
            Column(key, words, "temperature" if key.endswith("_c") else "plain", False, low, high, (key,))
            for key, (words, _, low, high) in CONTROLS.items()
        ),
        Column("analyst", "Analyst", longest=100),
        Column("note", "Note", longest=2000, also=("notes", "remark", "remarks", "comment", "qualifier")),
    ),
    "code",
    "code",
)  # fmt: skip


def read_result(text):
    """Return (censor, value, limit) of a result as a laboratory writes it: "4.1", "<2", "> 300"; all empty for "".

    Raises NotANumber. A result below a limit has no value: what stands after the sign is its limit.
    """
    plain = text.strip()
    if not plain:
        return "none", None, None
    censor = _SIGNS.get(plain[0], "none")
    number = read_number(plain[1:].lstrip() if censor != "none" else plain)
    if not 0 <= number <= HIGHEST:
        raise NotANumber("out of range")
    return (censor, None, number) if censor != "none" else (censor, number, None)
