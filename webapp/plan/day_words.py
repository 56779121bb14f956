"""What the day changes against the plan, in sentences."""

from datetime import timedelta

from webapp.display import hours
from webapp.plan.day import UNUSED


def effect(survey, show, planned, today):
    """Return the low point as planned and with the day's conditions, and what that does to travel times."""
    if not today.ready:
        return today.missing
    if not planned.ready:
        return planned.missing
    words = [
        f"As planned: {_lowest(show, planned)}.",
        f"With the day's conditions: {_lowest(show, today)}.",
        *(note.said(show) for note in today.warnings if note.name == UNUSED),
    ]
    place, before = planned.critical.distance_km, planned.critical.travel_time_h
    now = today.at(place).travel_time_h
    if abs(now - before) * 60 < 1:
        return (*words, "Travel times stay as planned.")
    words.append(f"Water takes {hours(now)} to the planned low point instead of {hours(before)}.")
    if survey.sampling == "same_parcel" and survey.release_at is not None:
        times = [show.day_clock(survey.release_at + timedelta(hours=each)) for each in (now, before)]
        words.append(f"The parcel is there {times[0]} instead of {times[1]}.")
    return tuple(words)


def _lowest(show, prediction):
    point = prediction.critical
    lowest = show.text("oxygen", point.do_mg_l, 1)
    if prediction.never_sags:
        return f"no sag, oxygen is lowest where the outfall mixes, {lowest}"
    words = f"lowest oxygen {lowest}, {show.place(point.distance_km)}, after {hours(point.travel_time_h)} of travel"
    return words + (", still falling where the plan ends" if prediction.still_falling else "")
