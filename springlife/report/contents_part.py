"""Sections of the report on the part, its duty, its stresses and its strength."""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING

from springlife.report import worked_numbers
from springlife.report.blocks import Block, Figure, Rows, Section, Table, Text, rows
from springlife.report.drawing import spring_drawing, states
from springlife.report.figures import haigh
from springlife.report.figures_history import history
from springlife.strength import endurance
from springlife.units import significant

if TYPE_CHECKING:
    from springlife.life.assess import Assessment, Judgement
    from springlife.life.reading import EventReading

MOST_HISTORIES = 12  # records drawn; of more, those with the most damage
MOST_RECORDS = 40  # records told in full


def part(result: Assessment, j: Judgement) -> Section:
    """Drawing data, the spring drawn to scale, its geometry and behaviour."""
    say, s, given = result.say, j.spring, result.case.spring
    yes = {True: "yes", False: "no"}
    data = rows(
        [
            ("wire", f"{s.grade.title}, {s.grade.standard}".rstrip(", ")),
            ("wire diameter", say(s.wire_diameter, "length")),
            ("coil diameter", f"mean {say(s.mean_diameter, 'length')}, outside {say(s.outer_diameter, 'length')}, "
                              f"inside {say(s.inner_diameter, 'length')}"),
            ("coils", f"{s.total_coils:g} in all, {significant(s.active_coils)} active, ends {s.ends}"),
            ("free length", say(s.free_length, "length")),
            ("pitch", say(s.pitch, "length")),
            ("shot-peened", yes[s.shot_peened]),
            ("set removed", yes[s.set_removed]),
            ("supports", s.supports + (", guided" if s.guided else ", not guided")),
            ("temperature", say(s.temperature, "temperature", 3)),
            ("finish, environment", f"{given.finish}, {given.environment}"),
            ("mass", say(s.mass, "mass")),
        ]
    )  # fmt: skip
    lengths = [
        (words, say.number(s.free_length - y, "length"), say.number(y, "length"),
         say.number(float(s.force(y)), "force"), say.number(float(j.model.stress.static(y)), "stress"))
        for words, y in states(result)
    ]  # fmt: skip
    heads = ("state", *(f"{word}, {say.units[kind]}" for word, kind in (
        ("length", "length"), ("deflection", "length"), ("force", "force"), ("stress", "stress"))))  # fmt: skip
    told = "; ".join(f"{words} {say(s.free_length - y, 'length')}" for words, y in states(result))
    drawing = Figure(
        "spring",
        "The spring from the side, to scale, at its lengths.",
        f"Side view of the spring at four lengths: {told}.",
        lambda: spring_drawing(result),
    )
    return Section(
        "The part",
        (data, drawing, Table("Lengths and forces", heads, tuple(lengths)), *worked_numbers.of_geometry(result, j),
         *worked_numbers.of_behaviour(result, j)),
    )  # fmt: skip


def duty(result: Assessment, j: Judgement) -> Section:
    """Events in order, then each record with its quality and history."""
    assert result.duty is not None  # what was judged has a duty
    case, events = result.case, result.duty.events
    table = Table(
        "Events of one pass, in order",
        ("event", "source", "repeats", "cycles a pass", "damage a pass", "share"),
        tuple(
            (reading.name, reading.record or "programme", str(reading.repeats), significant(one.cycles),
             significant(one.damage, 3), f"{100 * one.share:.1f} %")
            for reading, one in zip(events, j.events, strict=True)
        ),
        align="llr",
    )  # fmt: skip
    blocks: list[Block] = [
        Text(
            f"One pass is {case.duty.one_pass}; the target {case.duty.target} is "
            f"{significant(case.duty.target_passes)} passes."
        ),
        table,
    ]
    programme = [
        (event.name, result.say.number(block.low, "length"), result.say.number(block.high, "length"), str(block.cycles))
        for event in case.duty.event
        for block in event.blocks or ()
    ]
    if programme:
        unit = result.say.units["length"]
        heads = ("event", f"least deflection, {unit}", f"greatest deflection, {unit}", "cycles")
        blocks.append(Table("Specified programme", heads, tuple(programme)))
    recorded = [event for event in events if event.recorded]
    shares = {one.name: one.share for one in j.events}
    drawn = sorted(recorded, key=lambda event: -shares[event.name])[:MOST_HISTORIES]
    for event in recorded[:MOST_RECORDS]:
        blocks += _record(result, event, event in drawn, events.index(event))
    if len(recorded) > MOST_RECORDS:
        blocks.append(Text(f"{len(recorded) - MOST_RECORDS} further records are described in result.json."))
    return Section("The duty", tuple(blocks))


def _record(result: Assessment, event: EventReading, drawn: bool, number: int) -> Iterator[Block]:
    """Yield what is known of a record, and its history."""
    kind = "force" if event.measures == "force" else "length"
    lines = [("record", f"{event.name}: {event.record}")]
    if event.summary is not None:
        lines += event.summary.lines()
        ends = (result.say(event.summary.minimum, kind), result.say(event.summary.maximum, kind))
        measured = f" from installed at {result.say(event.installed, 'length')}" if event.measures == "travel" else ""
        lines.append(("values", f"{ends[0]} to {ends[1]}, {event.measures}{measured}"))
    lines += [("reading", "; ".join(event.provenance))]
    yield rows(lines)
    if drawn and event.summary is not None and event.summary.maximum > event.summary.minimum:
        span = "turning points as dots" if event.envelope and event.envelope.samples == 1 else "least to greatest value"
        yield Figure(
            f"history-{number + 1}",
            f"{event.name}: one occurrence, {span}; ringed: the ends of its largest cycle.",
            f"Deflection over time of {event.name}.",
            lambda: history(result, event),
        )


def load(result: Assessment, j: Judgement) -> Section:
    """From deflection to stress, with the numbers of the worst cycle."""
    judge, s = result.case.judge, j.spring
    where = (
        "mean stress and amplitude"
        if judge.curvature_on == "both"
        else "the amplitude; the mean carries the direct-shear factor"
    )
    text = (
        f"Force is rate times deflection from the free length, zero off the seat and at most that at solid. The "
        f"{judge.stress_factor} factor is on {where}; against the static limit stands "
        f"{'the direct-shear factor, as set has been removed' if s.set_removed else 'the same factor'}."
    )
    blocks: list[Block] = [Text(text)]
    if s.measured_rate:
        blocks.append(
            Text(
                f"The measured rate {result.say(s.rate, 'rate')} is used; the calculated one is "
                f"{result.say(s.calculated_rate, 'rate')}."
            )
        )
    return Section("From load to stress", (*blocks, *worked_numbers.of_load(result, j)))


def strength(result: Assessment, j: Judgement) -> Section:
    """What the wire endures, by whose word, and the Haigh diagram."""
    judge, curve, s = result.case.judge, j.model.curve, j.spring
    peened = "shot-peened" if s.shot_peened else "not shot-peened"
    lines = [
        ("endurance data", f"{judge.endurance}, {peened}"),
        ("criterion", judge.criterion),
        ("life curve", f"{curve.label}; slope {significant(curve.slope, 3)}, knee at {significant(curve.knee)} cycles"),
        ("valid for lives", f"{significant(curve.valid_from)} to {significant(curve.valid_to)} cycles"),
        ("below the knee", f"Miner {judge.miner}"),
        ("reliability", result.reliability),
    ]
    if judge.endurance == "zimmerli":
        scope = endurance.zimmerli_scope()
        lines.append((
            "scope of the data",
            f"{scope.material} under {result.say(scope.wire_diameter_below, 'length')}, up to "
            f"{result.say(scope.temperature_up_to, 'temperature', 3)}, {scope.environment}, "
            f"{significant(scope.cycles_up_to)} cycles ({scope.provenance})",
        ))  # fmt: skip
    points = Table(
        "Points of the life curve",
        ("cycles", f"fully reversed amplitude, {result.say.units['stress']}"),
        tuple((significant(N), result.say.number(S, "stress")) for N, S in curve.points),
        align="r",
    )
    return Section("Strength", (rows(lines), *worked_numbers.of_strength(result, j), points))


def haigh_figure(result: Assessment, j: Judgement) -> Figure:
    """Return the Haigh diagram, which stands on page one."""
    return Figure(
        "haigh",
        "Cycles among the criteria (Haigh diagram): dots by damage, each criterion at the knee, dashed: yield.",
        f"Alternating over mean shear stress; worst cycle {_worst(result, j)}.",
        lambda: haigh(result),
    )


def _worst(result: Assessment, j: Judgement) -> str:
    if j.worst is None:
        return "none"
    return f"{result.say(j.worst.tau_a, 'stress')} about {result.say(j.worst.tau_m, 'stress')}"


def as_given(result: Assessment) -> Section:
    """Return the [spring] table as written: all there is when nothing could be judged."""
    raw = result.case.raw["spring"]
    return Section("The part as given", (Rows(tuple((str(key), str(value)) for key, value in raw.items())),))
