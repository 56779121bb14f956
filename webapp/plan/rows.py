"""Rows of a plan's tables: their order, what they are called, and what one row may not be beside the others."""

from webapp.plan.tables import ALL_TABLES, KINDS, PLAN_TABLES

# Rows closer than this are at one place: what rounding of a typed distance may leave. [km]
SAME_PLACE_KM = 0.05
NAMED_ONCE = {"access", "stations"}


def in_order(key, rows):
    """Return the rows of a table in the order people read them: down the river."""
    if key in ("basis", "day"):
        return list(rows)
    first = list(KINDS)
    order = ALL_TABLES[key].order

    def place(row):
        kind = row.get("kind")
        group = first.index(kind) if kind in first[:2] else len(first)
        distance = row.get(order)
        return group, distance is None, distance if isinstance(distance, (int, float)) else 0.0

    return sorted(rows, key=place)


def row_title(key, row, number=None):
    """Return what a row is called: its name or code, else what it is, else its number."""
    table = PLAN_TABLES[key]
    if name := str(row.get(table.key_column) or "").strip() if key != "basis" else table.title:
        return name
    if (kind := KINDS.get(row.get("kind"))) is not None:
        return kind
    return f"{table.one.capitalize()} {number}" if number else f"{table.one.capitalize()} without a name"


def with_row(rows, index, row):
    """Return the rows with one replaced, or added where index is None."""
    rows = list(rows)
    if index is None:
        return [*rows, row]
    rows[index] = row
    return rows


def refused_rows(key, rows):
    """Return [(position, column key, message)] for rows that can't stand as they are or beside the others."""
    found = []
    if key in NAMED_ONCE:
        found += _named_twice(PLAN_TABLES[key], rows)
    check = {"reaches": _reach, "waters": _water, "stations": _station}.get(key)
    for position, row in enumerate(rows):
        if check is not None and (refusal := check(row, rows[:position])) is not None:
            found.append((position, *refusal))
    return found


def _named_twice(table, rows):
    seen, found = {}, []
    for position, row in enumerate(rows):
        name = str(row.get(table.key_column) or "")
        if name and name.casefold() in seen:
            what = "code" if table.key == "stations" else "name"
            message = f"There is another {table.one} {seen[name.casefold()]}; give this one a {what} of its own."
            found.append((position, table.key_column, message))
        seen.setdefault(name.casefold(), name)
    return found


def _reach(row, _above):
    if None not in (row.get("from_km"), row.get("to_km")) and row["to_km"] <= row["from_km"]:
        return "to_km", "It ends above where it begins; a reach runs down the river. Check both places."
    return None


def _water(row, above):
    kind, distance = row.get("kind"), row.get("distance_km")
    if kind in ("upstream", "outfall") and any(other.get("kind") == kind for other in above):
        what = KINDS[kind][0].lower() + KINDS[kind][1:]
        return "kind", f"There is a row for {what} already; a further discharge is “{KINDS['tributary'].lower()}”."
    if kind == "outfall" and distance is not None and abs(distance) > 0.001:
        return "distance_km", "Distances count from the outfall itself; leave its place empty."
    if kind in ("tributary", "withdrawal") and distance is None:
        return "distance_km", "Enter where it meets the river."
    return None


def refused_code(code):
    """Return why a station can't have a code, or None. Its pages have the code in their address."""
    if "/" in code or code in (".", ".."):
        return "A code stands in the address of a page: use letters, digits and hyphens, for example D4-a."
    return None


def _station(row, _above):
    if (refusal := refused_code(str(row.get("code") or ""))) is not None:
        return "code", refusal
    if row.get("state") in ("added", "dropped") and not row.get("reason"):
        return "reason", "Say why it was added on site or dropped."
    return None


def next_codes(taken, how_many):
    """Return codes that no station of the survey ever had: S01, S02, …"""
    used, codes, number = {code.casefold() for code in taken}, [], 0
    while len(codes) < how_many:
        number += 1
        if (code := f"S{number:02d}").casefold() not in used:
            codes.append(code)
    return codes
