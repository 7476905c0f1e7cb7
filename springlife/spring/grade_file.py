"""A file of wire grades, read and checked; a fault names the file, grade, key, value and remedy."""

from __future__ import annotations

from collections.abc import Iterator
from math import inf

from springlife.errors import InputError, nearest
from springlife.spring.grade import Grade, Moduli, Tensile
from springlife.tables import Table, number, parse_toml

# Groups of numbers, each with a source, and the keys inside.
_GROUPS = {
    "tensile": ("segments",),
    "tensile_strength": ("value", "min", "max"),
    "moduli": ("segments",),
    "static": ("before", "after"),
    "temperature": ("greatest",),
    "density": ("value",),
    "cost": ("relative",),
}
_SINGLE = ("title", "standard", "ferrous", "stainless", "cyclic_family", "note")
_PROVENANCES = ("published", "memory", "common practice", "certificate", "test")


def read_grades(text: str, where: str) -> dict[str, Grade]:
    """Return the grades of a TOML text by name; ``where`` names the file in messages.

    Raises
    ------
    InputError
        Not TOML, an unknown or missing key, or a value that cannot be used.
    """
    raw = parse_toml(text, where)
    whole = Table(raw, f"{where}: ")
    return {name: _grade(name, whole.table(name)) for name in raw}


def _grade(name: str, place: Table) -> Grade:
    place.only(*_SINGLE, *_GROUPS)
    if ("tensile" in place.raw) == ("tensile_strength" in place.raw):
        raise InputError(f"{place.where[:-1]}: give exactly one of tensile and tensile_strength")
    groups = {key: place.table(key) for key in _GROUPS if key in place.raw}
    sources = tuple(_source(key, group) for key, group in groups.items())
    tensile, bounds = _tensile(place)
    static = place.table("static")
    before = static.number("before", 0.01, 1.0)
    return Grade(
        name=name,
        title=place.text("title"),
        standard=place.text("standard", ""),
        tensile=tensile,
        tensile_bounds=bounds,
        moduli_by_size=tuple(_moduli(place.table("moduli"))),
        static_before=before,
        static_after=_after(static, before),
        greatest_temperature=place.table("temperature").quantity("greatest", "temperature"),
        density=place.table("density").quantity("value", "density"),
        relative_cost=groups["cost"].number("relative", 0.01, 1000.0) if "cost" in groups else None,
        ferrous=place.flag("ferrous"),
        stainless=place.flag("stainless", False),
        cyclic_family=place.text("cyclic_family") if "cyclic_family" in place.raw else None,
        note=place.text("note", ""),
        sources=sources,
    )


def _source(key: str, group: Table) -> str:
    """Check a group's keys and return where its numbers come from, as one line."""
    group.only(*_GROUPS[key], "source", "provenance")
    source, provenance = group.text("source"), group.text("provenance", "certificate")
    if provenance not in _PROVENANCES:
        raise group.wrong("provenance", nearest(provenance, _PROVENANCES))
    return f"{key.replace('_', ' ')}: {source} ({provenance})"


def _tensile(place: Table) -> tuple[tuple[Tensile, ...], tuple[float, float] | None]:
    """Return the segments, and the bounds of a strength that is given directly."""
    if "tensile" in place.raw:
        return tuple(_segments(place.table("tensile"))), None
    given = place.table("tensile_strength")
    value = given.quantity("value", "stress")
    if ("min" in given.raw) != ("max" in given.raw):
        raise InputError(f"{given.where[:-1]}: give both min and max, or neither")
    bounds = (given.quantity("min", "stress"), given.quantity("max", "stress")) if "min" in given.raw else None
    if bounds and not bounds[0] <= value <= bounds[1]:
        raise given.wrong("value", f"it must lie from min {given.raw['min']!r} to max {given.raw['max']!r}")
    return (Tensile(value, 1.0, 0.0, 0.0, inf),), bounds


def _segments(group: Table) -> Iterator[Tensile]:
    above = None
    for one in group.tables("segments"):
        one.only("A", "at", "m", "from", "to")
        segment = Tensile(
            A=one.quantity("A", "stress"),
            at=one.quantity("at", "length"),
            m=one.number("m", 0.0, 0.99),
            low=one.quantity("from", "length"),
            high=one.quantity("to", "length"),
        )
        if segment.high <= segment.low:
            raise one.wrong("to", f"it must be above from {one.raw['from']!r}")
        if above is not None and abs(segment.low / above - 1) > 1e-9:
            raise one.wrong("from", "it must be where the segment before ends")
        above = segment.high
        yield segment


def _moduli(group: Table) -> Iterator[Moduli]:
    segments = group.tables("segments")
    above = 0.0
    for one in segments:
        one.only("to", "E", "G")
        last = one is segments[-1]
        if last == ("to" in one.raw):
            raise one.wrong("to", "the last segment has no 'to', every other one has")
        high = inf if last else one.quantity("to", "length")
        if high <= above:
            raise one.wrong("to", "it must be above that of the segment before")
        above = high
        E, G = one.quantity("E", "stress"), one.quantity("G", "stress")
        if E <= G:
            raise one.wrong("G", f"it must be below E {one.raw['E']!r}")
        yield Moduli(high, E, G)


def _after(static: Table, before: float) -> tuple[float, float]:
    fault = static.wrong("after", f"write its lower and upper end, such as [0.65, 0.75], from {before:g} to 1")
    ends = static.raw.get("after")
    if not isinstance(ends, list) or len(ends) != 2:
        raise fault
    low = number(ends[0], before, 1.0, fault)
    return low, number(ends[1], low, 1.0, fault)
