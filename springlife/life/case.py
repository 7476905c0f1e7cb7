"""The case file: TOML, checked whole before anything is computed.

Every quantity is text with its unit, every key is known, and all faults are reported at once, each with
its key, the value seen and what would be right.
"""

from __future__ import annotations

import difflib
import hashlib
import math
from collections.abc import Iterator
from dataclasses import dataclass
from itertools import product
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal, get_args, get_origin

from pydantic import BaseModel, ValidationError

from springlife.errors import FileError, InputError, nearest
from springlife.life.case_input import (
    AROUND_THE_PART,
    DIAMETERS,
    RATE_MAKERS,
    CaseInput,
    DutyInput,
    JudgeInput,
    OptionInput,
    SpringInput,
)
from springlife.tables import parse_toml

if TYPE_CHECKING:
    from springlife.spring.helical import HelicalSpring

MOST_NODES = 5000  # of one option's grid
LARGEST_CASE = 4_000_000  # bytes; a case file is written by hand


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
        part = {key: value for key, value in given if key not in AROUND_THE_PART}
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
        options = tuple(
            self.varied(name, spring, option.judge, f"option[{number}].")
            for number, option in enumerate(self.input.option, start=1)
            for name, spring in _grid(option)
        )
        names = [self.name, *(option.name for option in options)]
        twice = next((name for number, name in enumerate(names) if name in names[:number]), None)
        if twice is not None:
            raise InputError(f"{self.path}: two options come out as {twice!r}; name each differently")
        return options


def _grid(option: OptionInput) -> Iterator[tuple[str, dict[str, Any]]]:
    """Yield every combination of the lists in an option's [spring] overrides, named by what varies."""
    lists = {key: value for key, value in option.spring.items() if isinstance(value, list)}
    for key, given in lists.items():
        if not given:
            raise InputError(f"option {option.name!r}: the list of spring.{key} is empty; give its values")
    if not lists:
        yield option.name, option.spring
        return
    nodes = math.prod(len(values) for values in lists.values())
    if nodes > MOST_NODES:
        raise InputError(
            f"option {option.name!r}: a grid of {nodes} springs; at most {MOST_NODES} are judged at a time"
        )
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
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        raise InputError(f"{path}: byte {error.start} is not UTF-8 text; save the case file as UTF-8") from error
    raw = parse_toml(text, str(path))
    case = Case(path, hashlib.sha256(data).hexdigest(), raw, _checked(raw, path))
    case.options()
    return case


def read_bytes(path: Path) -> bytes:
    """Read a small file written by hand, with one sentence for whatever stands in the way."""
    try:
        if path.is_dir():
            raise FileError(f"{path}: is a directory; name the case file in it")
        if path.exists() and not path.is_file():
            raise FileError(f"{path}: is no regular file; name a case file")
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
