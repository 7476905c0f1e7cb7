"""Read and count the duty of a case once; every option is judged from these counts.

Each event keeps its count in the recorded quantity (SI) with the straight line that turns it into
deflection, so that a change of free length or rate never touches the record again.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field, replace
from functools import cached_property
from typing import TYPE_CHECKING, Literal

import numpy as np

from springlife.duty.counting import Count, Tally, count
from springlife.duty.schedule import Event, Pass
from springlife.errors import InputError

if TYPE_CHECKING:
    from springlife.duty.envelope import Envelope
    from springlife.duty.record import RecordSpec, RecordSummary
    from springlife.duty.schedule import Floats
    from springlife.duty.signal import SignalFacts
    from springlife.life.case import Case
    from springlife.life.case_input import EventInput
    from springlife.spring.helical import HelicalSpring

Line = tuple[float, float]
FINER = 8  # times finer that peaks between samples are looked for
ROUNDING = 1e-9  # m: a nanometre past a limit is the arithmetic's, not the spring's


def line_of(measures: str, spring: HelicalSpring | None, installed: float) -> Line:
    """Return slope and intercept of deflection (m) over a recorded quantity; the spring enters for two of them."""
    if measures == "travel":
        return 1.0, installed
    if spring is not None and measures == "length":
        return -1.0, spring.free_length
    if spring is not None and measures == "force":
        return 1.0 / spring.rate, 0.0
    return 1.0, 0.0


@dataclass
class Beyond:
    """How often, how long and how far a record goes beyond a deflection; fed block by block."""

    sign: float  # +1 watches for deflections above the limit, -1 for those below
    limit: float
    sample_rate: float | None = None
    total: int = 0
    samples: int = 0
    visits: int = 0
    extent: float = 0.0
    what: str = "samples"
    _inside: bool = field(default=False, repr=False)

    def feed(self, deflection: Floats) -> None:
        """Take the next block of deflections in m."""
        past = self.sign * (deflection - self.limit)
        over = past > ROUNDING
        self.total += int(np.count_nonzero(~np.isnan(deflection)))
        if over.any():
            self.samples += int(np.count_nonzero(over))
            self.extent = max(self.extent, float(past[over].max()))
            starts = over & ~np.concatenate([[self._inside], over[:-1]])
            self.visits += int(np.count_nonzero(starts))
        if over.size:
            self._inside = bool(over[-1])

    def feed_cycles(self, ends: Floats, cycles: Floats) -> None:
        """Take one end of counted cycles, m, and how many there are of each; shapes (n,)."""
        self.what = "cycles"
        past = self.sign * (ends - self.limit)
        over = past > ROUNDING
        self.total += int(cycles.sum())
        self.samples += int(cycles[over].sum())
        self.visits = self.samples
        self.extent = max(self.extent, float(past[over].max(initial=0.0)))

    @property
    def any(self) -> bool:
        """Whether it happened at all."""
        return self.samples > 0

    @property
    def share(self) -> float:
        """Part of the samples beyond the limit."""
        return self.samples / self.total if self.total else 0.0

    def describe(self) -> str:
        """Say how often and how long."""
        times = "once" if self.visits == 1 else f"{self.visits} times"
        duration = f", {self.samples / self.sample_rate:.3g} s" if self.sample_rate else ""
        return f"{times}, {self.samples} of {self.total} {self.what}{duration}"


@dataclass(frozen=True)
class EventReading:
    """One event, read and counted: the count is in the recorded quantity, SI."""

    name: str
    repeats: int
    measures: str
    installed: float
    count: Count
    off_seat: Beyond
    past_solid: Beyond
    record: str | None = None  # as the case file names it
    sha256: str | None = None
    summary: RecordSummary | None = None
    signal: SignalFacts | None = None
    envelope: Envelope | None = None
    mended: Count | None = None  # counted without isolated samples, when there are any
    finer: Count | None = None  # counted with band-limited peaks between samples, when the case asks
    provenance: tuple[str, ...] = ()

    @property
    def recorded(self) -> bool:
        """Whether the event comes from a record rather than a specified programme."""
        return self.record is not None

    def line(self, spring: HelicalSpring) -> Line:
        """Return slope and intercept of deflection (m) over the recorded quantity."""
        return line_of(self.measures, spring, self.installed)


@dataclass(frozen=True)
class Duty:
    """All events of a pass, read once."""

    events: tuple[EventReading, ...]

    def one_pass(self, spring: HelicalSpring) -> Pass:
        """Return the pass in deflection of this spring."""
        if all(event.measures in ("deflection", "travel") for event in self.events):
            return self._stroke_pass
        return self._in_deflection(spring)

    @cached_property
    def _stroke_pass(self) -> Pass:
        """The pass when nothing of the spring enters: deflections and travels are the same for all options."""
        return self._in_deflection(None)

    def _in_deflection(self, spring: HelicalSpring | None) -> Pass:
        lines = [line_of(event.measures, spring, event.installed) for event in self.events]
        return Pass(
            tuple(
                Event(event.name, event.count.mapped(*line), event.repeats)
                for event, line in zip(self.events, lines, strict=True)
            )
        )

    def pinned(self, spring: HelicalSpring) -> Duty:
        """Return the duty as deflections of this spring, whatever was recorded; what the signals show is left out."""

        def deflection(event: EventReading) -> EventReading:
            moved = event.count.mapped(*event.line(spring))
            return replace(
                event, measures="deflection", installed=0.0, count=moved, signal=None, mended=None, finer=None
            )

        return Duty(tuple(deflection(event) for event in self.events))

    def mapped(self, slope: float, intercept: float) -> Duty:
        """Return a pinned duty with every deflection y made ``slope * y + intercept``; nothing is read again."""
        events = []
        for event in self.events:
            moved = event.count.mapped(slope, intercept)
            cycles = moved.table("repeat")
            off, past = Beyond(-1.0, 0.0), Beyond(1.0, event.past_solid.limit)
            off.feed_cycles(cycles.low, cycles.count)
            past.feed_cycles(cycles.high, cycles.count)
            events.append(replace(event, count=moved, off_seat=off, past_solid=past))
        return Duty(tuple(events))

    def extremes(self, spring: HelicalSpring) -> tuple[float, float]:
        """Return the least and greatest deflection of the pass in m."""
        total = self.one_pass(spring).total
        return total.minimum, total.maximum


Watcher = Callable[[str, int], object]  # told the event's name and the samples read so far


def read_duty(case: Case, spring: HelicalSpring, watch: Watcher | None = None) -> Duty:
    """Read and count every event of the case; ``watch`` is told how far it is.

    Raises
    ------
    FileError, InputError
        From the record: what is wrong, where, and what would be right.
    """
    return Duty(tuple(_read_event(case, event, spring, watch) for event in case.duty.event))


def _read_event(case: Case, event: EventInput, spring: HelicalSpring, watch: Watcher | None) -> EventReading:
    off, past = Beyond(-1.0, 0.0), Beyond(1.0, spring.solid_deflection)
    if event.blocks is not None:
        total = Count()
        for block in event.blocks:
            total = total + block.cycles * count([block.low, block.high])
            cycles = np.array([float(block.cycles)])
            off.feed_cycles(np.array([block.low]), cycles)
            past.feed_cycles(np.array([block.high]), cycles)
        return EventReading(event.name, event.repeats, "deflection", 0.0, total, off, past)
    return _read_record(case, event, spring, off, past, watch)


def record_spec(case: Case, event: EventInput) -> RecordSpec:
    """Return how a recorded event of a case is to be read."""
    from springlife.duty.record import RecordSpec

    assert event.record is not None  # the case file has been checked
    return RecordSpec(
        path=case.beside(event.record),
        channel=event.channel,
        time=event.time,
        time_unit=event.time_unit,
        sample_rate=event.sample_rate,
        unit=event.unit,
        kind="force" if event.measures == "force" else "length",
        scale=event.scale,
        offset=event.offset,
        invert=event.invert,
        gaps=event.gaps,
        between=event.between,
    )


def _read_record(
    case: Case, event: EventInput, spring: HelicalSpring, off: Beyond, past: Beyond, watch: Watcher | None
) -> EventReading:
    from springlife.duty.envelope import EnvelopeAccumulator
    from springlife.duty.record import SummaryAccumulator, open_record
    from springlife.duty.signal import SignalAccumulator

    recording = open_record(record_spec(case, event))
    slope, intercept = line_of(event.measures, spring, event.installed_deflection or 0.0)
    gaps: Literal["error", "split"] = "split" if "split" in (event.gaps, event.between) else "error"
    summary, signal, tally = SummaryAccumulator(recording), SignalAccumulator(), Tally(nan=gaps)
    envelope, samples = EnvelopeAccumulator(), 0
    for block in recording.blocks():
        summary.feed(block)
        signal.feed(block)
        envelope.feed(block)
        tally.feed(block)
        deflection = slope * block + intercept
        off.feed(deflection)
        past.feed(deflection)
        samples += block.size
        if watch is not None:
            watch(event.name, samples)
    off.sample_rate = past.sample_rate = recording.sample_rate
    facts = signal.result(recording.sample_rate)
    return EventReading(
        name=event.name,
        repeats=event.repeats,
        measures=event.measures,
        installed=event.installed_deflection or 0.0,
        count=tally.result(),
        off_seat=off,
        past_solid=past,
        record=event.record,
        sha256=recording.sha256,
        summary=summary.result(),
        signal=facts,
        envelope=envelope.result(),
        mended=_mended(case, event, facts.spike_at, gaps) if facts.spikes else None,
        finer=_finer(case, event, recording.sample_rate) if case.judge.peaks_between_samples else None,
        provenance=recording.provenance,
    )


def _mended(case: Case, event: EventInput, places: tuple[int, ...], gaps: Literal["error", "split"]) -> Count:
    """Count a record again without its isolated samples (the first of them, when there are many)."""
    from springlife.duty.record import open_record
    from springlife.duty.signal import without_spikes

    tally, start, at = Tally(nan=gaps), 0, np.array(places, dtype=np.intp)
    for block in open_record(record_spec(case, event)).blocks():
        tally.feed(without_spikes(block, at[(at >= start) & (at < start + block.size)] - start))
        start += block.size
    return tally.result()


def _finer(case: Case, event: EventInput, sample_rate: float | None) -> Count:
    """Count a record again, :data:`FINER` times finer by band-limited interpolation.

    Raises
    ------
    InputError
        The record has gaps, across which nothing can be interpolated.
    """
    from springlife.duty.record import open_record
    from springlife.spring.surge_filter import Band, overlap_save

    if "split" in (event.gaps, event.between):
        raise InputError(f"{event.record}: peaks_between_samples needs a record without gaps or pieces kept apart")
    band = Band.of(sample_rate or 1.0, None)
    tally = Tally()
    ones = [lambda frequency: np.ones((1, frequency.size), complex)]
    for part in overlap_save(
        open_record(record_spec(case, event)).blocks(), ones, band, 8 * band.ripple, FINER, "moving"
    ):
        tally.feed(part[0])
    return tally.result()
