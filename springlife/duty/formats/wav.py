"""WAV files of data recorders: integer counts or floats at a fixed rate."""

from __future__ import annotations

import struct
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from springlife.duty.formats.arrays import CHUNK
from springlife.duty.formats.table import Chunk, Column, Table, choose_pair
from springlife.errors import InputError

if TYPE_CHECKING:
    from springlife.duty.record import RecordSpec

PCM, FLOAT, EXTENSIBLE = 1, 3, 0xFFFE
_TYPES = {(PCM, 8): "<u1", (PCM, 16): "<i2", (PCM, 32): "<i4", (FLOAT, 32): "<f4", (FLOAT, 64): "<f8"}


@dataclass(frozen=True)
class _Wave:
    """Where the samples lie and how they are written."""

    code: int
    bits: int
    channels: int
    rate: int
    start: int
    size: int

    @property
    def frame(self) -> int:
        return self.channels * self.bits // 8

    @property
    def kind(self) -> str:
        return f"{self.bits}-bit {'counts' if self.code == PCM else 'floats'}"


def read_wav(path: Path, spec: RecordSpec) -> Table:
    """Open a WAV file. Integer samples have the unit "counts": the case says the scale that turns them into a unit."""
    wave = _parse(path)
    unit = "counts" if wave.code == PCM else None
    columns = tuple(Column(f"channel {n}", f"channel {n}", unit) for n in range(1, wave.channels + 1))
    if spec.time is not None:
        raise InputError(f"{path}: a WAV file has no time column; leave out time, the rate is in the file")
    channel, _ = choose_pair(path, columns, spec.channel, None)
    return Table(
        columns, columns[channel], None, lambda: _chunks(path, wave, channel), sample_rate=float(wave.rate),
        steps=(f"WAV, {wave.kind}, {wave.rate} Hz",),
    )  # fmt: skip


def _chunks(path: Path, wave: _Wave, channel: int) -> Iterator[Chunk]:
    with path.open("rb") as file:
        file.seek(wave.start)
        left, start = wave.size // wave.frame, 0
        while left:
            raw = file.read(min(left, CHUNK) * wave.frame)
            values = _numbers(raw, wave)[channel :: wave.channels]
            yield Chunk(values.astype(np.float64), None, lambda i, start=start: f"sample {start + i + 1}")  # type: ignore[misc]
            start, left = start + values.size, left - values.size


def _numbers(raw: bytes, wave: _Wave) -> NDArray[Any]:
    if (wave.code, wave.bits) == (PCM, 24):
        # Three bytes into the upper part of four, then shifted down with their sign.
        wide = np.zeros((len(raw) // 3, 4), dtype=np.uint8)
        wide[:, 1:] = np.frombuffer(raw, dtype=np.uint8).reshape(-1, 3)
        return wide.view("<i4").reshape(-1) >> 8
    values = np.frombuffer(raw, dtype=_TYPES[wave.code, wave.bits])
    return values.astype(np.int16) - 128 if (wave.code, wave.bits) == (PCM, 8) else values  # 8-bit zero is at 128


def _parse(path: Path) -> _Wave:
    """Walk the chunks of a RIFF file to its format and its data."""
    size = path.stat().st_size
    form = b""
    with path.open("rb") as file:
        if file.read(12)[8:] != b"WAVE":
            raise InputError(f"{path}: begins like RIFF but is no WAV file; save it as WAV")
        while len(head := file.read(8)) == 8:
            name, length = struct.unpack("<4sI", head)
            if name == b"fmt ":
                form = file.read(length)
            elif name == b"data":
                return _described(path, form, file.tell(), length, size)
            else:
                file.seek(length, 1)
            file.seek(length % 2, 1)
    raise InputError(f"{path}: has no data; the file is cut short")


def _described(path: Path, form: bytes, start: int, length: int, size: int) -> _Wave:
    if len(form) < 16:
        raise InputError(f"{path}: has no description of its samples before the data; the file is damaged")
    code, channels, rate, _, _, bits = struct.unpack("<HHIIHH", form[:16])
    if code == EXTENSIBLE and len(form) >= 26:
        code = struct.unpack("<H", form[24:26])[0]
    if ((code, bits) not in _TYPES and (code, bits) != (PCM, 24)) or not channels or not rate:
        raise InputError(f"{path}: holds {bits}-bit samples of code {code}; save PCM of 8 to 32 bits or floats")
    wave = _Wave(code, bits, channels, rate, start, length)
    if start + length > size or length % wave.frame:
        raise InputError(f"{path}: has {size - start} bytes of samples where {length} are announced; it is cut short")
    return wave
