"""The forms about bottles: what somebody typed, into values or a message beside each field."""

import uuid
from datetime import timedelta

from webapp.bottles.columns import HIGHEST, read_result
from webapp.bottles.new import NewBottle, NewHandOver, NewResult
from webapp.bottles.words import ANALYSES, CONTROLS, FULL, KINDS, POSITIONS
from webapp.forms import Fields, NotANumber

# What the form asks for under "More about this bottle".
MORE = ("kind", "replicate_of", "sample_depth_m", "position", "volume_ml", "preservative", "filtered", "note")


def fresh_bottle(show, last, now):
    """Return the texts of a fresh form: the time, and what one crew's bottles share; last is the person's last."""
    return {
        "submission_id": str(uuid.uuid4()),
        "collected_at": show.typed_time(now),
        "analysis": last.analysis if last else "bod5",
        "volume_ml": show.typed("plain", last.volume_ml) if last else "",
        "preservative": last.preservative if last else "",
    }


def parse_bottle(source, show, station_code, now):
    """Return (NewBottle, {}) or (None, {field: message})."""
    fields = Fields(source, show)
    kind = fields.choice("kind", "kind of bottle", KINDS, "sample")
    collected = fields.past_time("collected_at", "time it was filled", now)
    on_ice = fields.past_time("on_ice_at", "time it went on ice", now, required=False)
    if not fields.holds("on_ice_at") and fields.ticked("ice_at_once"):
        on_ice = collected
    if collected and on_ice and on_ice < collected.replace(second=0, microsecond=0):
        fields.refuse("on_ice_at", "That is before the bottle was filled; check both times.")
    full = fields.choice("full", "entry", FULL, "")
    new = NewBottle(
        id=fields.uuid("submission_id"),
        station_code=station_code,
        code=fields.text("code", "code on its label", 40),
        analysis=fields.choice("analysis", "analysis", ANALYSES),
        collected_at=collected,
        kind=kind,
        replicate_of=fields.text("replicate_of", "bottle it repeats", 40, required=kind == "replicate") or "",
        sample_depth_m=fields.number("sample_depth_m", "depth of the sample", 0, 100, "depth", False),
        position=fields.choice("position", "position across the river", POSITIONS, "") or "",
        volume_ml=fields.number("volume_ml", "volume", 1, 20000, "plain", False),
        preservative=fields.text("preservative", "preservative", 60, required=False) or "",
        full={"yes": True, "no": False}.get(full),
        filtered=fields.ticked("filtered"),
        on_ice_at=on_ice,
        note=fields.text("note", "note", 2000, required=False) or "",
        entered=fields.entered,
    )
    if new.code and new.replicate_of.casefold() == new.code.casefold():
        fields.refuse("replicate_of", "A bottle can't repeat itself; enter the code of the other one.")
    return (None, fields.errors) if fields.errors else (new, {})


def unfolded(form, errors, findings):
    """Return whether something under "More about this bottle" needs to be seen."""
    touched = set(errors) | {one.field for one in findings}
    return bool(touched & set(MORE)) or form.get("kind", "sample") != "sample" or bool(form.get("note"))


def parse_hand_over(source, bottle_ids, show, bottles, now):
    """Return (NewHandOver, {}) or (None, {field: message}); bottles are those of the survey."""
    fields = Fields(source, show)
    known = {one.id: one for one in bottles}
    chosen = tuple(dict.fromkeys(one for one in bottle_ids if one in known))
    if not chosen:
        fields.refuse("bottles", "Tick the bottles that were handed over.")
    at = fields.past_time("at", "time of the hand-over", now)
    if at and (late := [known[one].code for one in chosen if known[one].collected_at > at + timedelta(minutes=1)]):
        fields.refuse("at", f"That is before {', '.join(late)} was filled; check the time and the bottles.")
    new = NewHandOver(
        id=fields.uuid("submission_id"),
        bottles=chosen,
        gave=fields.text("gave", "name of who gave them", 100),
        took=fields.text("took", "name of who took them", 100),
        at=at,
        place=fields.text("place", "place", 100, required=False) or "",
        temperature_c=fields.number("temperature_c", "temperature in the cooler", -30, 60, "temperature", False),
        seal=fields.text("seal", "seal", 60, required=False) or "",
        note=fields.text("note", "note", 2000, required=False) or "",
    )
    return (None, fields.errors) if fields.errors else (new, {})


def parse_result(source, show, bottle, now):
    """Return (NewResult, {}) or (None, {field: message}) of one bottle's result."""
    fields = Fields(source, show)
    times = {
        name: fields.past_time(name, label, now, required=False)
        for name, label in (
            ("arrived_at", "time it arrived"),
            ("started_at", "time the analysis began"),
            ("finished_at", "time it was finished"),
        )
    }
    typed = fields.text("result", "result", 40, required=False) or ""
    number = _result(fields, typed)
    limit = fields.number("limit_value", "reporting limit", 0, HIGHEST, "plain", False)
    controls = {name: _control(fields, name) for name in CONTROLS}
    for name, message in out_of_order(bottle, **times).items():
        fields.refuse(name, message)
    new = NewResult(
        id=fields.uuid("submission_id"),
        bottle_id=bottle.id,
        laboratory=fields.text("laboratory", "laboratory", 100, required=False) or "",
        lab_number=fields.text("lab_number", "laboratory's number", 40, required=False) or "",
        method=fields.text("method", "method", 60, required=False) or "",
        arrival_temp_c=fields.number("arrival_temp_c", "temperature on arrival", -30, 60, "temperature", False),
        **times,
        censor=number[0],
        value=number[1],
        limit_value=number[2] if number[2] is not None else limit,
        quality={name: value for name, value in controls.items() if value is not None},
        analyst=fields.text("analyst", "analyst", 100, required=False) or "",
        note=fields.text("note", "note", 2000, required=False) or "",
        entered=fields.entered | ({"result": {"text": typed, "unit": "1"}} if typed else {}),
    )
    if not typed and not any(times.values()):
        fields.refuse("result", "Enter the result, or when the bottle arrived or was set up.")
    return (None, fields.errors) if fields.errors else (new, {})


def out_of_order(bottle, arrived_at=None, started_at=None, finished_at=None):
    """Return a message for each time that comes before what must have happened first."""
    found = {}
    for name, at in (("arrived_at", arrived_at), ("started_at", started_at), ("finished_at", finished_at)):
        if at is not None and at < bottle.collected_at.replace(second=0, microsecond=0):
            found[name] = "That is before the bottle was filled; check both times."
    if started_at is not None and finished_at is not None and finished_at < started_at:
        found.setdefault("finished_at", "That is before the analysis began; check both times.")
    return found


def fresh_result(show, judged, last):
    """Return the texts of a fresh form: what is known of the bottle, and what one laboratory's results share.

    judged is a JudgedBottle, last the newest result of any bottle, or None.
    """
    known, form = judged.result, {"submission_id": str(uuid.uuid4())}
    for name in ("laboratory", "method", "analyst"):
        form[name] = getattr(known or last, name, "")
    if known is not None:
        form |= {name: show.typed_time(getattr(known, name)) for name in ("arrived_at", "started_at", "finished_at")}
        form |= {"lab_number": known.lab_number, "arrival_temp_c": show.typed("temperature", known.arrival_temp_c)}
        form |= {name: show.typed(quantity_of(name), known.quality.get(name)) for name in CONTROLS}
        if known.censor == "none":
            form["limit_value"] = show.typed("plain", known.limit_value)
    return form


def quantity_of(control):
    """Return the quantity of one of CONTROLS."""
    return "temperature" if control.endswith("_c") else "plain"


def _control(fields, name):
    words, _, low, high = CONTROLS[name]
    return fields.number(name, words[0].lower() + words[1:], low, high, quantity_of(name), False)


def _result(fields, typed):
    try:
        return read_result(typed)
    except NotANumber as trouble:
        if "two ways" in str(trouble):
            fields.refuse("result", f"Say which you mean: {trouble}.")
        fields.refuse("result", "Enter the result as a number, for example 4.1, or after < or >, for example <2.")
        return "none", None, None
