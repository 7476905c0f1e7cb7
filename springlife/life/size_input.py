"""The [size] table of a case: what a sized spring may be, and what it shall be best at."""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import Field, PlainValidator, model_validator

from springlife.errors import nearest
from springlife.life.fields import Table, quantity
from springlife.units import METRIC, parse

Size = Annotated[float, quantity("length"), Field(gt=0)]
SERIES = ("metric", "inch")
Coils = Annotated[float, Field(gt=0)]


def _sizes(given: object) -> str | list[float] | None:
    """Read the name of a series, or diameters with their units."""
    if isinstance(given, str):
        if given not in SERIES:
            raise ValueError(f"{given!r} is not known; {nearest(given, SERIES)}, or list diameters")
        return given
    if not isinstance(given, list) or not given:
        raise ValueError(f"{given!r} cannot be used; give 'metric', 'inch' or a list such as ['2 mm', '2.25 mm']")
    sizes = [parse(size, "length") for size in given]
    for text, size in zip(given, sizes, strict=True):
        if not size > 0:
            raise ValueError(f"{text!r} is no wire diameter; it must be above zero")
    return sizes


class SizeInput(Table):
    """Limits of the search, SI; what is left out is not limited, or is that of the drawn spring."""

    goal: Literal["mass", "cost", "life"] = "mass"
    hold: Literal["stroke", "preload", "force"] = "stroke"
    grades: Annotated[list[str], Field(min_length=1)] | None = None
    peened: Annotated[list[bool], Field(min_length=1)] | None = None
    sizes: Annotated[str | list[float] | None, PlainValidator(_sizes)] = None
    largest_outer_diameter: Size | None = None
    least_inner_diameter: Size | None = None
    diameter_step: Size | None = None
    rate: Annotated[float, quantity("rate"), Field(gt=0)] | None = None
    rate_tolerance: Annotated[float, Field(gt=0, lt=1)] = 0.05
    least_coils: Coils | None = None
    greatest_coils: Coils | None = None
    coil_step: Annotated[float, Field(gt=0, le=1)] = 0.25
    greatest_solid_length: Size | None = None
    greatest_free_length: Size | None = None
    greatest_mass: Annotated[float, quantity("mass"), Field(gt=0)] | None = None
    working_frequency: Annotated[float, quantity("frequency"), Field(gt=0)] | None = None

    @model_validator(mode="after")
    def _ordered(self) -> SizeInput:
        inner, outer = self.least_inner_diameter, self.largest_outer_diameter
        if inner is not None and outer is not None and not inner < outer:
            seen = f"least_inner_diameter {METRIC(inner, 'length')} is not below"
            raise ValueError(f"{seen} largest_outer_diameter {METRIC(outer, 'length')}; widen the ring between them")
        least, greatest = self.least_coils, self.greatest_coils
        if least is not None and greatest is not None and not least <= greatest:
            raise ValueError(f"least_coils {least:g} is above greatest_coils {greatest:g}; exchange them")
        return self
