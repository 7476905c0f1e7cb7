"""From recorded numbers to SI: what the file and the case say about unit, scale and rate must agree."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from springlife import units
from springlife.duty.formats.table import Table
from springlife.errors import InputError

if TYPE_CHECKING:
    from springlife.duty.record import RecordSpec


def channel_unit(spec: RecordSpec, table: Table) -> tuple[str | None, tuple[float, float], list[str]]:
    """Return the unit, slope and intercept that turn a recorded number into SI, and what to say about it."""
    stated, path, title = table.channel.unit, spec.path, table.channel.title
    unit = spec.unit or stated
    place = f"{path}, column {title!r}"
    if spec.unit and stated and spec.scale == 1.0 and not _same_unit(spec.unit, stated):
        raise InputError(
            f"{place}: the unit is {stated!r} in the file and {spec.unit!r} in the case; drop the latter, or "
            f"give the scale that turns {stated!r} into {spec.unit!r}"
        )
    slope, intercept = (-spec.scale if spec.invert else spec.scale), spec.offset
    steps = []
    if (slope, intercept) != (1.0, 0.0):
        raw = f" (recorded in {stated})" if stated and stated != unit else ""
        sign = "-" if intercept < 0 else "+"
        added = f" {sign} {abs(intercept):g} {unit or ''}".rstrip() if intercept else ""
        steps.append(f"value = {slope:g} x recorded{raw}{added}")
    if spec.kind is None:
        return unit, (slope, intercept), steps
    if not unit:
        raise InputError(f'{place}: neither the file nor the case says its unit; add unit = "mm" or the right one')
    try:
        factor, shift = units.factor(unit, spec.kind)
    except InputError as error:
        raise InputError(f"{place}: {error}") from error
    source = "as the case says" if spec.unit else "as the file says"
    steps.append(f"unit {unit}, {source}, turned into {units.KINDS[spec.kind][0]}")
    return unit, (factor * slope, factor * intercept + shift), steps


def time_unit(spec: RecordSpec, table: Table) -> tuple[float, str | None]:
    """Return the number of seconds in the time column's unit, and what to say about it."""
    if table.time is None:
        return 1.0, None
    stated, title = table.time.unit, table.time.title
    place = f"{spec.path}, column {title!r}"
    if spec.time_unit and stated and not _same_unit(spec.time_unit, stated):
        raise InputError(
            f"{place}: the time unit is {stated!r} in the file and {spec.time_unit!r} in the case; drop the latter"
        )
    unit = spec.time_unit or stated
    if unit is None:
        return 1.0, f"time from {title!r}, taken as seconds because no unit is stated"
    try:
        return units.factor(unit, "time")[0], f"time from {title!r} in {unit}"
    except InputError as error:
        raise InputError(f"{place}: {error}") from error


def stated_rate(spec: RecordSpec, table: Table) -> float | None:
    """Return the rate that the case or the file states; both must agree."""
    if spec.sample_rate and table.time:
        raise InputError(
            f"{spec.path}, column {table.channel.title!r}: has its own times; leave out sample_rate, here "
            f"{spec.sample_rate:g} Hz"
        )
    if spec.sample_rate and table.sample_rate and not np.isclose(spec.sample_rate, table.sample_rate, rtol=1e-6):
        raise InputError(
            f"{spec.path}: the sample rate is {table.sample_rate:g} Hz in the file and {spec.sample_rate:g} "
            "Hz in the case; drop the latter"
        )
    return spec.sample_rate or table.sample_rate


def _same_unit(one: str, other: str) -> bool:
    if one.strip() == other.strip():
        return True
    return units.is_unit(one) and units.is_unit(other) and _ratio(one, other) == 1.0


def _ratio(one: str, other: str) -> float:
    try:
        return units.ratio(f"1 {one}", f"1 {other}")
    except InputError:
        return float("nan")
