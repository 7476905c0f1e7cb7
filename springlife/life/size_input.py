"""The [size] table of a case: what a sized spring may be, and what it shall be best at."""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import Field, model_validator

from springlife.life.fields import Table, quantity
from springlife.units import METRIC

Size = Annotated[float, quantity("length"), Field(gt=0)]
Coils = Annotated[float, Field(gt=0)]


class SizeInput(Table):
    """Limits of the search, SI; what is left out is not limited, or is that of the drawn spring."""

    goal: Literal["mass", "cost", "life"] = "mass"
    hold: Literal["stroke", "preload", "force"] = "stroke"
    grades: Annotated[list[str], Field(min_length=1)] | None = None
    peened: Annotated[list[bool], Field(min_length=1)] | None = None
    sizes: Literal["metric", "inch"] | Annotated[list[Size], Field(min_length=1)] | None = None
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
