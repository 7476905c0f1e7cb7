"""The [surge] table of a case: how the wave in the coils is followed, checked in form."""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import BaseModel, BeforeValidator, ConfigDict, Field, model_validator

from springlife.units import parse

Damping = Annotated[float, Field(ge=1e-3, le=0.5)]  # less is remembered for thousands of waves; more is no spring


class _Table(BaseModel):
    """A table of the case file: no unknown keys, no silent conversions."""

    model_config = ConfigDict(extra="forbid", strict=True, frozen=True, allow_inf_nan=False)


def _amount(kind: str) -> Any:
    return BeforeValidator(lambda text: parse(text, kind))


class SurgeInput(_Table):
    """The [surge] table; what is left out comes from data/surge.toml."""

    damping: Damping | None = None  # ratio of the first mode
    damping_range: Annotated[list[Damping], Field(min_length=2, max_length=2)] | None = None
    positions: Annotated[int, Field(ge=2, le=500)] | None = None  # places along the wire, both ends included
    up_to: Annotated[float, _amount("frequency"), Field(gt=0)] | None = None  # motion above is left out
    moving_ends: Literal["one", "both"] = "one"

    @model_validator(mode="after")
    def _ordered(self) -> SurgeInput:
        if self.damping_range is None:
            return self
        low, high = self.damping_range
        if not low < high:
            raise ValueError(f"damping_range is [{low:g}, {high:g}]; give the lower ratio first")
        if self.damping is not None and not low <= self.damping <= high:
            raise ValueError(f"damping {self.damping:g} is not within damping_range [{low:g}, {high:g}]")
        return self
