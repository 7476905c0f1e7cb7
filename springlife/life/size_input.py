"""The [size] table of a case: what a sized spring may be, and what it shall be best at."""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import BaseModel, BeforeValidator, ConfigDict, Field

from springlife import units


def _quantity(kind: str) -> BeforeValidator:
    return BeforeValidator(lambda text: units.parse(text, kind))


Length = Annotated[float, _quantity("length"), Field(gt=0)]


class SizeInput(BaseModel):
    """Limits of the search, SI; what is left out is not limited, or is that of the drawn spring."""

    model_config = ConfigDict(extra="forbid", strict=True, frozen=True, allow_inf_nan=False)

    goal: Literal["mass", "cost", "life"] = "mass"
    hold: Literal["stroke", "force"] = "stroke"
    grades: Annotated[list[str], Field(min_length=1)] | None = None
    peened: Annotated[list[bool], Field(min_length=1)] | None = None
    sizes: Literal["metric", "inch"] | Annotated[list[Length], Field(min_length=1)] | None = None
    largest_outer_diameter: Length | None = None
    least_inner_diameter: Length | None = None
    diameter_step: Length | None = None
    rate: Annotated[float, _quantity("rate"), Field(gt=0)] | None = None
    rate_tolerance: Annotated[float, Field(gt=0, lt=1)] = 0.05
    coil_step: Annotated[float, Field(gt=0, le=1)] = 0.25
    greatest_solid_length: Length | None = None
    greatest_free_length: Length | None = None
    greatest_mass: Annotated[float, _quantity("mass"), Field(gt=0)] | None = None
    working_frequency: Annotated[float, _quantity("frequency"), Field(gt=0)] | None = None
