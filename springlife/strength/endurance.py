"""Published endurance data of spring wire: Zimmerli's pair and the handbook's fractions.

The numbers, their sources and where they apply are data/endurance.toml; stresses come out in Pa.
"""

from __future__ import annotations

import tomllib
from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from typing import Any

from springlife.errors import InputError, nearest
from springlife.units import parse

BASES = ("zimmerli", "handbook")


@dataclass(frozen=True)
class Pair:
    """Amplitude and mean (Pa) that wire endures for ``cycles``, with what they come from."""

    Ssa: float
    Ssm: float
    cycles: float
    source: str
    provenance: str


@dataclass(frozen=True)
class Fractions:
    """Greatest stress at R = 0 as a fraction of the tensile strength, falling with ``cycles``."""

    cycles: tuple[float, ...]
    fractions: tuple[float, ...]
    source: str
    provenance: str


@dataclass(frozen=True)
class Scope:
    """Where Zimmerli's pair applies: diameters under m, temperatures up to K, lives up to cycles."""

    wire_diameter_below: float
    material: str
    temperature_up_to: float
    environment: str
    cycles_up_to: float
    source: str
    provenance: str


@cache
def data() -> dict[str, Any]:
    """Return data/endurance.toml as written: every value with its source and provenance."""
    text = files("springlife").joinpath("data/endurance.toml").read_text(encoding="utf-8")
    return tomllib.loads(text)


def zimmerli(shot_peened: bool) -> Pair:
    """Return the amplitude and mean that steel spring wire endures without end, in Pa.

    Notes
    -----
    Ssa = 35 kpsi at Ssm = 55 kpsi, shot-peened 57.5 at 77.5, whatever the size, grade and tensile strength,
    inside :func:`zimmerli_scope`. The curvature factor is already in these stresses. They are not half of a
    peak stress at R = 0, as some textbooks print an endurance limit.

    References
    ----------
    F. P. Zimmerli, The Mainspring, no. 17, 1957; Shigley's Mechanical Engineering Design, eq. 10-28, 10-29.
    """
    table = data()["zimmerli"]
    pair = table["peened" if shot_peened else "unpeened"]
    return Pair(
        Ssa=parse(pair["Ssa"], "stress"),
        Ssm=parse(pair["Ssm"], "stress"),
        cycles=table["knee"]["cycles"],
        source=table["source"],
        provenance=table["provenance"],
    )


@cache
def zimmerli_scope() -> Scope:
    """Return where Zimmerli's pair applies; outside it the pair is used only with a warning."""
    scope = data()["zimmerli"]["scope"]
    return Scope(
        **scope
        | {
            "wire_diameter_below": parse(scope["wire_diameter_below"], "length"),
            "temperature_up_to": parse(scope["temperature_up_to"], "temperature"),
        }
    )


def handbook(family: str | None, shot_peened: bool) -> Fractions:
    """Return the handbook's fractions of tensile strength at R = 0 for a family of wires.

    Parameters
    ----------
    family : str or None
        A key of ``[handbook.family]`` in data/endurance.toml; None for wires that the handbook leaves out.

    Raises
    ------
    InputError
        The handbook has no fractions for this wire.

    Notes
    -----
    They are allowables rather than medians; conditions: no surge, room temperature, no corrosion.

    References
    ----------
    Associated Spring, Design Handbook, 1987 (memory).
    """
    table = data()["handbook"]
    families = table["family"]
    if family is None:
        covered = "; ".join(entry["wires"] for entry in families.values())
        raise InputError(
            f"endurance 'handbook' has fractions for {covered}, none for this wire; use 'zimmerli' or a curve file"
        )
    if family not in families:
        raise InputError(f"handbook family {family!r} is not known; {nearest(family, families)}")
    return Fractions(
        cycles=tuple(table["cycles"]),
        fractions=tuple(families[family]["peened" if shot_peened else "unpeened"]),
        source=table["source"],
        provenance=table["provenance"],
    )
