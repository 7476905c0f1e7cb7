"""The [surge] table of a case: how the wave in the coils is followed, checked in form."""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import Field, model_validator

from springlife.life.fields import Table, quantity

Damping = Annotated[float, Field(ge=1e-3, le=0.5)]  # less is remembered for thousands of waves; more is no spring


class CamInput(Table):
    """One [[surge.cam]]: the lift over one turn of a cam that moves the spring's end, and the speeds to judge."""

    name: Annotated[str, Field(min_length=1)]
    cam: str  # the lift table, a file beside the case
    angle: str | int  # column of the cam angle, in degrees, over one whole turn
    lift: str | int  # column of the lift
    unit: str | None = None  # of the lift
    installed_deflection: Annotated[float, quantity("length"), Field(ge=0)]  # at no lift
    speeds: Annotated[list[Annotated[float, Field(gt=0)]], Field(min_length=1, max_length=1000)]  # turns a minute


class SurgeInput(Table):
    """The [surge] table; what is left out comes from data/surge.toml."""

    damping: Damping | None = None  # ratio of the first mode
    damping_range: Annotated[list[Damping], Field(min_length=2, max_length=2)] | None = None
    positions: Annotated[int, Field(ge=2, le=500)] | None = None  # places along the wire, both ends included
    up_to: Annotated[float, quantity("frequency"), Field(gt=0)] | None = None  # motion above is left out
    moving_ends: Literal["one", "both"] = "one"
    cam: list[CamInput] = []

    @model_validator(mode="after")
    def _ordered(self) -> SurgeInput:
        names = [cam.name for cam in self.cam]
        twice = sorted({name for name in names if names.count(name) > 1})
        if twice:
            raise ValueError(f"cam name {twice[0]!r} is used twice; give each cam its own")
        if self.damping_range is None:
            return self
        low, high = self.damping_range
        if not low < high:
            raise ValueError(f"damping_range is [{low:g}, {high:g}]; give the lower ratio first")
        if self.damping is not None and not low <= self.damping <= high:
            raise ValueError(f"damping {self.damping:g} is not within damping_range [{low:g}, {high:g}]")
        return self
