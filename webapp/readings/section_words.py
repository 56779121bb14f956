"""What the points of one occasion say of the section, in words: mixed from bank to bank, layered from top to bottom."""

import math


def spreads(section):
    """Return how far the highest and the lowest point of a section lie apart, as a sentence; empty for one point."""
    parts = [
        words
        for value, words in (
            (section.do_spread, f"oxygen {section.do_spread:.2f} mg/L apart"),
            (section.temp_spread, f"water {section.temp_spread:.1f} °C warmer or colder"),
            (section.conductance_spread_percent, f"conductance {section.conductance_spread_percent:.1f} % apart"),
        )
        if math.isfinite(value)
    ]
    return f"Highest and lowest of {section.points} positions: {', '.join(parts)}." if parts else ""


def in_short(occasions):
    """Return the latest verdicts at a station in a few words, empty where nothing can be told."""
    mixed = [one.section for one in occasions if one.section.mixed is not None]
    layers = [one.layers for one in occasions if one.layers.stratified is not None]
    words = []
    if mixed:
        apart = mixed[-1].do_spread
        told = f" ({apart:.2f} mg/L across)" if math.isfinite(apart) else ""
        words.append(f"{'Mixed' if mixed[-1].mixed else 'Not mixed'} from bank to bank{told}")
    if layers:
        words.append("layered" if layers[-1].stratified else "not layered")
    text = ", ".join(words)
    return text[:1].upper() + text[1:]
