"""The [scatter] table of a case: what takes the place of a default distribution, checked in form."""

from __future__ import annotations

from typing import Annotated, Literal

from pydantic import Field, model_validator

from springlife.errors import nearest
from springlife.life.fields import Positive, Table, quantity

VARIABLES = (
    "wire_diameter", "coil_diameter", "active_coils", "free_length", "shear_modulus", "tensile_strength",
    "endurance_strength", "life", "duty", "allowed_damage",
)  # fmt: skip
SAMPLES = (1024, 1 << 20)  # least and most: with fewer, the interval of B1 is too narrow


class _Tolerance(Table):
    """A normal distribution cut off at the half-range; ``sigmas`` standard deviations make the half-range."""

    half_range: float | None = None
    share: Annotated[float, Field(gt=0, lt=0.5)] | None = None  # half-range as a share of the nominal value
    sigmas: Annotated[float, Field(ge=1, le=6)] | None = None

    @model_validator(mode="after")
    def _one_range(self) -> _Tolerance:
        if (self.half_range is None) == (self.share is None):
            raise ValueError("give exactly one of half_range and share")
        return self


class LengthTolerance(_Tolerance):
    """A tolerance on a length."""

    half_range: Annotated[float, quantity("length"), Field(gt=0)] | None = None


class StressTolerance(_Tolerance):
    """A tolerance on a modulus or a strength."""

    half_range: Annotated[float, quantity("stress"), Field(gt=0)] | None = None


class CoilTolerance(_Tolerance):
    """A tolerance on a number of coils."""

    half_range: Positive | None = None


class FactorScatter(Table):
    """A lognormal factor about its median, by its coefficient of variation."""

    cov: Annotated[float, Field(gt=0, le=2)]


class LifeScatter(Table):
    """A lognormal factor on life, by the standard deviation of its decadic logarithm."""

    log10_sd: Annotated[float, Field(gt=0, le=2)]


class ScatterInput(Table):
    """The [scatter] table; a variable left out takes its default from data/scatter.toml."""

    wire_diameter: LengthTolerance | None = None
    coil_diameter: LengthTolerance | None = None
    active_coils: CoilTolerance | None = None
    free_length: LengthTolerance | None = None
    shear_modulus: StressTolerance | None = None
    tensile_strength: StressTolerance | None = None
    endurance_strength: FactorScatter | None = None
    life: LifeScatter | None = None
    duty: FactorScatter | None = None
    allowed_damage: FactorScatter | None = None
    off: list[str] = []
    samples: int = 1 << 14
    seed: int = 1
    strengths_are: Literal["median", "B10"] = "median"

    @model_validator(mode="after")
    def _consistent(self) -> ScatterInput:
        least, most = SAMPLES
        if not least <= self.samples <= most or self.samples & (self.samples - 1):
            raise ValueError(f"samples is {self.samples}; give a power of two from {least} to {most}, such as 16384")
        if self.seed < 0:
            raise ValueError(f"seed is {self.seed}; give a whole number from 0 up")
        for name in self.off:
            if name not in VARIABLES:
                raise ValueError(f"off names {name!r}, which is not known; {nearest(name, VARIABLES)}")
            if getattr(self, name) is not None:
                raise ValueError(f"{name} is switched off and given a distribution; do one of the two")
        if set(self.off) == set(VARIABLES):
            raise ValueError("off switches every variable off, so nothing scatters; leave at least one")
        return self
