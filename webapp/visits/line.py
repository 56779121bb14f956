"""The visits of a day as the field sheet tells them: one line at each station, and what changed."""

from dataclasses import dataclass

from webapp.visits.changes import news_of_the_day
from webapp.visits.layers import final_visit


@dataclass(frozen=True)
class SheetVisits:
    """lines maps a station's code to (visit, words) of its last visit; news holds (visit, finding)."""

    lines: dict
    news: list


def visits_on_sheet(show, visits, settings, now):
    """Return the SheetVisits of a survey's Visits."""
    finals = sorted((one for one in map(final_visit, visits) if one.arrived_at), key=lambda one: one.arrived_at)
    last = {one.station_code: one for one in finals}
    count = {code: sum(one.station_code == code for one in finals) for code in last}
    lines = {code: (one, _words(show, one, count[code], now)) for code, one in last.items()}
    return SheetVisits(lines, news_of_the_day(finals, settings))


def _words(show, visit, count, now):
    """Return a visit in one line: which it is, whose, from when to when, and whether anything is open."""
    began = show.when(visit.arrived_at, now)
    ended = f" to {show.when(visit.left_at, visit.arrived_at)}" if visit.left_at else ", not left yet"
    words = f"{f'Visit {count}' if count > 1 else 'Visit'} by {visit.opened_by}, {began}{ended}"
    if visit.facts.get("status") == "partial":
        words += f"; partial: {visit.facts.get('partial_reason') or 'no reason given'}"
    return f"{words}; two entries disagree" if visit.disputes else words
