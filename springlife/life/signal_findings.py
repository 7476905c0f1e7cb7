"""Findings that need the recorded signal: how it was recorded, and what the spring makes of its speed."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from itertools import combinations_with_replacement
from typing import TYPE_CHECKING

import numpy as np

from springlife import units
from springlife.errors import InputError
from springlife.life.findings import Finding, found
from springlife.units import UnitSystem, significant

if TYPE_CHECKING:
    from springlife.duty.counting import Count
    from springlife.duty.signal import SignalFacts
    from springlife.duty.summary import RecordSummary
    from springlife.life.case import Case
    from springlife.life.damage import DamageModel, Floats
    from springlife.life.reading import Duty, EventReading
    from springlife.spring.helical import HelicalSpring
    from springlife.spring.stress import StressMap

Limits = Mapping[str, float]
# Units that are taken for one another: inch and mm, lbf and N, kgf and N, m and mm.
CONFUSED = {
    "25.4 (inch and mm)": 25.4,
    "4.448 (lbf and N)": 4.4482216152605,
    "9.81 (kgf and N)": 9.80665,
    "1000 (m and mm, or kN and N)": 1000.0,
}
# Findings that say a record is not what the case takes it for: they hold for every option judged from it.
OF_THE_RECORD = ("swapped-signal", "wrong-datum", "ac-coupled")
CENTRED = 0.05  # mean within this share of the range of zero
HARMONICS = 5
MANY_CROSSINGS = 20  # of the mean level: ten cycles


def of_rate(spring: HelicalSpring, limits: Limits, say: UnitSystem) -> Iterator[Finding]:
    """Yield what a measured rate far off the calculated one tells about units and the drawing."""
    if spring.measured_rate is None:
        return
    ratio = spring.measured_rate / spring.calculated_rate
    if abs(ratio - 1) <= limits["rate_mismatch"]:
        return
    seen = f"measured rate {say(spring.measured_rate, 'rate')}, calculated {say(spring.calculated_rate, 'rate')}"
    factor = _confusion(ratio, limits["rate_mismatch"])
    if factor:
        yield found("unit-mismatch", f"{seen}: off by about {factor}")
        return
    D, d, Na = spring.mean_diameter, spring.wire_diameter, spring.active_coils
    readings = {
        "the mean diameter is an outer diameter": ((D - d) / D) ** -3,
        "the mean diameter is an inner diameter": ((D + d) / D) ** -3,
        "two more coils are active": Na / (Na + 2),
        "two fewer coils are active": Na / (Na - 2) if Na > 2 else np.inf,
    }
    fitting = [text for text, factor in readings.items() if abs(ratio / factor - 1) <= limits["rate_mismatch"] / 2]
    tail = f"it would fit if {' or '.join(fitting)}" if fitting else "no other reading of the drawing fits"
    yield found("rate-mismatch", f"{seen}; {tail}")


def _confusion(ratio: float, tolerance: float) -> str | None:
    """Name the factor between units, or product of two, that a ratio stands for."""
    double = {f"{a} times {b}": CONFUSED[a] * CONFUSED[b] for a, b in combinations_with_replacement(CONFUSED, 2)}
    for name, value in (CONFUSED | double).items():
        if min(abs(ratio / value - 1), abs(ratio * value - 1)) <= tolerance:
            return name
    return None


def of_records(
    spring: HelicalSpring, stress: StressMap, duty: Duty, case: Case, limits: Limits, say: UnitSystem
) -> Iterator[Finding]:
    """Yield what each record shows about datum, sensor and speed."""
    for event in duty.events:
        if event.summary is None or event.signal is None or not event.summary.maximum > event.summary.minimum:
            continue
        yield from _datum(event, event.summary, spring, say)
        yield from _sensor(event, event.summary, event.signal, limits)
        yield from _speed(event, event.signal, spring, stress, limits, say)
        if event.repeats > limits["short_record_factor"]:
            message = f"{event.name!r} is repeated {event.repeats} times a pass"
            yield found("short-record", f"{message}, over {limits['short_record_factor']:g}")
    yield from _durations(duty, case, limits)


def _datum(event: EventReading, seen: RecordSummary, spring: HelicalSpring, say: UnitSystem) -> Iterator[Finding]:
    """Length for deflection, a turned sign, a datum missing or counted twice, a mean that was filtered off."""
    kind = "force" if event.measures == "force" else "length"
    low, high = seen.minimum, seen.maximum
    reach = f"{event.name!r} runs from {say(low, kind)} to {say(high, kind)} {event.measures}"
    off_seat = seen.negative_share
    solid, free = spring.solid_deflection, spring.free_length
    centred = abs(seen.mean) <= CENTRED * (high - low) and 0.25 < off_seat < 0.75
    if event.measures == "deflection" and high > solid and spring.solid_length < low and high <= 1.02 * free:
        yield found("swapped-signal", f"{reach}: these are lengths between solid {say(spring.solid_length, 'length')} "
                                      f"and free {say(free, 'length')}")  # fmt: skip
    elif event.measures != "length" and off_seat > 0.9:
        yield found("swapped-signal", f"{reach}: {100 * off_seat:.0f} % of the samples are negative")
    elif event.measures in ("deflection", "force") and centred:
        yield found("ac-coupled", f"{reach}: the mean {say(seen.mean, kind)} is about zero")
    elif event.measures == "travel" and low > 0.5 * event.installed and high + event.installed > solid >= high:
        yield found("wrong-datum", f"{reach}: with the installed {say(event.installed, 'length')} it passes solid at "
                                   f"{say(solid, 'length')}, without it does not")  # fmt: skip
    elif event.measures == "travel" and event.installed == 0 and low >= 0:
        yield found("wrong-datum", f"{reach}: the installed deflection is zero, so the spring would carry no preload")


def _sensor(event: EventReading, seen: RecordSummary, signal: SignalFacts, limits: Limits) -> Iterator[Finding]:
    """Clipping, coarse steps, drift, spikes and too few samples a cycle."""
    longest = max(seen.longest_at_minimum, seen.longest_at_maximum)
    if longest >= limits["clipped_run"] and longest > 2 * signal.longest_inside:
        where = "greatest" if seen.longest_at_maximum >= seen.longest_at_minimum else "least"
        message = f"{event.name!r} stays at its {where} value for {longest} samples in a row"
        yield found("clipped-sensor", f"{message}, inside its range for {signal.longest_inside} at most")
    if seen.levels is not None and seen.levels < limits["levels_low"]:
        yield found("coarse-steps", f"{event.name!r} takes {seen.levels} distinct values")
    reach = seen.maximum - seen.minimum
    # Minima of a random ride scatter, and a few slow cycles are no trend: a drift is what neither makes.
    steady = seen.drift is None or abs(seen.drift_z or 0.0) <= 3 or signal.crossings < MANY_CROSSINGS
    moved = 0.0 if seen.drift is None or steady else abs(seen.drift) / reach
    if moved > limits["drift_share"]:
        yield found("drift", f"the running minimum of {event.name!r} moves by {100 * moved:.0f} % of the range")
    few = signal.samples_a_cycle
    if few is not None and few < limits["samples_a_cycle"]:
        yield found("undersampled", f"{event.name!r} has {significant(few, 2)} samples a cycle")


def _speed(
    event: EventReading, signal: SignalFacts, spring: HelicalSpring, stress: StressMap, limits: Limits, say: UnitSystem
) -> Iterator[Finding]:
    """Content at the spring's own frequencies, and steps faster than its wave."""
    if not signal.sample_rate:
        return
    first = spring.surge_frequency
    if signal.spectrum is not None:
        working = signal.spectrum.below(0.99)
        near = [n for n in range(1, HARMONICS + 1) if signal.spectrum.share_near(n * first) > limits["surge_power"]]
        if working > first / limits["surge_ratio"]:
            message = f"99 % of the power of {event.name!r} lies below {say(working, 'frequency', 3)}"
            bound = f"1/{limits['surge_ratio']:g} of the surge frequency {say(first, 'frequency', 3)}"
            yield found("near-surge", f"{message}, over {bound}", "warn")
        elif near:
            names = ", ".join(f"{n} f1" for n in near)
            yield found("near-surge", f"{event.name!r} has content at {names}, f1 {say(first, 'frequency', 3)}", "warn")
    travel_time = 1 / (2 * first)
    if 1 / signal.sample_rate > travel_time / 2:
        return  # one sample spans the wave: a step cannot be told from slow motion
    slope = abs(event.line(spring)[0])
    speed = slope * signal.fastest * signal.sample_rate
    # dtau = K v sqrt(2 rho G): the wave's stress, whatever the geometry (Wahl, Mechanical Springs; memory).
    K = stress.alternating / (8 * spring.rate * spring.mean_diameter / (np.pi * spring.wire_diameter**3))
    wave = K * speed * float(np.sqrt(2 * spring.grade.density * spring.G))
    if wave > limits["impact_share"] * spring.static_limit:
        message = f"{event.name!r} has steps of {say(speed, 'velocity', 3)} within a sample"
        yield found("impact", f"{message}, whose wave adds {say(wave, 'stress', 3)}")


def _durations(duty: Duty, case: Case, limits: Limits) -> Iterator[Finding]:
    """Compare the events' durations with one pass, when both are times."""
    number, unit = units.split(case.duty.one_pass)
    try:
        one_pass = units.parse(f"{number!r} {unit}", "time")
    except InputError:
        return
    spans = [None if e.summary is None else e.summary.span_s for e in duty.events]
    known = sum(span * e.repeats for span, e in zip(spans, duty.events, strict=True) if span is not None)
    complete = all(span is not None for span in spans)
    over = known / one_pass - 1
    if over > limits["duration_mismatch"] or (complete and -over > limits["duration_mismatch"]):
        message = f"the events last {significant(known / 3600, 3)} h a pass, one_pass is {case.duty.one_pass}"
        yield found("repeats-mismatch", message)


def of_recounts(spring: HelicalSpring, model: DamageModel, duty: Duty, limits: Limits) -> Iterator[Finding]:
    """Yield what other ways of counting a record would change: half the rate, no spikes, no noise."""

    for event in duty.events:
        if event.signal is None or event.summary is None:
            continue
        low, high, rows = _damage_of(event, event.count, spring, model)
        whole = float(rows.sum())
        if not 0 < whole < np.inf:
            continue
        change = abs(float(_damage_of(event, event.signal.half_rate, spring, model)[2].sum()) / whole - 1)
        if change > limits["half_rate_change"]:
            message = f"without every second sample the damage of {event.name!r} changes by {100 * change:.0f} %"
            yield found("undersampled", message)
        if event.mended is not None:
            share = float(_damage_of(event, event.mended, spring, model)[2].sum()) / whole
            where = ", ".join(str(place + 1) for place in event.signal.spike_at[:5])
            message = f"{event.name!r} has {event.signal.spikes} isolated samples (first at {where})"
            yield found("spikes", f"{message}; without them its damage is {significant(share, 3)} times as large")
        if event.finer is not None:
            share = float(_damage_of(event, event.finer, spring, model)[2].sum()) / whole
            message = f"with band-limited peaks between its samples the damage of {event.name!r} would be "
            yield found("peaks-between", f"{message}{significant(share, 4)} times as large; the plain count is used")
        small = high - low <= limits["noise_range"] * float((high - low).max())
        if small.mean() > limits["noise_share"]:
            lost = 100 * float(rows[small].sum()) / whole
            message = f"{100 * small.mean():.0f} % of the distinct cycles of {event.name!r} are under "
            message += f"{100 * limits['noise_range']:g} % of its largest; a gate there would take "
            yield found(
                "noise-counted", f"{message}{'under 0.01' if lost < 0.01 else significant(lost, 2)} % of its damage"
            )


def _damage_of(
    event: EventReading, count: Count, spring: HelicalSpring, model: DamageModel
) -> tuple[Floats, Floats, Floats]:
    """Return low, high (m) and damage of every cycle of a record that recurs."""
    table = count.mapped(*event.line(spring)).table("repeat")
    return table.low, table.high, model.damage(table.low, table.high, table.count)
