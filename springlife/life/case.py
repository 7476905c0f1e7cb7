"""The case file: TOML, checked whole before anything is computed.

Every quantity is text with its unit, every key is known, and all faults are reported at once, each with
its key, the value seen and what would be right.
"""

from __future__ import annotations

import difflib
import hashlib
import tomllib
import unicodedata
from collections.abc import Iterator
from dataclasses import dataclass
from itertools import product
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any, Literal, get_args, get_origin

from pydantic import (
    AfterValidator,
    BaseModel,
    BeforeValidator,
    ConfigDict,
    Field,
    ValidationError,
    field_validator,
    model_validator,
)

from springlife import units
from springlife.errors import FileError, InputError, nearest
from springlife.life.limits import LIMITS
from springlife.life.scatter_input import ScatterInput
from springlife.life.size_input import SizeInput
from springlife.life.surge_input import SurgeInput
from springlife.strength.endurance import BASES

if TYPE_CHECKING:
    from springlife.spring.helical import HelicalSpring

FORMAT = 1
LARGEST_CASE = 4_000_000  # bytes; a case file is written by hand


def _quantity(kind: str) -> BeforeValidator:
    return BeforeValidator(lambda text: units.parse(text, kind))


def _printable(text: str) -> str:
    """Refuse control characters: they would act on a terminal and cannot stand in a report."""
    for character in text:
        if unicodedata.category(character) == "Cc":
            raise ValueError(f"holds the control character U+{ord(character):04X}; write plain text on one line")
    return text


Text = Annotated[str, AfterValidator(_printable)]
Name = Annotated[str, Field(min_length=1), AfterValidator(_printable)]
Length = Annotated[float, _quantity("length")]
Positive = Annotated[float, Field(gt=0)]
Share = Annotated[float, Field(gt=0, lt=1)]


class _Table(BaseModel):
    """A table of the case file: no unknown keys, no silent conversions."""

    model_config = ConfigDict(extra="forbid", strict=True, frozen=True, allow_inf_nan=False)


class SpringInput(_Table):
    """The [spring] table, in SI."""

    grade: str
    grade_file: str | None = None
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
    temperature: Annotated[float, _quantity("temperature"), Field(gt=0)] = 293.15
    tensile_strength: Annotated[float, _quantity("stress"), Field(gt=0)] | None = None
    shear_modulus: Annotated[float, _quantity("stress"), Field(gt=0)] | None = None
    measured_rate: Annotated[float, _quantity("rate"), Field(gt=0)] | None = None
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
_AROUND_THE_PART = {"grade", "grade_file", "finish", "baked", "environment"}
DIAMETERS = ("mean_diameter", "outer_diameter", "inner_diameter")
RATE_MAKERS = {"grade", "grade_file", "wire_diameter", "total_coils", "ends", "shear_modulus", *DIAMETERS}


class BlockInput(_Table):
    """One block of a specified programme: deflection limits and a number of cycles."""

    low: Length
    high: Length
    cycles: Annotated[int, Field(ge=1)]

    @model_validator(mode="after")
    def _ordered(self) -> BlockInput:
        if not self.low < self.high:
            raise ValueError("'low' must be less than 'high'")
        return self


class EventInput(_Table):
    """One [[duty.event]]: a record or a list of blocks, and how often it happens in a pass."""

    name: Name
    repeats: Annotated[int, Field(ge=1)] = 1
    blocks: Annotated[list[BlockInput], Field(min_length=1)] | None = None
    record: str | None = None
    channel: str | int | None = None
    time: str | int | None = None
    time_unit: str | None = None
    sample_rate: Annotated[float, _quantity("frequency"), Field(gt=0)] | None = None
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
        if self.scale == 0:
            raise ValueError("scale is 0; every sample would be equal")
        return self


class DutyInput(_Table):
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


class JudgeInput(_Table):
    """The [judge] table: the methods chosen."""

    criterion: Literal["goodman", "gerber", "asme-elliptic", "sines"] = "gerber"
    endurance: str = "zimmerli"
    miner: Literal["original", "elementary", "haibach"] = "haibach"
    stress_factor: Literal["bergstraesser", "wahl"] = "bergstraesser"
    curvature_on: Literal["both", "alternating"] = "both"
    allowed_damage: Positive = 1.0
    residue: Literal["repeat", "half", "drop"] = "repeat"
    strength_fraction: Share | None = None  # f of the two-point curve; None takes the data file's value
    knee: Annotated[float, Field(gt=1e4)] | None = None

    @field_validator("endurance")
    @classmethod
    def _known(cls, endurance: str) -> str:
        if endurance not in BASES and not endurance.endswith(".toml"):
            raise ValueError(f"{endurance!r} is not known; {nearest(endurance, BASES)}, or a curve file (.toml)")
        return endurance


class WaiveInput(_Table):
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


class OptionInput(_Table):
    """One [[option]]: overrides of [spring] or [judge], kept as written until merged."""

    name: Name
    spring: dict[str, Any] = {}
    judge: dict[str, Any] = {}


class CaseInput(_Table):
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
        for key in self.limits:
            if key not in LIMITS:
                raise ValueError(f"limits.{key} is not known; {nearest(key, LIMITS)}")
        names = [option.name for option in self.option]
        if len(set(names)) != len(names):
            raise ValueError("two options have the same name")
        return self


@dataclass(frozen=True)
class Case:
    """A case file that has passed every check of form. ``raw`` is the TOML as read."""

    path: Path
    sha256: str
    raw: dict[str, Any]
    input: CaseInput
    name: str = "as drawn"

    @property
    def spring(self) -> SpringInput:
        """The [spring] table in SI."""
        return self.input.spring

    @property
    def duty(self) -> DutyInput:
        """The [duty] table."""
        return self.input.duty

    def build_spring(self) -> HelicalSpring:
        """Build the part.

        Raises
        ------
        InputError
            Unknown grade, a bad grades file, wire off the table, or a geometry that cannot exist.
        """
        from springlife.spring.grade import grade
        from springlife.spring.helical import HelicalSpring

        given = self.spring
        file = None if given.grade_file is None else self.beside(given.grade_file)
        part = {key: value for key, value in given if key not in _AROUND_THE_PART}
        return HelicalSpring(grade=grade(given.grade, file), **part)

    @property
    def judge(self) -> JudgeInput:
        """The [judge] table."""
        return self.input.judge

    def beside(self, name: str) -> Path:
        """Resolve a path of the case file: relative paths are relative to the file itself."""
        return self.path.parent / name

    def varied(self, name: str, spring: dict[str, Any], judge: dict[str, Any], where: str) -> Case:
        """Return the case with overrides merged in.

        A diameter given replaces the one of the case; a measured rate or tensile strength of the case goes
        when what it was measured on changes.

        Raises
        ------
        InputError
            When an override names an unknown key or gives a value that the table refuses.
        """
        gone: set[str] = set()
        if set(DIAMETERS) & set(spring):
            gone |= set(DIAMETERS)
        # A rate or strength measured on the drawn spring says nothing about another one.
        if set(spring) & RATE_MAKERS:
            gone.add("measured_rate")
        if set(spring) & {"grade", "grade_file", "wire_diameter"}:
            gone.add("tensile_strength")
        base = {key: value for key, value in self.raw["spring"].items() if key not in gone}
        raw = dict(self.raw, spring=base | spring, judge=dict(self.raw.get("judge", {})) | judge)
        merged = _checked(raw, self.path, where, only=("spring", "judge"))
        return Case(self.path, self.sha256, raw, merged, name)

    def options(self) -> tuple[Case, ...]:
        """Return each [[option]] merged into the case, in the order of the file; a grid gives one case a node."""
        return tuple(
            self.varied(name, spring, option.judge, f"option[{number}].")
            for number, option in enumerate(self.input.option, start=1)
            for name, spring in _grid(option)
        )


def _grid(option: OptionInput) -> Iterator[tuple[str, dict[str, Any]]]:
    """Yield every combination of the lists in an option's [spring] overrides, named by what varies."""
    lists = {key: value for key, value in option.spring.items() if isinstance(value, list)}
    if not lists:
        yield option.name, option.spring
        return
    for values in product(*lists.values()):
        chosen = dict(zip(lists, values, strict=True))
        yield f"{option.name}: {', '.join(str(value) for value in values)}", option.spring | chosen


def load_case(path: str | Path) -> Case:
    """Read and check a case file.

    Raises
    ------
    FileError
        The file is missing, a directory or cannot be read.
    InputError
        The file is not TOML, or keys or values are wrong; every fault is named.
    """
    path = Path(path)
    data = read_bytes(path)
    try:
        raw = tomllib.loads(data.decode("utf-8-sig"))
    except UnicodeDecodeError as error:
        raise InputError(f"{path}: byte {error.start} is not UTF-8 text; save the case file as UTF-8") from error
    except tomllib.TOMLDecodeError as error:
        raise InputError(f"{path}: not valid TOML: {error}; see the case file's description in the README") from error
    case = Case(path, hashlib.sha256(data).hexdigest(), raw, _checked(raw, path))
    case.options()
    return case


def read_bytes(path: Path) -> bytes:
    """Read a small file written by hand, with one sentence for whatever stands in the way."""
    try:
        if path.is_dir():
            raise FileError(f"{path}: is a directory; name the case file in it")
        if path.stat().st_size > LARGEST_CASE:
            raise InputError(f"{path}: is {path.stat().st_size} bytes; a case file has at most {LARGEST_CASE}")
        return path.read_bytes()
    except FileNotFoundError as error:
        raise FileError(f"{path}: there is no such file; check the path") from error
    except (PermissionError, OSError) as error:
        if isinstance(error, FileError):
            raise
        raise FileError(f"{path}: cannot be read ({error.strerror}); check its permissions") from error


def _checked(raw: dict[str, Any], path: Path, where: str = "", only: tuple[str, ...] = ()) -> CaseInput:
    """Validate the raw tables; raise one InputError that lists every fault."""
    try:
        return CaseInput.model_validate(raw)
    except ValidationError as error:
        faults = [fault for fault in error.errors() if not only or fault["loc"][:1] in {(key,) for key in only}]
        misspelt = {_meant(fault["loc"]) for fault in faults if fault["type"] == "extra_forbidden"}
        # A key that was only misspelt is not told a second time as missing.
        faults = [fault for fault in faults if fault["type"] != "missing" or fault["loc"] not in misspelt]
        lines = [f"{path}: {where}{_sentence(dict(fault))}" for fault in faults]
        raise InputError("\n".join(lines)) from error


def _sentence(fault: dict[str, Any]) -> str:
    """Turn one Pydantic fault into key, value and remedy."""
    loc = tuple(part for part in fault["loc"] if part not in {"str", "int"})
    key = _place(loc)
    kind, value = fault["type"], fault.get("input")
    if kind == "extra_forbidden":
        return f"{key}: key {loc[-1]!r} is not known; {nearest(str(loc[-1]), _fields(loc[:-1]))}"
    if kind == "missing":
        return f"{key}: this key is missing; add it"
    if kind == "value_error":
        text = str(fault["ctx"]["error"])
        return f"{key}: {text}" if key else text
    if kind == "literal_error":
        return f"{key}: {value!r} is not known; {nearest(str(value), _choices(loc))}"
    seen = "a table" if isinstance(value, dict) else "a list" if isinstance(value, list) else repr(value)
    return f"{key}: {seen} cannot be used; {fault['msg'][0].lower()}{fault['msg'][1:]}"


def _meant(loc: tuple[Any, ...]) -> tuple[Any, ...]:
    """Guess which key an unknown one was meant to be."""
    close = difflib.get_close_matches(str(loc[-1]), _fields(loc[:-1]), n=1)
    return (*loc[:-1], *close)


def _place(loc: tuple[Any, ...]) -> str:
    """Write a location as a person counts: duty.event[2].repeats."""
    text = ""
    for part in loc:
        text += f"[{part + 1}]" if isinstance(part, int) else f".{part}" if text else str(part)
    return text


def _model(loc: tuple[Any, ...]) -> type[BaseModel]:
    """Find the table that a location stands in."""
    model: type[BaseModel] = CaseInput
    for part in loc:
        if isinstance(part, int):
            continue
        inner = _inner_model(model.model_fields[part].annotation)
        if inner is not None:
            model = inner
    return model


def _inner_model(annotation: Any) -> type[BaseModel] | None:
    if isinstance(annotation, type) and issubclass(annotation, BaseModel):
        return annotation
    found = (_inner_model(argument) for argument in get_args(annotation))
    return next((model for model in found if model is not None), None)


def _fields(loc: tuple[Any, ...]) -> list[str]:
    return list(_model(loc).model_fields)


def _choices(loc: tuple[Any, ...]) -> list[str]:
    annotation = _model(loc[:-1]).model_fields[str(loc[-1])].annotation
    return [str(choice) for choice in get_args(annotation)] if get_origin(annotation) is Literal else []
