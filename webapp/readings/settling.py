"""What the several raw values of a reading give: their median, and whether they had settled."""

from dataclasses import replace

from calc.quality_series import stability
from calc.settings import Settings


def thresholds(settings_version):
    """Return the survey's Settings; the trade's defaults where a survey has none."""
    return Settings.from_dict(settings_version.thresholds) if settings_version else Settings()


def settle(new, settings):
    """Return the NewReading with what its raw values give; as it is where there are none.

    Oxygen is their median. stable is None where they are too few to tell.
    """
    if not new.series:
        return new
    found = stability_of(new.series, settings)
    times = [one["after_s"] for one in new.series if one["after_s"] is not None]
    return replace(
        new,
        do_mg_l=spread_of(new.series, settings).median,
        soak_s=new.soak_s if new.soak_s is not None else max(times, default=None),
        stable=found.stable,
    )


def stability_of(series, settings):
    """Return calc's Stability of the raw values: of oxygen, or of the temperature where only that was moving.

    None without values. series is that of a Reading or NewReading.
    """
    if not series:
        return None
    oxygen = spread_of(series, settings)
    temperature = _stability(series, settings, "water_temp_c", "temperature")
    return temperature if oxygen.stable and temperature.stable is False else oxygen


def spread_of(series, settings):
    """Return calc's Stability of the raw values of oxygen, or None without any: how many, their spread and median."""
    return _stability(series, settings, "do_mg_l", "do") if series else None


def _stability(series, settings, key, parameter):
    return stability([one[key] for one in series], [one["after_s"] for one in series], settings, parameter=parameter)
