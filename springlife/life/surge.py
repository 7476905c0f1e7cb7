"""Life with the wave in the coils: every coil's own motion counted, the worst one judged, beside the static reading.

Each recorded event is read once more for each damping ratio, filtered by the spring's transfer function at places
along the wire, and counted there. The rest of the judgement is that of ``assess``.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field, replace
from itertools import chain
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from springlife import __version__
from springlife.duty.counting import Count, Tally
from springlife.errors import InputError
from springlife.life import cam
from springlife.life.assess import Assessment, Judgement, assess, judge
from springlife.life.cam import CamSweep, sweeps
from springlife.life.case import Case
from springlife.life.limits import limit_values
from springlife.life.reading import Beyond, Duty, record_spec
from springlife.life.result import finite
from springlife.spring.surge import Wave, local_deflection, needed_rate, peak_factor, settings, wave_of
from springlife.spring.surge_filter import Floats
from springlife.units import significant

if TYPE_CHECKING:
    from springlife.life.case_input import EventInput
    from springlife.life.reading import EventReading


@dataclass(frozen=True)
class EventSurge:
    """One event with the wave, at the case's damping ratio; arrays of shape (positions,), deflections in m, forces N.

    ``slow`` says why an event was judged as slow motion instead; its coils then all move as recorded.
    """

    name: str
    slow: str | None
    sample_rate: float | None
    needed_rate: float
    static_low: float
    static_high: float
    low: Floats
    high: Floats
    fixed_force: tuple[float, float]
    moving_force: tuple[float, float]
    closed: float  # greatest part of the time that some coil's gap is closed
    lifted: float  # part of the time that a seat would have to pull

    @property
    def amplification(self) -> float:
        """Greatest range of any coil over the range of the record."""
        span = self.static_high - self.static_low
        return float((self.high - self.low).max() / span) if span > 0 else 1.0

    @property
    def worst(self) -> int:
        """Place of the greatest range."""
        return int(np.argmax(self.high - self.low))

    @property
    def rate_too_low(self) -> bool:
        """Whether the record cannot show what moves the first modes."""
        return self.slow is None and self.sample_rate is not None and self.sample_rate < self.needed_rate


@dataclass(frozen=True)
class Damped:
    """The judgement of every coil at one damping ratio: damage a pass, shape (positions,), and the worst coil's."""

    zeta: float
    damage: Floats
    worst: int
    judgement: Judgement


@dataclass(frozen=True)
class SurgeResult:
    """A case with the wave in its coils, beside the same case without."""

    assessment: Assessment
    wave: Wave
    positions: Floats  # from 0 at the fixed end to 1 at the moving one
    dampings: tuple[Damped, ...]  # ascending damping ratio
    events: tuple[EventSurge, ...]
    cams: tuple[CamSweep, ...]

    @property
    def case(self) -> Case:
        """The case judged."""
        return self.assessment.case

    @property
    def static(self) -> Judgement:
        """The judgement without the wave."""
        assert self.assessment.judgement is not None  # the study refuses a case that was not judged
        return self.assessment.judgement

    @property
    def nominal(self) -> Damped:
        """The judgement at the case's damping ratio."""
        return next(one for one in self.dampings if one.zeta == self.wave.zeta)

    @property
    def verdict(self) -> str:
        """That of ``assess``, made worse by what the worst coil shows at the case's damping ratio.

        It is withheld when coils clash, or a seat would pull for longer than a record may lift off, unless the
        case waives ``past-solid`` or ``lift-off``: the linear wave does not hold then.
        """
        if self.assessment.verdict == "withheld":
            return "withheld"
        waived = {waiver.finding for waiver in self.case.input.waive}
        most = limit_values(self.case.input.limits)["lift_off_fraction"]
        clash = "past-solid" not in waived and any(event.closed > 0 for event in self.events)
        lifts = "lift-off" not in waived and any(event.lifted > most for event in self.events)
        if clash or lifts:
            return "withheld"
        short = self.nominal.judgement.damage_at_target > self.case.judge.allowed_damage
        return "falls short" if short else self.assessment.verdict

    def coil(self, place: int) -> float:
        """Return the coil at a place, counted in active coils from the fixed end."""
        return float(self.positions[place]) * self.static.spring.active_coils

    @property
    def warnings(self) -> tuple[str, ...]:
        """What limits the result, in sentences."""
        return tuple(_warnings(self))

    def to_dict(self) -> dict[str, Any]:
        """Give everything for JSON; SI values under keys that name the unit."""
        return {
            "version": __version__,
            "title": self.case.input.title,
            "verdict": self.verdict,
            "static_verdict": self.assessment.verdict,
            "first_frequency_Hz": self.wave.first_frequency,
            "travel_time_s": self.wave.travel_time,
            "damping": self.wave.zeta,
            "moving_ends": self.case.input.surge.moving_ends,
            "positions": self.positions.tolist(),
            "static": _life(self.static),
            "dynamic": [
                {"damping": one.zeta, **_life(one.judgement), "worst_coil": self.coil(one.worst)}
                | {"damage_per_pass_at": [finite(value) for value in one.damage]}
                for one in self.dampings
            ],
            "events": [
                {
                    "name": event.name,
                    "judged_as_slow": event.slow,
                    "sample_rate_Hz": event.sample_rate,
                    "needed_rate_Hz": event.needed_rate,
                    "amplification": event.amplification,
                    "worst_coil": self.coil(event.worst),
                    "static_m": [event.static_low, event.static_high],
                    "low_m": event.low.tolist(),
                    "high_m": event.high.tolist(),
                    "fixed_seat_force_N": list(event.fixed_force),
                    "moving_seat_force_N": list(event.moving_force),
                    "gap_closed_share": event.closed,
                    "lift_off_share": event.lifted,
                }
                for event in self.events
            ],
            "cams": [sweep.to_dict(self.coil) for sweep in self.cams],
            "warnings": list(self.warnings),
            "findings": [finding.to_dict() for finding in self.assessment.findings],
            "inputs": [{"path": name, "sha256": digest} for name, digest in self.assessment.inputs],
        }


def _life(judgement: Judgement) -> dict[str, float | None]:
    return {
        "life_passes": judgement.life_passes,
        "damage_per_pass": finite(judgement.damage_per_pass),
        "damage_at_target": finite(judgement.damage_at_target),
    }


def surge(case: Case | str | Path) -> SurgeResult:
    """Judge a case with the wave in its coils, over a range of damping ratios, beside the static judgement.

    Parameters
    ----------
    case : Case or path
        The case; its [surge] table changes the defaults of data/surge.toml.

    Raises
    ------
    FileError, InputError
        The case or a record cannot be used, or nothing could be judged.
    """
    return with_surge(assess(case))


def with_surge(assessment: Assessment) -> SurgeResult:
    """Judge again, with the wave in the coils, what ``assess`` has judged without; the records are read once more.

    Raises
    ------
    FileError, InputError
        A record cannot be used, or nothing was judged.
    """
    case = assessment.case
    if assessment.duty is None or assessment.judgement is None:
        stops = "; ".join(finding.message for finding in assessment.findings if finding.level == "stop")
        raise InputError(f"{case.path}: cannot be judged, so there is no wave to follow: {stops}")
    given, defaults = case.input.surge, settings()
    zeta = defaults["damping"]["ratio"] if given.damping is None else given.damping
    positions = np.linspace(0.0, 1.0, given.positions or defaults["positions"]["number"])
    wave = wave_of(assessment.judgement.spring, zeta)
    dampings: list[Damped] = []
    events: tuple[EventSurge, ...] = ()
    for ratio in sorted({zeta, *_range(case, zeta)}):
        one, followed = _damped(assessment, replace(wave, zeta=ratio), positions)
        dampings.append(one)
        events = followed if ratio == zeta else events
    cams = sweeps(case, assessment.judgement, wave, positions)
    return SurgeResult(assessment, wave, positions, tuple(dampings), events, cams)


def _range(case: Case, zeta: float) -> list[float]:
    """Return the damping ratios at which a life is also shown; the usual range moves with the case's ratio."""
    if case.input.surge.damping_range is not None:
        return case.input.surge.damping_range
    usual = settings()["damping"]
    return [zeta * float(ratio) / float(usual["ratio"]) for ratio in usual["range"]]


def _damped(assessment: Assessment, wave: Wave, positions: Floats) -> tuple[Damped, tuple[EventSurge, ...]]:
    """Follow every event at one damping ratio and judge every coil."""
    case, duty = assessment.case, assessment.duty
    assert duty is not None and assessment.judgement is not None
    spring, model = assessment.judgement.spring, assessment.judgement.model
    followed = [
        _follow(case, event, reading, wave, positions, assessment.judgement)
        for event, reading in zip(case.duty.event, duty.events, strict=True)
    ]
    coils = [Duty(tuple(watch.reading(place) for watch in followed)) for place in range(positions.size)]
    damage = np.array([float(model.damage(*coil.one_pass(spring).life(1.0, "repeat")).sum()) for coil in coils])
    reach = np.array([coil.one_pass(spring).total.maximum for coil in coils])
    worst = int(np.lexsort((reach, damage))[-1])
    judged = judge(case, coils[worst]).judgement
    assert judged is not None  # the same part and model have been judged
    return Damped(wave.zeta, damage, worst, judged), tuple(watch.result(wave) for watch in followed)


@dataclass
class _Watch:
    """What is gathered of one event at every place."""

    event: EventReading
    judgement: Judgement
    size: int
    slow: str | None = None
    rate: float | None = None
    counts: list[Count] = field(default_factory=list)
    closed: list[Beyond] = field(default_factory=list)
    off: list[Beyond] = field(default_factory=list)

    def reading(self, place: int) -> EventReading:
        """Return the event as the coil at a place goes through it."""
        if not self.counts:
            return self.pinned
        return replace(
            self.event, measures="deflection", installed=0.0, count=self.counts[place],
            off_seat=self.off[place], past_solid=self.closed[place],
        )  # fmt: skip

    @property
    def pinned(self) -> EventReading:
        """The event in deflection of this spring, as recorded."""
        spring = self.judgement.spring
        return replace(
            self.event, measures="deflection", installed=0.0, count=self.event.count.mapped(*self.event.line(spring))
        )

    def result(self, wave: Wave) -> EventSurge:
        """Sum up."""
        still = self.pinned.count
        counts = self.counts or [still] * self.size
        k = self.judgement.spring.rate
        low, high = np.array([one.minimum for one in counts]), np.array([one.maximum for one in counts])
        ends = (self.off[0], self.off[-1]) if self.off else (self.event.off_seat,)
        return EventSurge(
            name=self.event.name,
            slow=self.slow,
            sample_rate=self.rate,
            needed_rate=needed_rate(wave),
            static_low=still.minimum,
            static_high=still.maximum,
            low=low,
            high=high,
            fixed_force=(k * float(low[0]), k * float(high[0])),
            moving_force=(k * float(low[-1]), k * float(high[-1])),
            closed=max((one.share for one in self.closed), default=self.event.past_solid.share),
            lifted=max(end.share for end in ends),
        )


def _follow(
    case: Case, event: EventInput, reading: EventReading, wave: Wave, positions: Floats, judgement: Judgement
) -> _Watch:
    """Count one event at every place, or say why it is taken as slow."""
    watch = _Watch(reading, judgement, positions.size)
    watch.rate = reading.summary.rate_Hz if reading.summary else None
    if reading.record is None:
        watch.slow = "a specified programme has no clock"
    elif reading.measures == "force":
        watch.slow = "a force at a seat holds the wave already"
    elif watch.rate is None:
        watch.slow = "the record has neither a time column nor a sample rate"
    if watch.slow:
        return watch
    assert watch.rate is not None
    given, most = case.input.surge, 0.4 * watch.rate
    up_to = min(given.up_to or most, most)
    finer = peak_factor(up_to, watch.rate)
    watch.closed = [Beyond(1.0, judgement.spring.solid_deflection, finer * watch.rate) for _ in positions]
    watch.off = [Beyond(-1.0, 0.0, finer * watch.rate) for _ in positions]
    tallies = [Tally(nan="split") for _ in positions]
    for number, piece in enumerate(_pieces(case, event, reading.line(judgement.spring))):
        if number:
            for tally in tallies:
                tally.feed([np.nan])
        for block in local_deflection(
            piece, watch.rate, wave, positions,
            up_to=up_to, upsample=finer, start="moving", moving_ends=given.moving_ends,
        ):  # fmt: skip
            for place, row in enumerate(block):
                tallies[place].feed(row)
                watch.closed[place].feed(row)
                watch.off[place].feed(row)
    watch.counts = [tally.result() for tally in tallies]
    return watch


def _pieces(case: Case, event: EventInput, line: tuple[float, float]) -> Iterator[Iterator[Floats]]:
    """Yield the pieces of a record between its gaps, each as blocks of deflection in m, in order."""
    from springlife.duty.record import open_record

    slope, intercept = line
    rest: list[Floats] = []  # what of a block lies beyond a gap

    def piece() -> Iterator[Floats]:
        for block in chain(rest and [rest.pop()], blocks):
            gaps = np.flatnonzero(np.isnan(block))
            if gaps.size:
                rest.append(block[gaps[0] + 1 :])
                yield block[: gaps[0]]
                return
            yield block

    blocks = (slope * block + intercept for block in open_record(record_spec(case, event)).blocks(1 << 16))
    yield piece()
    while rest:
        yield piece()


def _warnings(result: SurgeResult) -> Iterator[str]:
    """Yield what the model does not hold for, and what the records cannot show."""
    for event in result.events:
        if event.slow:
            yield f"{event.name!r} is judged as slow motion: {event.slow}"
            continue
        if event.rate_too_low:
            yield (
                f"{event.name!r} is sampled at {significant(event.sample_rate or 0)} Hz; showing what moves the first "
                f"modes needs {significant(event.needed_rate)} Hz, so motion that excites them may be missing"
            )
        if event.closed:
            yield (
                f"{event.name!r} closes the gap of a coil {significant(100 * event.closed, 2)} % of the time: coils "
                "clash, which is not followed; their stress is taken as that at solid"
            )
        if event.lifted:
            yield (
                f"{event.name!r} would have a seat pull {significant(100 * event.lifted, 2)} % of the time: the spring "
                "lifts off and strikes again, and the linear wave holds no longer"
            )
        inside = (event.low < 0)[1:-1]
        if inside.any():
            yield f"{event.name!r} stretches coils away from the ends; tension counts as no stress"
    for sweep in result.cams:
        yield from cam.warnings(sweep)
