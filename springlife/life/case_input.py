"""The tables of a case file as models: every key, its kind and what it may be."""

from __future__ import annotations

from typing import Annotated, Any, Literal

from pydantic import Field, field_validator, model_validator

from springlife import units
from springlife.errors import nearest
from springlife.life.fields import Length, Name, Share, Table, Text, quantity
from springlife.life.limits import check_limits
from springlife.life.scatter_input import ScatterInput
from springlife.life.size_input import SizeInput
from springlife.life.surge_input import SurgeInput
from springlife.strength.endurance import BASES

FORMAT = 1


class SpringInput(Table):
    """The [spring] table, in SI."""

    grade: str
    grade_file: Text | None = None
    wire_diameter: Annotated[Length, Field(gt=0)]
    mean_diameter: Length | None = None
    outer_diameter: Length | None = None
    inner_diameter: Length | None = None
    total_coils: float
    ends: Literal["plain", "plain and ground", "squared", "squared and ground"] = "squared and ground"
    free_length: Length
    shot_peened: bool = False
    set_removed: bool = False
    supports: Literal["flat-flat", "flat-pivoted", "pivoted-pivoted", "clamped-free"] = "flat-flat"
    guided: bool = False
    temperature: Annotated[float, quantity("temperature"), Field(gt=0)] = 293.15
    tensile_strength: Annotated[float, quantity("stress"), Field(gt=0)] | None = None
    shear_modulus: Annotated[float, quantity("stress"), Field(gt=0)] | None = None
    measured_rate: Annotated[float, quantity("rate"), Field(gt=0)] | None = None
    finish: Literal["none", "plated", "coated"] = "none"
    baked: bool = False
    environment: Literal["dry", "corrosive"] = "dry"

    @model_validator(mode="after")
    def _one_diameter(self) -> SpringInput:
        given = [name for name in DIAMETERS if getattr(self, name) is not None]
        if len(given) != 1:
            seen = " and ".join(given) if given else "none"
            raise ValueError(f"give exactly one of {', '.join(DIAMETERS)}; {seen} given")
        return self


# What the part itself does not hold: where it works and how it was finished.
AROUND_THE_PART = {"grade", "grade_file", "finish", "baked", "environment"}
DIAMETERS = ("mean_diameter", "outer_diameter", "inner_diameter")
RATE_MAKERS = {"grade", "grade_file", "wire_diameter", "total_coils", "ends", "shear_modulus", *DIAMETERS}


class BlockInput(Table):
    """One block of a specified programme: deflection limits and a number of cycles."""

    low: Length
    high: Length
    cycles: Annotated[int, Field(ge=1)]

    @model_validator(mode="after")
    def _ordered(self) -> BlockInput:
        if not self.low < self.high:
            raise ValueError("'low' must be less than 'high'")
        return self


class EventInput(Table):
    """One [[duty.event]]: a record or a list of blocks, and how often it happens in a pass."""

    name: Name
    repeats: Annotated[int, Field(ge=1)] = 1
    blocks: Annotated[list[BlockInput], Field(min_length=1)] | None = None
    record: Name | None = None
    channel: str | int | None = None
    time: str | int | None = None
    time_unit: str | None = None
    sample_rate: Annotated[float, quantity("frequency"), Field(gt=0)] | None = None
    unit: str | None = None
    measures: Literal["deflection", "travel", "length", "force"] = "deflection"
    installed_deflection: Length | None = None
    scale: float = 1.0
    offset: float = 0.0
    invert: bool = False
    gaps: Literal["error", "split"] = "error"
    between: Literal["join", "split"] = "join"  # of the files of a folder or pattern

    @model_validator(mode="after")
    def _consistent(self) -> EventInput:
        if (self.record is None) == (self.blocks is None):
            raise ValueError("give exactly one of record and blocks")
        if self.blocks is not None:
            extra = sorted(self.model_fields_set - {"name", "repeats", "blocks"})
            if extra:
                raise ValueError(f"{extra[0]!r} belongs to a record; blocks are deflections with their own unit")
        if self.measures == "travel" and self.installed_deflection is None:
            raise ValueError('measures = "travel" needs installed_deflection, such as "22 mm"')
        if self.measures != "travel" and self.installed_deflection is not None:
            raise ValueError(f'installed_deflection is used with measures = "travel", not {self.measures!r}')
        if self.time is not None and self.sample_rate is not None:
            raise ValueError("give either time or sample_rate, not both")
        if not 1e-12 <= abs(self.scale) <= 1e12:
            raise ValueError(f"scale is {self.scale:g}; its size must be from 1e-12 to 1e12")
        return self


class DutyInput(Table):
    """The [duty] table: what one pass is, how much is asked, and the events of a pass in order."""

    one_pass: str
    target: str
    event: Annotated[list[EventInput], Field(min_length=1)]

    @model_validator(mode="after")
    def _amounts(self) -> DutyInput:
        if not units.ratio(self.target, self.one_pass) > 0:
            raise ValueError(f"target {self.target!r} and one_pass {self.one_pass!r} must both be greater than zero")
        names = [event.name for event in self.event]
        twice = sorted({name for name in names if names.count(name) > 1})
        if twice:
            raise ValueError(f"event name {twice[0]!r} is used twice; give each event its own")
        return self

    @property
    def target_passes(self) -> float:
        """Passes that the target asks for."""
        return units.ratio(self.target, self.one_pass)


class JudgeInput(Table):
    """The [judge] table: the methods chosen."""

    criterion: Literal["goodman", "gerber", "asme-elliptic", "sines"] = "gerber"
    endurance: Text = "zimmerli"
    miner: Literal["original", "elementary", "haibach"] = "haibach"
    stress_factor: Literal["bergstraesser", "wahl"] = "bergstraesser"
    curvature_on: Literal["both", "alternating"] = "both"
    allowed_damage: Annotated[float, Field(gt=0, le=10)] = 1.0
    residue: Literal["repeat", "half", "drop"] = "repeat"
    peaks_between_samples: bool = False  # estimate what the sampling rate cut off, beside the plain count
    strength_fraction: Share | None = None  # f of the two-point curve; None takes the data file's value
    knee: Annotated[float, Field(gt=1e4, le=1e9)] | None = None

    @field_validator("endurance")
    @classmethod
    def _known(cls, endurance: str) -> str:
        if endurance not in BASES and not endurance.endswith(".toml"):
            raise ValueError(f"{endurance!r} is not known; {nearest(endurance, BASES)}, or a curve file (.toml)")
        return endurance


class WaiveInput(Table):
    """One [[waive]]: a finding accepted on purpose, by name and with a reason."""

    finding: str
    by: Name
    reason: Name

    @model_validator(mode="after")
    def _known(self) -> WaiveInput:
        from springlife.life.findings import CATALOGUE

        if self.finding not in CATALOGUE:
            raise ValueError(f"finding {self.finding!r} is not known; {nearest(self.finding, CATALOGUE)}")
        return self


class OptionInput(Table):
    """One [[option]]: overrides of [spring] or [judge], kept as written until merged."""

    name: Name
    spring: dict[str, Any] = {}
    judge: dict[str, Any] = {}


class CaseInput(Table):
    """The whole file."""

    format: int
    title: Name
    part: Text = ""
    revision: Text = ""
    author: Text = ""
    date: Text = ""
    spring: SpringInput
    duty: DutyInput
    judge: JudgeInput = JudgeInput()
    limits: dict[str, float] = {}
    scatter: ScatterInput = ScatterInput()
    size: SizeInput = SizeInput()
    surge: SurgeInput = SurgeInput()
    option: list[OptionInput] = []
    waive: list[WaiveInput] = []

    @model_validator(mode="after")
    def _known(self) -> CaseInput:
        if self.format != FORMAT:
            raise ValueError(f"format is {self.format}; this version reads format = {FORMAT}")
        check_limits(self.limits)
        for what, names in (
            ("options have the name", [option.name for option in self.option]),
            ("waivers are for", [waiver.finding for waiver in self.waive]),
        ):
            twice = sorted({name for name in names if names.count(name) > 1})
            if twice:
                raise ValueError(f"two {what} {twice[0]!r}; keep one")
        return self
