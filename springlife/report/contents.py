"""The report as plain data: what stands on page one, then every section in order.

Everything is computed from the results given; page and sheet only set it in type.
"""

from __future__ import annotations

import platform
from collections.abc import Iterator
from dataclasses import dataclass
from importlib.metadata import version
from typing import TYPE_CHECKING, Any

from springlife import __version__
from springlife.report import contents_life, contents_part, contents_studies
from springlife.report.blocks import Block, Figure, Points, Rows, Section, Table, Text, plain, rows
from springlife.report.terminal import VERDICTS, quantity_of_life
from springlife.units import significant

if TYPE_CHECKING:
    from springlife.life.assess import Assessment, Judgement
    from springlife.life.compare import Comparison
    from springlife.life.findings import Finding
    from springlife.life.rig import RigTest
    from springlife.life.scatter import ScatterResult
    from springlife.life.surge import SurgeResult

CAUTIONS = (
    "Estimates from handbook strengths scatter by a factor of ten or more in life.",
    "Not covered: end-coil contact and wear, corrosion, hydrogen embrittlement, surface damage, side load, temperature "
    "beyond the grade's limit, relaxation over time.",
    "A spring whose failure can hurt someone needs tests of the part, the applicable standards and codes, and the "
    "judgement of a licensed engineer where the law asks for one.",
)
ASSUMPTIONS = (
    "The spring is a helical compression spring of round wire, its force linear in deflection, its stress that at the "
    "inside of the coil.",
    "Deflection follows the record at once: the wave in the wire is in the judgement only where surge was asked for.",
    "Damage adds up without regard to the order of cycles (Miner's rule).",
    "Dimensions and strengths are nominal unless scatter was asked for.",
)
LIBRARIES = ("numpy", "scipy", "pandas", "matplotlib", "rainflow", "typst")
SIGNERS = ("prepared", "checked", "approved")


@dataclass(frozen=True)
class Studies:
    """What was asked for beside the judgement."""

    comparison: Comparison | None = None
    scatter: ScatterResult | None = None
    rig: RigTest | None = None
    surge: SurgeResult | None = None


@dataclass(frozen=True)
class Report:
    """A report: the words of page one and the sections."""

    result: Assessment
    date: str
    command: str
    front: tuple[Block, ...]
    sections: tuple[Section, ...]
    surge_verdict: str | None = None

    @property
    def verdict(self) -> str:
        """The verdict that counts: with the wave where surge was asked for."""
        return self.surge_verdict or self.result.verdict

    @property
    def figures(self) -> tuple[Figure, ...]:
        """All figures in order."""
        blocks = [*self.front, *(block for section in self.sections for block in section.blocks)]
        return tuple(block for block in blocks if isinstance(block, Figure))

    def to_dict(self) -> dict[str, Any]:
        """Return what the typesetters need: text, numbers and the names of figures."""
        given = self.result.case.input
        return {
            "title": given.title,
            "subtitle": " · ".join(
                text
                for text in (
                    f"part {given.part}" if given.part else "",
                    f"revision {given.revision}" if given.revision else "",
                    given.author,
                    self.date or "not dated",
                )
                if text
            ),
            "verdict": VERDICTS[self.verdict][0],
            "version": __version__,
            "front": [plain(block) for block in self.front],
            "sections": [
                {
                    "number": number,
                    "id": f"section-{number}",
                    "title": section.title,
                    "blocks": [plain(block) for block in section.blocks],
                }
                for number, section in enumerate(self.sections, start=1)
            ],
            "signers": list(SIGNERS),
        }


def report_of(result: Assessment, studies: Studies, *, date: str, command: str) -> Report:
    """Put the report of a judged case together; nothing is drawn yet."""
    j = result.judgement
    sections = [*_judged_sections(result, j, studies)] if j else [contents_part.as_given(result)]
    sections += [_limits_of_it(result), _sources(result, studies), _traceability(result, studies, command)]
    wave = studies.surge.verdict if studies.surge else None
    return Report(result, date, command, tuple(_front(result, studies)), tuple(sections), wave)


def _judged_sections(result: Assessment, j: Judgement, studies: Studies) -> Iterator[Section]:
    yield contents_part.part(result, j)
    yield contents_part.duty(result, j)
    yield contents_part.load(result, j)
    yield contents_part.strength(result, j)
    yield contents_life.counting(result, j)
    yield contents_life.damage(result, j)
    yield contents_life.band(result, j)
    if studies.comparison:
        yield contents_life.options(studies.comparison)
    if studies.scatter:
        yield contents_studies.scatter(studies.scatter)
    if studies.rig:
        yield contents_studies.rig(studies.rig)
    if studies.surge:
        yield contents_studies.surge(studies.surge)


def _front(result: Assessment, studies: Studies) -> Iterator[Block]:
    """Page one: what a reviewer wants to know before anything else."""
    case, j = result.case, result.judgement
    if j is None:
        yield Text("Nothing could be judged; the findings say why.")
    else:
        passes = f"{significant(case.duty.target_passes)} passes of {case.duty.one_pass}"
        damage = f"{significant(j.damage_at_target, 3)} at the target; {case.judge.allowed_damage:g} allowed"
        extrapolated = "; extrapolated past the data" if j.extrapolated else ""
        yield rows(
            [
                ("target", f"{case.duty.target} ({passes})"),
                ("life", quantity_of_life(result, j.life_passes) + extrapolated),
                ("reliability", result.reliability),
                ("damage", damage),
                ("governed by", _governing(result, j)),
                ("peened or not", _peened(studies.comparison)),
                ("without surge", VERDICTS[result.verdict][0].lower() if studies.surge else ""),
            ]
        )
        yield Table("Margins", ("check", "margin", "what is compared"), tuple(_margins(result, j)), align="lrl")
    yield _findings("Open findings", [f for f in result.findings if f.waived_by is None and f.level != "note"])
    waived = [f for f in result.findings if f.waived_by is not None]
    heads = ("finding", "waived by", "reason", "what was seen")
    body = tuple((f.code, f.waived_by or "", f.reason or "", f.message) for f in waived)
    yield Table("Waivers", heads, body, align="l", empty="no finding is waived")
    if j is not None:
        yield contents_part.haigh_figure(result, j)


def _findings(caption: str, findings: list[Finding]) -> Table:
    body = tuple((f.level, f.code, f.message, f.remedy) for f in findings)
    return Table(caption, ("level", "finding", "what was seen", "what to do"), body, align="l", empty="none")


def _governing(result: Assessment, j: Judgement) -> str:
    """Name the event with the most damage, its worst cycle, and the check that the margin ends at."""
    if j.worst is None:
        return "nothing: the duty has no cycle"
    event = max(j.events, key=lambda one: one.share)
    place = f"{result.say(j.worst.low, 'length')} to {result.say(j.worst.high, 'length')}"
    head = f"event {event.name}, {100 * event.share:.1f} % of the damage" if event.share > 0 else "no damage"
    return f"{head}; worst cycle {place}; the margin ends at {j.margin_governed_by}"


def _peened(comparison: Comparison | None) -> str:
    """Say what peening does to the life, in one line."""
    if comparison is None:
        return ""
    drawn = comparison.options[0]
    pair = next(
        (one for one in comparison.options[1:]
         if one.spring and drawn.spring and one.spring.shot_peened != drawn.spring.shot_peened), None,
    )  # fmt: skip
    if pair is None or drawn.spring is None:
        return ""
    told = []
    for option in sorted((drawn, pair), key=lambda one: not (one.spring and one.spring.shot_peened)):
        a, j = option.assessment, option.assessment.judgement
        assert option.spring is not None and j is not None
        word = "peened" if option.spring.shot_peened else "not peened"
        told.append(
            f"{word}{' (as drawn)' if option is drawn else ''} {quantity_of_life(a, j.life_passes)}, {a.verdict}"
        )
    return "; ".join(told)


def _margins(result: Assessment, j: Judgement) -> Iterator[tuple[str, str, str]]:
    """Yield each check's margin and what it compares."""
    assert result.duty is not None
    say, s = result.say, j.spring
    _, high = result.duty.extremes(s)
    if j.stress_margin is None:
        yield "fatigue", "-", "the duty puts no stress on the spring"
    else:
        word = "" if j.margin_governed_by == "fatigue" else "over "
        yield (
            "fatigue",
            word + significant(j.stress_margin, 3),
            "factor on every stress at which the target is just met",
        )
    for words, y in (("yield in service", high), ("yield at solid", s.solid_deflection)):
        peak = float(j.model.stress.static(y))
        factor = significant(s.static_limit / peak, 3) if peak > 0 else "-"
        yield words, factor, f"{say(s.static_limit, 'stress')} static limit over {say(peak, 'stress')}"
    share = f" ({100 * (s.solid_deflection - high) / high:.1f} %)" if high > 0 else ""
    clearance = f"{say(s.solid_deflection, 'length')} to solid less {say(high, 'length')} greatest deflection"
    yield "solid clearance", say(s.solid_deflection - high, "length", 3) + share, clearance
    if s.buckling_deflection is None:
        yield "buckling", "none", "so short that it buckles at no deflection"
    else:
        ratio = significant(s.buckling_deflection / high, 3) if high > 0 else "-"
        guided = ", guided" if s.guided else ", not guided"
        yield "buckling", ratio, f"buckles at {say(s.buckling_deflection, 'length')} unguided{guided}"
    near = [f.message for f in result.findings if f.code == "near-surge"]
    frequency = say(s.surge_frequency, "frequency", 3)
    yield "surge", frequency, "; ".join(near) or "first natural frequency between plates; no finding against it"


def _limits_of_it(result: Assessment) -> Section:
    notes = [f for f in result.findings if f.level == "note" and f.waived_by is None]
    changed = result.case.input.limits
    blocks: list[Block] = [
        Points("Assumptions", ASSUMPTIONS),
        _findings("Notes", notes),
        Points("Cautions", CAUTIONS),
    ]
    if changed:
        body = tuple((key, f"{value:g}") for key, value in changed.items())
        blocks.append(Table("Limits of findings that the case changes", ("limit", "value"), body))
    return Section("Assumptions, what is not covered, cautions", tuple(blocks))


def _sources(result: Assessment, studies: Studies) -> Section:
    names = list(dict.fromkeys(result.sources))
    if studies.scatter:
        names += [f"{one.name.replace('_', ' ')}: {one.source} ({one.provenance})" for one in studies.scatter.spreads]
    body = tuple((str(number), name) for number, name in enumerate(dict.fromkeys(names), start=1))
    text = (
        "In brackets stands how a number came here: published, read in the source; memory, recalled without the source "
        "open; common practice, without a source."
    )
    return Section("Sources", (Text(text), Table("Where the numbers come from", ("no.", "source"), body, align="llr")))


def _traceability(result: Assessment, studies: Studies, command: str) -> Section:
    case = result.case
    versions = [("springlife", __version__), ("Python", platform.python_version())]
    versions += [(name, version(name)) for name in LIBRARIES]
    settings = [(key, "-" if value is None else str(value)) for key, value in case.judge.model_dump().items()]
    if studies.scatter:
        settings += [("scatter samples", str(studies.scatter.samples)), ("scatter seed", str(studies.scatter.seed))]
    files = Table("Files read", ("file", "SHA-256"), result.inputs, align="l")
    return Section(
        "Traceability",
        (
            Rows((("command", command), ("programs", ", ".join(f"{name} {number}" for name, number in versions)))),
            files,
            Table("Settings", ("setting", "value"), tuple(settings), align="l"),
        ),
    )
