"""Where the sun stood: the time of day that a river goes by, which is not the clock's."""

from dataclasses import dataclass
from datetime import timedelta

from astral import Observer
from astral.sun import elevation, noon

from webapp.sag.budget import position_of

# The sun's upper edge is on the horizon when its middle is this far below, with the air's refraction. [degrees]
_HORIZON_DEG = -0.833
_DAY = timedelta(days=1)


@dataclass(frozen=True)
class Sun:
    """state is "before sunrise", "morning", "afternoon" or "after sunset"; solar_time counts from the sun's noon."""

    state: str
    solar_time: str


def sun_at(position, instant):
    """Return the Sun at an instant over a (latitude, longitude), None without a position."""
    if position is None or instant is None:
        return None
    here = Observer(*position)
    # Noon by the place's own meridian, whatever the zone: the nearest one of three days.
    day = (instant + timedelta(hours=position[1] / 15)).date()
    nearest = min((noon(here, day + _DAY * one) for one in (-1, 0, 1)), key=lambda at: abs(instant - at))
    after_noon = instant - nearest
    minutes = round(after_noon.total_seconds() / 60 + 720) % 1440
    up = elevation(here, instant) > _HORIZON_DEG
    states = ("morning", "afternoon") if up else ("before sunrise", "after sunset")
    return Sun(states[after_noon >= timedelta()], f"{minutes // 60:02d}:{minutes % 60:02d}")


def place_of(tables, code):
    """Return (latitude, longitude) of a station's access point, else of the day or another access point, else None."""
    tables = tables or {}
    station = next((one for one in tables.get("stations") or [] if one["code"] == code), {})
    name = station.get("access")
    access = next((one for one in tables.get("access") or [] if name and one["name"] == name), {})
    pair = (access.get("latitude"), access.get("longitude"))
    return pair if None not in pair else position_of(tables)
