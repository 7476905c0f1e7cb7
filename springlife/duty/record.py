"""One recording: which channel of which file, in what unit, streamed as blocks of floats in SI.

Nothing is repaired silently: a cell that is no number, a missing value, a clock that breaks are errors with
the row, or, for gaps, places where the record is split when the case asks for it. Each step that was taken
leaves a line in ``provenance``.
"""

from __future__ import annotations

import hashlib
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import Literal

import numpy as np

from springlife import units
from springlife.duty.calibration import channel_unit, stated_rate, time_unit
from springlife.duty.clock import Break, Clock
from springlife.duty.formats import open_table
from springlife.duty.formats.table import Chunk, Floats, Stamps, Table
from springlife.duty.pieces import files_of, open_pieces
from springlife.duty.summary import RecordSummary, SummaryAccumulator
from springlife.errors import FileError, GapError, InputError
from springlife.units import significant

__all__ = ["RecordSpec", "RecordSummary", "Recording", "SummaryAccumulator", "open_record", "summarise"]

REPAIR = 'repair the record, or set gaps = "split"'
LISTED = 5  # gaps named one by one in the provenance


@dataclass(frozen=True)
class RecordSpec:
    """How to read one channel of one file.

    Parameters
    ----------
    path : Path
        The file; or a folder, or a pattern with * and ?, whose files in natural order of their names are one
        record in pieces.
    channel : str or int, optional
        Name, or number counted from 1; may be left out when the file has one column besides the time.
    time : str or int, optional
        Time column. Its unit comes from the file or from ``time_unit``, else it is taken as seconds and the
        provenance says so; ISO 8601 date-times are recognised.
    time_unit : str, optional
        Unit of the time column.
    sample_rate : float, optional
        In Hz, instead of a time column. With neither, span and rate stay unknown.
    unit : str, optional
        Unit of the channel, after ``scale``; may come from the file instead.
    kind : str or None
        Kind of :data:`springlife.units.KINDS` that the unit must be of. None keeps the numbers as recorded
        and needs no unit.
    scale, offset, invert : float, float, bool
        Value = (-1 if ``invert``) * ``scale`` * recorded + ``offset``, the offset in ``unit``.
    gaps : {"error", "split"}
        A missing value, a missing time, a time that goes back or jumps, a rate that changes: an error, or the
        places where the record is cut into pieces. A repeated time is an error too; with "split" it is
        reported, because it leaves the order of the samples as it is.
    between : {"join", "split"}
        What lies between the pieces when ``path`` means several files: they follow one another as if recorded
        without a pause, or the record is cut there. Times then count recorded time.
    """

    path: Path
    channel: str | int | None = None
    time: str | int | None = None
    time_unit: str | None = None
    sample_rate: float | None = None
    unit: str | None = None
    kind: str | None = "length"
    scale: float = 1.0
    offset: float = 0.0
    invert: bool = False
    gaps: Literal["error", "split"] = "error"
    between: Literal["join", "split"] = "join"

    def __post_init__(self) -> None:
        """Check what can be checked without the file."""
        if self.time is not None and self.sample_rate is not None:
            raise InputError(f"{self.path}: has both a time column {self.time!r} and a sample rate; give one of them")
        if self.sample_rate is not None and not (np.isfinite(self.sample_rate) and self.sample_rate > 0):
            raise InputError(f"{self.path}: sample_rate is {self.sample_rate:g} Hz; it must be greater than zero")
        if not (np.isfinite(self.scale) and self.scale != 0 and np.isfinite(self.offset)):
            raise InputError(
                f"{self.path}: scale {self.scale:g} and offset {self.offset:g} must be finite, scale not zero"
            )
        for name, valid in (("gaps", ("error", "split")), ("between", ("join", "split"))):
            if getattr(self, name) not in valid:
                raise InputError(f"{self.path}: {name} is {getattr(self, name)!r}; write {valid[0]!r} or {valid[1]!r}")
        if self.kind is not None and self.kind not in units.KINDS:
            raise InputError(f"{self.path}: kind is {self.kind!r}; write one of {', '.join(units.KINDS)}")


class Recording:
    """A recording that has been opened; its samples are read by :meth:`blocks`.

    ``sample_rate`` (Hz) and ``span`` (s) of a record with a time column, the gaps and the full provenance are
    known after a pass over ``blocks()``. ``block_times`` holds the times (s) of the samples of the block that
    ``blocks()`` gave last, NaN at a separator, or None when the record has no time.
    """

    def __init__(self, spec: RecordSpec, files: tuple[Path, ...], table: Table) -> None:
        """Join what was asked and what the files hold; use :func:`open_record`."""
        self.spec, self.path, self._files, self._table = spec, spec.path, files, table
        self.channel = table.channel.title
        self.columns = tuple(column.title for column in table.columns)
        self.unit, self._line, self._steps = channel_unit(spec, table)
        self._second, self._time_step = time_unit(spec, table)
        self._given_rate = stated_rate(spec, table)
        self._start_pass()

    def _start_pass(self) -> None:
        self._clock = Clock()
        self._samples = 0  # rows
        self._known = 0  # rows with a value
        self._missing = 0  # runs of missing values
        self._after_missing = False
        self._shift = 0.0  # s, from the times of this piece to recorded time
        self._origin: np.datetime64 | None = None
        self._origin_step = ""
        self._first_repeat = ""
        self._places: list[str] = []
        self.block_times: Floats | None = None

    @cached_property
    def pieces(self) -> tuple[tuple[Path, str], ...]:
        """The files read and the SHA-256 of each."""
        found = []
        for path in self._files:
            with path.open("rb") as file:
                found.append((path, hashlib.file_digest(file, "sha256").hexdigest()))
        return tuple(found)

    @property
    def sha256(self) -> str:
        """SHA-256 of the file; of several, that of the list "digest  name", one line a piece."""
        if len(self.pieces) == 1:
            return self.pieces[0][1]
        text = "".join(f"{digest}  {path.name}\n" for path, digest in self.pieces)
        return hashlib.sha256(text.encode()).hexdigest()

    @property
    def sample_rate(self) -> float | None:
        """Samples a second, Hz; None when unknown."""
        return self._given_rate or self._clock.rate

    @property
    def span(self) -> float | None:
        """Time from the first sample to the last, s; None when unknown."""
        if self._given_rate:
            return (self._samples - 1) / self._given_rate if self._samples else None
        return self._clock.span

    @property
    def gaps_found(self) -> int:
        """Number of places where the record is cut."""
        return self._clock.breaks + self._missing

    @property
    def repeated_times(self) -> int:
        """Number of samples with the time of the sample before."""
        return self._clock.repeats

    @property
    def provenance(self) -> tuple[str, ...]:
        """What was done to the numbers, one line a step."""
        return (*self._table.steps, *self._piece_steps(), *self._steps, *self._pass_steps())

    def blocks(self, size: int = 1_000_000) -> Iterator[Floats]:
        """Yield the samples in SI, in blocks of ``size`` (the last one shorter).

        With ``gaps="split"`` NaN stands between the pieces.

        Raises
        ------
        GapError
            Where the record has a gap and ``gaps`` is "error".
        InputError
            A cell that is no number, an infinite value, fewer than two samples.
        """
        if size < 1:
            raise InputError(f"block size is {size}; it must be at least 1")
        self._start_pass()
        kept: list[tuple[Floats, Floats | None]] = []
        count = 0
        for chunk in self._chunks():
            kept.append(self._checked(chunk))
            count += kept[-1][0].size
            while count >= size:
                values, self.block_times = _join(kept)
                kept = [(values[size:], None if self.block_times is None else self.block_times[size:])]
                count -= size
                self.block_times = None if self.block_times is None else self.block_times[:size]
                yield values[:size]
        self._check_end()
        if count:
            values, self.block_times = _join(kept)
            yield values

    def _chunks(self) -> Iterator[Chunk]:
        with _disk(self.path):
            yield from self._table.chunks()

    def _checked(self, chunk: Chunk) -> tuple[Floats, Floats | None]:
        """Scale one chunk, follow its clock, and cut it at its gaps."""
        raw = np.asarray(chunk.values, dtype=np.float64)
        self._check_values(raw, chunk)
        slope, intercept = self._line
        values = raw if (slope, intercept) == (1.0, 0.0) else slope * raw + intercept
        self._samples += values.size
        times, cuts = self._times(chunk)
        if chunk.starts and self.spec.between == "split":
            cuts.insert(0, 0)
        if not cuts:
            return values, times
        return np.insert(values, cuts, np.nan), None if times is None else np.insert(times, cuts, np.nan)

    def _times(self, chunk: Chunk) -> tuple[Floats | None, list[int]]:
        """Return the times of a chunk in s of recorded time, and the samples before which the clock breaks."""
        times = self._seconds(chunk)
        if times is None:
            count = len(chunk.values)
            even = np.arange(self._samples - count, self._samples)
            return even / self._given_rate if self._given_rate else None, []
        if chunk.starts:
            self._shift = self._follow_on(times)
        times = times + self._shift
        breaks = self._clock.feed(times)
        self._report(breaks, chunk)
        return times, [found.index for found in breaks if found.kind != "repeat"]

    def _follow_on(self, times: Floats) -> float:
        """Return the shift that lets a further piece begin one interval after the last one."""
        known = times[~np.isnan(times)]
        if not known.size or self._clock.last is None:
            return self._shift
        step = self._clock.interval or (float(known[1] - known[0]) if known.size > 1 else 0.0)
        return self._clock.last + step - float(known[0])

    def _check_values(self, raw: Floats, chunk: Chunk) -> None:
        """Refuse infinities; count or refuse missing values."""
        with np.errstate(over="ignore", invalid="ignore"):
            suspect = not np.isfinite(raw.sum())
        self._known += raw.size
        if not suspect:  # NaN and infinities would show in the sum
            self._after_missing = False
            return
        place = f"{self.path}, column {self.channel!r}, "
        infinite = np.flatnonzero(np.isinf(raw))
        if infinite.size:
            where, seen = chunk.place(int(infinite[0])), raw[infinite[0]]
            raise InputError(f"{place}{where}: {seen:g} is not finite; correct the cell")
        missing = np.isnan(raw)
        if not missing.any():
            return
        where = f"{place}{chunk.place(int(np.flatnonzero(missing)[0]))}: the value is missing"
        if self.spec.gaps == "error":
            raise GapError(f"{where}; {REPAIR}")
        self._note(where.removeprefix(f"{self.path}, "))
        self._known -= int(np.count_nonzero(missing))
        starts = missing & ~np.concatenate([[self._after_missing], missing[:-1]])
        self._missing += int(np.count_nonzero(starts))
        self._after_missing = bool(missing[-1])

    def _seconds(self, chunk: Chunk) -> Floats | None:
        """Return the chunk's times in s; date-times count from the first of them."""
        if chunk.times is None:
            return None
        if chunk.times.dtype.kind == "M":
            return self._elapsed(chunk.times.astype("datetime64[ns]"))
        times = np.asarray(chunk.times, dtype=np.float64) * self._second
        infinite = np.flatnonzero(np.isinf(times))
        if infinite.size:
            raise InputError(f"{self.path}, {chunk.place(int(infinite[0]))}: the time is not finite; correct the cell")
        return times

    def _elapsed(self, stamps: Stamps) -> Floats:
        if self._origin is None:
            known = stamps[~np.isnat(stamps)]
            if not known.size:
                return np.full(stamps.size, np.nan)
            self._origin = known[0]
            self._origin_step = f"time starts at {np.datetime_as_string(known[0], unit='ms')}"
        elapsed = (stamps - self._origin) / np.timedelta64(1, "ns") * 1e-9
        return np.asarray(elapsed, dtype=np.float64)

    def _report(self, breaks: list[Break], chunk: Chunk) -> None:
        """Raise at a gap, or keep a sentence for the provenance."""
        for found in breaks:
            assert self._table.time is not None
            place = f"column {self._table.time.title!r}, {chunk.place(found.index)}: {found.what}"
            if found.kind == "repeat":
                self._first_repeat = self._first_repeat or place
            elif self.spec.gaps == "error":
                raise GapError(f"{self.path}, {place}; {REPAIR}")
            else:
                self._note(place)

    def _note(self, place: str) -> None:
        if len(self._places) < LISTED:
            self._places.append(place)

    def _check_end(self) -> None:
        """Judge what only the whole record shows."""
        if self._known < 2:
            seen = "no value" if self._known == 0 else "only one value"
            raise InputError(f"{self.path}, column {self.channel!r}: has {seen}; a record needs at least two samples")
        if self._first_repeat and self.spec.gaps == "error":
            raise GapError(
                f"{self.path}, {self._first_repeat}, {self._clock.repeats} repeated times in all; repair the "
                'record, give sample_rate instead of the time column, or set gaps = "split"'
            )

    def _piece_steps(self) -> list[str]:
        if len(self._files) == 1:
            return []
        between = "joined" if self.spec.between == "join" else "kept apart"
        names = [f"piece {n}: {path.name}, sha256 {digest}" for n, (path, digest) in enumerate(self.pieces, start=1)]
        return [f"{len(names)} pieces {between}", *names]

    def _pass_steps(self) -> list[str]:
        """Say what the last pass found."""
        if not self._samples:
            return []
        steps = [f"{self._samples} samples read from {self.channel!r}"]
        if self._time_step:
            steps.append(self._origin_step or self._time_step)
        if self._clock.rounded_to is not None:
            rounded = significant(self._clock.rounded_to)
            steps.append(f"times are evenly spaced but rounded to {rounded} s; repeated or skipped times are no gaps")
        if self.gaps_found:
            listed = "; ".join(self._places) + ("; and so on" if self.gaps_found > len(self._places) else "")
            steps.append(f"split at {self.gaps_found} {'gap' if self.gaps_found == 1 else 'gaps'}: {listed}")
        if self._first_repeat:
            steps.append(f"{self._clock.repeats} repeated times kept in order, first {self._first_repeat}")
        return steps


def open_record(spec: RecordSpec) -> Recording:
    """Open a record: find its format, its columns and their units; the samples are read by ``blocks()``.

    Raises
    ------
    FileError
        The file is missing, a directory, or cannot be read.
    InputError
        The file is not what its format promises, a column is missing or ambiguous, a unit is missing, of the
        wrong kind, or contradicts the file.
    """
    path = Path(spec.path)
    with _disk(path):
        files = files_of(path)
        table = open_table(path, spec) if files == (path,) else open_pieces(path, files, spec)
        return Recording(spec, files, table)


@contextmanager
def _disk(path: Path) -> Iterator[None]:
    """Say in one sentence what stands between us and a file."""
    try:
        yield
    except FileNotFoundError as error:
        raise FileError(f"{error.filename or path}: there is no such file; check the path") from error
    except OSError as error:
        if isinstance(error, FileError):
            raise
        raise FileError(
            f"{error.filename or path}: cannot be read ({error.strerror or error}); check the file"
        ) from error


def summarise(recording: Recording) -> RecordSummary:
    """Read a recording once for its summary alone."""
    gathered = SummaryAccumulator(recording)
    for block in recording.blocks():
        gathered.feed(block)
    return gathered.result()


def _join(parts: list[tuple[Floats, Floats | None]]) -> tuple[Floats, Floats | None]:
    values, times = [part[0] for part in parts], [part[1] for part in parts if part[1] is not None]
    if len(parts) == 1:
        return parts[0]
    return np.concatenate(values), np.concatenate(times) if times else None
