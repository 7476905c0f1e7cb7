"""Measurement files of loggers and test benches: ASAM MDF and TDMS, each channel on its own time base."""

from __future__ import annotations

import gc
import struct
import sys
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from springlife.duty.formats.arrays import CHUNK, check_numbers, sliced
from springlife.duty.formats.table import Chunk, Column, Table, choose, choose_pair, need
from springlife.errors import InputError

if TYPE_CHECKING:
    from springlife.duty.record import RecordSpec

BIG_ENDIAN = 1 << 6  # flag of a TDMS segment
TIME = 1  # synchronisation type of a master channel that counts seconds


def read_mdf(path: Path, spec: RecordSpec) -> Table:
    """Open an ASAM MDF file: the channel's times are those of its own group; samples marked invalid are missing."""
    with _mdf(path) as mdf:
        places = [
            (group, index)
            for group, part in enumerate(mdf.groups)
            for index in range(len(part.channels))
            if mdf.masters_db.get(group) != index
        ]
        columns = tuple(_mdf_column(mdf, *place) for place in places)
        if not columns:
            raise InputError(f"{path}: has no channels; record again")
        at, _ = choose_pair(path, columns, spec.channel, None)
        group, index = places[at]
        time = _mdf_time(mdf, group)
        count = int(mdf.groups[group].channel_group.cycles_nr)
    if spec.time is not None and (time is None or spec.time != time.name):
        own = repr(time.name) if time else "none"
        raise InputError(f"{path}: each channel has its own time base, here {own}; leave out time = {spec.time!r}")
    return Table(
        columns, columns[at], time, lambda: _mdf_chunks(path, columns[at], group, index, count, time is not None),
        steps=(f"MDF, channel group {group + 1} of {count} samples",),
    )  # fmt: skip


def _mdf_column(mdf: Any, group: int, index: int) -> Column:
    name = str(mdf.groups[group].channels[index].name)
    return Column(name, name, str(mdf.get_channel_unit(group=group, index=index)).strip() or None)


def _mdf_time(mdf: Any, group: int) -> Column | None:
    """Return the master channel of a group when it counts time."""
    master = mdf.masters_db.get(group)
    if master is None:
        return None
    channel = mdf.groups[group].channels[master]
    return Column(str(channel.name), str(channel.name), "s") if getattr(channel, "sync_type", TIME) == TIME else None


def _mdf_chunks(path: Path, column: Column, group: int, index: int, count: int, timed: bool) -> Iterator[Chunk]:
    with _mdf(path) as mdf:
        for start in range(0, count, CHUNK):
            signal = mdf.get(
                group=group, index=index, record_offset=start, record_count=min(CHUNK, count - start),
                ignore_invalidation_bits=True,
            )  # fmt: skip
            check_numbers(path, column.title, signal.samples.dtype, is_time=False)
            if signal.samples.ndim != 1:
                raise InputError(f"{path}, column {column.title!r}: holds arrays; choose a channel of single numbers")
            values = signal.samples.astype(np.float64)
            if signal.invalidation_bits is not None:
                values[np.asarray(signal.invalidation_bits, dtype=bool)] = np.nan
            times = np.asarray(signal.timestamps, dtype=np.float64) if timed else None
            yield Chunk(values, times, lambda i, start=start: f"sample {start + i + 1}")  # type: ignore[misc]


@contextmanager
def _mdf(path: Path) -> Iterator[Any]:
    """Open an MDF file; a broken one leaves half-built objects whose disposal would print tracebacks."""
    asammdf = need("asammdf", "ASAM MDF", path)
    mdf, reason = None, ""
    hook, sys.unraisablehook = sys.unraisablehook, lambda _: None
    try:
        try:
            mdf = asammdf.MDF(path)
        except Exception as error:  # the library raises errors of many kinds on a damaged file
            reason = str(error) or type(error).__name__
        if mdf is None:
            gc.collect()
    finally:
        sys.unraisablehook = hook
    if mdf is None:
        raise InputError(f"{path}: cannot be read as MDF ({reason[:120]}); the file may be damaged or cut short")
    try:
        yield mdf
    finally:
        mdf.close()


def read_tdms(path: Path, spec: RecordSpec) -> Table:
    """Open a TDMS file: columns "group/channel"; the rate comes from the channel's waveform increment."""
    nptdms = need("nptdms", "TDMS", path)
    _check_segments(path)
    with path.open("rb") as raw, nptdms.TdmsFile.open(raw) as file:
        channels = [channel for group in file.groups() for channel in group.channels()]
        columns = tuple(_tdms_column(channel) for channel in channels)
        if not columns:
            raise InputError(f"{path}: has no channels; record again")
        at = choose_pair(path, columns, spec.channel, None)[0]
        time = None if spec.time is None else choose(path, columns, spec.time, "time column")
        if time is not None and channels[time].group_name != channels[at].group_name:
            raise InputError(
                f"{path}: time column {columns[time].title!r} and channel {columns[at].title!r} stand in different "
                "groups; choose the time column of the channel's group"
            )
        step = float(channels[at].properties.get("wf_increment", 0.0))
    where = [(channel.group_name, channel.name) for channel in channels]

    def chunks() -> Iterator[Chunk]:
        with path.open("rb") as raw, nptdms.TdmsFile.open(raw) as file:
            yield from sliced(path, [file[group][name] for group, name in where], columns, at, time)

    rate = 1.0 / step if step > 0 and time is None else None
    return Table(
        columns, columns[at], None if time is None else columns[time], chunks, sample_rate=rate,
        steps=(f"TDMS, {columns[at].title}" + (f", {rate:g} Hz in the file" if rate else ""),),
    )  # fmt: skip


def _check_segments(path: Path) -> None:
    """Walk from segment to segment: the last one must end with the file, or samples are missing."""
    size, at, number = path.stat().st_size, 0, 0
    with path.open("rb") as file:
        while at < size:
            file.seek(at)
            head, number = file.read(28), number + 1
            order = ">" if len(head) == 28 and head[4] & BIG_ENDIAN else "<"
            length = struct.unpack(f"{order}Q", head[12:20])[0] if len(head) == 28 else size
            at += 28 + length
            if head[:4] != b"TDSm" or at > size:
                raise InputError(f"{path}: its segment {number} is incomplete; the file is damaged or cut short")


def _tdms_column(channel: Any) -> Column:
    keys = {str(key).casefold(): value for key, value in channel.properties.items()}
    unit = next((str(keys[k]).strip() for k in ("unit_string", "unit", "units") if k in keys), None)
    return Column(f"{channel.group_name}/{channel.name}", channel.name, unit or None)
