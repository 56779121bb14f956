"""Readings that may be kept together: those about which nothing wants a look of their own."""

from dataclasses import dataclass

from webapp.errors import NotAllowed
from webapp.models import ReadingEvent
from webapp.readings.judging import judgement_of
from webapp.readings.layers import ANSWERED, ASKED, KEPT, FinalReading
from webapp.readings.quality_words import REASONS, TELLING
from webapp.review.service import held
from webapp.surveys.service import remember

# Reasons that tell where a number comes from, or that speak of the day rather than of the number.
MILD = {*TELLING, "late_for_parcel", "early_for_parcel", "position_poor", "salinity_ignored"}


@dataclass(frozen=True)
class LeftOut:
    """A reading that was not kept with the others, and why."""

    reading: FinalReading
    why: str


def why_alone(judged, person_id):
    """Return why a reading can't be kept together with others; empty where it can."""
    now = judged.reading
    if judged.author_id == person_id:
        return "you took it yourself"
    if now.review in (ASKED, ANSWERED):
        return "a question about it is open" if now.review == ASKED else "the crew's answer wants reading"
    if now.set_aside:
        return "it is set aside"
    if now.do_mg_l is None:
        return "no oxygen was recorded"
    hard = [REASONS[reason] for reason in judged.reasons if reason not in MILD]
    return "; ".join(hard)


def keep_many(db, survey, counts, reason, person):
    """Keep the readings that may be kept together; return (how many are kept, LeftOuts).

    counts holds how many decisions whoever ticked a reading knew of, by its id; None where they trust the rules alone.
    Those kept by the same person before, with the same reason, count as kept: the form may be sent twice.
    """
    if not person.may("correct"):
        raise NotAllowed("Readings are reviewed by the lead or the office.")
    judgement = judgement_of(db, survey)
    kept, left_out, new = 0, [], []
    for reading in held(db, survey.id, [one for one in counts if one in judgement.by_id]):
        judged = judgement.by_id[reading.id]
        last = reading.events[-1] if reading.events else None
        if last and (last.kind, last.made_by_id, last.reason) == (KEPT, person.id, reason):
            kept += 1
        elif why := _why_not(judged, reading, counts[reading.id], person.id):
            left_out.append(LeftOut(judged.reading, why))
        else:
            new.append(reading)
    if new:
        particulars = {"readings": len(new), "reason": reason}
        remember(db, survey.id, person.id, "readings kept", particulars=particulars)
        for reading in new:
            reading.events.append(ReadingEvent(kind=KEPT, reason=reason, made_by_id=person.id))
        db.commit()
    return kept + len(new), sorted(left_out, key=lambda one: (one.reading.taken_at, one.reading.id))


def _why_not(judged, reading, known, person_id):
    if known is not None and known != len(reading.events):
        return "somebody decided about it since you opened the page"
    if judged.reading.review == KEPT:
        return "it was looked at already"
    return why_alone(judged, person_id)
