"""What every table of the case file is made of: text with units, names, no unknown keys."""

from __future__ import annotations

import unicodedata
from typing import Annotated

from pydantic import AfterValidator, BaseModel, BeforeValidator, ConfigDict, Field

from springlife.units import parse


class Table(BaseModel):
    """A table of the case file: no unknown keys, no silent conversions."""

    model_config = ConfigDict(extra="forbid", strict=True, frozen=True, allow_inf_nan=False)


def quantity(kind: str) -> BeforeValidator:
    """Read text with a unit of this kind as an SI number."""
    return BeforeValidator(lambda text: parse(text, kind))


def _printable(text: str) -> str:
    """Refuse control characters: they would act on a terminal and cannot stand in a report."""
    for character in text:
        if unicodedata.category(character) == "Cc":
            raise ValueError(f"holds the control character U+{ord(character):04X}; write plain text on one line")
    return text


def _not_blank(text: str) -> str:
    """Refuse a name of nothing but spaces."""
    if not text.strip():
        raise ValueError(f"is {text!r}; write a name")
    return text


Text = Annotated[str, AfterValidator(_printable)]
Name = Annotated[str, Field(min_length=1), AfterValidator(_printable), AfterValidator(_not_blank)]
Length = Annotated[float, quantity("length")]
Positive = Annotated[float, Field(gt=0)]
Share = Annotated[float, Field(gt=0, lt=1)]
