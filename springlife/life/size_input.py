"""The [size] table of a case: what a sized spring may be, and what it shall be best at."""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import Field

from springlife.life.fields import Table, quantity

Size = Annotated[float, quantity("length"), Field(gt=0)]


class SizeInput(Table):
    """Limits of the search, SI; what is left out is not limited, or is that of the drawn spring."""

    goal: Literal["mass", "cost", "life"] = "mass"
    hold: Literal["stroke", "force"] = "stroke"
    grades: Annotated[list[str], Field(min_length=1)] | None = None
    peened: Annotated[list[bool], Field(min_length=1)] | None = None
    sizes: Literal["metric", "inch"] | Annotated[list[Size], Field(min_length=1)] | None = None
    largest_outer_diameter: Size | None = None
    least_inner_diameter: Size | None = None
    diameter_step: Size | None = None
    rate: Annotated[float, quantity("rate"), Field(gt=0)] | None = None
    rate_tolerance: Annotated[float, Field(gt=0, lt=1)] = 0.05
    coil_step: Annotated[float, Field(gt=0, le=1)] = 0.25
    greatest_solid_length: Size | None = None
    greatest_free_length: Size | None = None
    greatest_mass: Annotated[float, quantity("mass"), Field(gt=0)] | None = None
    working_frequency: Annotated[float, quantity("frequency"), Field(gt=0)] | None = None
