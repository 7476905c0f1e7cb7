"""Date-times in text tables: ISO 8601 only, because 03/04/2025 can be read in several ways."""

from __future__ import annotations

import re
from collections.abc import Callable, Sequence

import numpy as np

from springlife.duty.formats.table import Stamps
from springlife.errors import InputError

STAMP = re.compile(r"(\d{4}-\d{2}-\d{2})[T ](\d{2}:\d{2}(?::\d{2}(?:[.,]\d{1,9})?)?)(Z|[+-]\d{2}:?\d{2})?", re.ASCII)
AMBIGUOUS = re.compile(r"\d{1,4}[./-]\d{1,2}[./-]\d{1,4}.*|\d{1,2}:\d{2}(:\d{2}.*)?")


def stamps_of(cells: Sequence[str], is_missing: Callable[[str], bool], place: Callable[[int], str]) -> Stamps:
    """Turn cells into instants, missing ones into NaT.

    A zone is taken off each instant, so that its change, as when summer time ends, is no jump.

    Raises
    ------
    InputError
        A cell that is no date-time, or no day of the calendar; ``place`` says where cell ``i`` stands.
    """
    bare, zones = [], []
    for i, cell in enumerate(cells):
        match = STAMP.fullmatch(cell.strip())
        if not match and not is_missing(cell):
            raise InputError(
                f"{place(i)}: {cell[:60]!r} is no date and time such as 2025-03-31T14:05:06.250; correct it"
            )
        bare.append(f"{match[1]}T{match[2]}".replace(",", ".") if match else "NaT")
        zones.append(match[3] if match else None)
    try:
        stamps = np.array(bare, dtype="datetime64[ns]")
    except ValueError as error:
        i = next(i for i, text in enumerate(bare) if not _is_date(text))
        raise InputError(f"{place(i)}: {cells[i]!r} is no day and time of the calendar; correct it") from error
    if set(zones) - {None, "Z"}:
        stamps -= np.array([_seconds(zone) for zone in zones], dtype="timedelta64[s]")
    return stamps


def _is_date(text: str) -> bool:
    try:
        np.datetime64(text)
    except ValueError:
        return False
    return True


def _seconds(zone: str | None) -> int:
    """Return the zone's lead over UTC in s."""
    if zone is None or zone == "Z":
        return 0
    digits = zone[1:].replace(":", "")
    return (-1 if zone[0] == "-" else 1) * (int(digits[:2]) * 3600 + int(digits[2:]) * 60)
