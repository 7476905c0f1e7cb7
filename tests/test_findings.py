"""Every finding is found where its fault is, at its level, and nowhere else.

The quiet case has nothing but the two notes that every judgement carries.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from casefile import write_case

from springlife.errors import InputError
from springlife.life.assess import Assessment, assess
from springlife.life.findings import CATALOGUE

QUIET = """\
format = 1
title = "quiet"
[spring]
grade = "A228"
wire_diameter = "2.0 mm"
mean_diameter = "16 mm"
total_coils = 12
free_length = "55 mm"
[duty]
one_pass = "1 h"
target = "100 h"
[[duty.event]]
name = "work"
blocks = [{ low = "5 mm", high = "20 mm", cycles = 100 }]
[judge]
criterion = "gerber"
"""
ALWAYS = {"assumed-curve", "not-covered"}
BLOCK = 'low = "5 mm", high = "20 mm", cycles = 100'

# (finding, level, [(text, replacement), ...])
FAULTS = [
    ("past-solid", "stop", [('"20 mm"', '"32 mm"')]),
    ("near-solid", "warn", [('"20 mm"', '"28 mm"')]),
    ("lift-off", "stop", [('"5 mm"', '"-1 mm"')]),
    ("index-range", "warn", [('"16 mm"', '"7 mm"')]),
    ("index-range", "stop", [('"16 mm"', '"42 mm"')]),
    ("coils-too-few", "warn", [("total_coils = 12", "total_coils = 4.5"), ('"55 mm"', '"22 mm"')]),
    ("impossible-geometry", "stop", [('"16 mm"', '"1.5 mm"')]),
    ("wire-off-table", "stop", [('"2.0 mm"', '"7.5 mm"'), ('"16 mm"', '"60 mm"'), ('"55 mm"', '"150 mm"')]),
    ("strength-implausible", "stop", [("total_coils", 'tensile_strength = "3600 MPa"\ntotal_coils')]),
    ("yields", "warn", [('"55 mm"', '"58 mm"')]),
    ("yields", "stop", [('"55 mm"', '"70 mm"'), ("total_coils", "guided = true\ntotal_coils")]),
    ("endurance-scope", "warn", [("total_coils", 'environment = "corrosive"\ntotal_coils')]),
    ("endurance-scope", "warn", [("total_coils", 'temperature = "90 degC"\ntotal_coils')]),
    ("endurance-scope", "warn", [('"A228"', '"B159"'), ('high = "20 mm"', 'high = "9 mm"'), ('"55 mm"', '"35 mm"')]),
    ("endurance-scope", "warn", [("cycles = 100", "cycles = 1000000")]),
    ("too-hot", "stop", [("total_coils", 'temperature = "200 degC"\ntotal_coils')]),
    ("too-hot", "warn", [('"A228"', '"A401"'), ("total_coils", 'temperature = "235 degC"\nshot_peened = true\ntotal_coils')]),
    ("buckles", "stop", [("total_coils = 12", "total_coils = 40"), ('"55 mm"', '"180 mm"'), ('"20 mm"', '"60 mm"')]),
    ("hydrogen", "warn", [("total_coils", 'finish = "plated"\ntotal_coils')]),
    ("below-1e3", "stop", [("total_coils", 'tensile_strength = "870 MPa"\ntotal_coils'), ('"5 mm"', '"0 mm"'), ('"20 mm"', '"30 mm"')]),
    ("slope-implausible", "warn", [("[judge]", "[limits]\nslope_low = 30.0\n[judge]")]),
    ("assumed-curve", "note", []),
    ("not-covered", "note", []),
]  # fmt: skip


def judged(folder: Path, changes: list[tuple[str, str]], record: str | None = None) -> Assessment:
    text = QUIET
    for find, put in changes:
        assert find in text
        text = text.replace(find, put)
    return assess(write_case(folder, text, record))


def test_quiet_case_has_only_the_notes_that_are_always_there(tmp_path: Path) -> None:
    result = judged(tmp_path, [])
    assert {finding.code for finding in result.findings} == ALWAYS
    assert result.verdict == "meets"


@pytest.mark.parametrize(("code", "level", "changes"), FAULTS, ids=[f"{f[0]}-{f[1]}-{i}" for i, f in enumerate(FAULTS)])
def test_fault_is_found(code: str, level: str, changes: list[tuple[str, str]], tmp_path: Path) -> None:
    result = judged(tmp_path, changes)
    assert (code, level) in {(finding.code, finding.level) for finding in result.findings}
    assert (result.verdict == "withheld") == any(finding.level == "stop" for finding in result.findings)


RECORDED = [
    (
        f"blocks = [{{ {BLOCK} }}]",
        'record = "work.csv"\nchannel = "y"\nsample_rate = "50 Hz"\nunit = "mm"\nrepeats = 3',
    )
]


def record(samples: np.ndarray) -> str:
    return "y\n" + "\n".join(f"{value:.4f}" for value in samples) + "\n"


def test_lift_off_in_few_samples_only_warns(tmp_path: Path) -> None:
    motion = 12 + 7 * np.sin(np.arange(1000) / 5.0)
    motion[500] = -0.5
    result = judged(tmp_path, RECORDED, record(motion))
    found = {finding.code: finding for finding in result.findings}
    assert found["lift-off"].level == "warn"
    assert "once, 1 of 1000 samples, 0.02 s" in found["lift-off"].message


def test_one_cycle_that_rules_is_noticed_in_a_record_and_not_in_a_steady_one(tmp_path: Path) -> None:
    motion = 12 + 3 * np.sin(np.arange(1000) / 5.0)
    assert "one-cycle-rules" not in {f.code for f in judged(tmp_path, RECORDED, record(motion)).findings}
    motion[500], motion[510] = 26.0, 0.5
    assert "one-cycle-rules" in {f.code for f in judged(tmp_path, RECORDED, record(motion)).findings}


def test_gap_withholds_until_the_case_says_split(tmp_path: Path) -> None:
    motion = 12 + 3 * np.sin(np.arange(100) / 5.0)
    text = record(motion).replace(f"{motion[50]:.4f}", "nan")
    result = judged(tmp_path, RECORDED, text)
    assert result.verdict == "withheld" and [f.code for f in result.findings if f.level == "stop"] == ["gap"]
    split = [(RECORDED[0][0], RECORDED[0][1] + '\ngaps = "split"')]
    assert judged(tmp_path, split, text).verdict == "meets"


def test_mean_past_the_intercept_is_a_static_failure(tmp_path: Path) -> None:
    # Ssu = 0.67 * 900 MPa = 603 MPa; at 28 to 30.9 mm the mean stress is about 690 MPa.
    changes = [
        ("total_coils", 'tensile_strength = "900 MPa"\ntotal_coils'),
        (BLOCK, 'low = "28 mm", high = "30.9 mm", cycles = 100'),
    ]
    result = judged(tmp_path, changes)
    assert "mean-past-intercept" in {finding.code for finding in result.findings}
    assert result.judgement is not None and result.judgement.life_passes == 0.0


def test_incoherent_strength_withholds_the_chosen_criterion_and_only_marks_the_others(tmp_path: Path) -> None:
    # Peened at Sut = 1300 MPa: Ssm 534 MPa is near Ssy = 0.45 Sut = 585 MPa, so that ASME-elliptic's Sse, 970 MPa,
    # is above 0.9 Ssu = 784 MPa; Gerber's, 636 MPa, is not.
    weak = ("total_coils", 'tensile_strength = "1300 MPa"\nshot_peened = true\ntotal_coils')
    others = ('"55 mm"', '"40 mm"'), ('"20 mm"', '"10 mm"')
    result = judged(tmp_path, [weak, *others, ('"gerber"', '"asme-elliptic"')])
    assert "strength-incoherent" in {f.code for f in result.findings if f.level == "stop"}
    result = judged(tmp_path, [weak, *others])
    assert result.judgement is not None
    withheld = {(row.criterion, row.endurance) for row in result.judgement.band if row.withheld}
    assert ("asme-elliptic", "zimmerli") in withheld and ("gerber", "zimmerli") not in withheld


def test_guided_spring_is_only_noted_to_buckle(tmp_path: Path) -> None:
    changes = [
        ("total_coils = 12", "guided = true\ntotal_coils = 40"), ('"55 mm"', '"180 mm"'), ('"20 mm"', '"60 mm"'),
    ]  # fmt: skip
    assert ("buckles", "note") in {(f.code, f.level) for f in judged(tmp_path, changes).findings}


def test_baked_plating_is_not_a_finding(tmp_path: Path) -> None:
    changes = [("total_coils", 'finish = "plated"\nbaked = true\ntotal_coils')]
    assert {finding.code for finding in judged(tmp_path, changes).findings} == ALWAYS


def test_reaching_solid_or_the_seat_exactly_is_not_passing_it(tmp_path: Path) -> None:
    # ys = 55 - 12 x 2 = 31 mm; the travel record returns to its free length through 5 - 5 mm.
    codes = {finding.code for finding in judged(tmp_path, [('"20 mm"', '"31 mm"'), ('"5 mm"', '"0 mm"')]).findings}
    assert "past-solid" not in codes and "lift-off" not in codes and "near-solid" in codes


def test_waiver_lifts_a_stop_by_name_and_reason(tmp_path: Path) -> None:
    waiver = '[[waive]]\nfinding = "past-solid"\nby = "R. Viewer"\nreason = "stop pad closes the stroke"\n[judge]'
    result = judged(tmp_path, [('"20 mm"', '"32 mm"'), ("[judge]", waiver)])
    past = next(finding for finding in result.findings if finding.code == "past-solid")
    assert past.waived_by == "R. Viewer" and past.reason == "stop pad closes the stroke"
    assert result.verdict in {"meets", "falls short"}


def test_waiver_does_not_lift_what_leaves_nothing_to_judge(tmp_path: Path) -> None:
    waiver = '[[waive]]\nfinding = "impossible-geometry"\nby = "R. Viewer"\nreason = "none"\n[judge]'
    assert judged(tmp_path, [('"16 mm"', '"1.5 mm"'), ("[judge]", waiver)]).verdict == "withheld"


def test_a_deflection_longer_than_the_spring_cannot_be_waived(tmp_path: Path) -> None:
    waiver = '[[waive]]\nfinding = "past-solid"\nby = "R. Viewer"\nreason = "bump stop"\n[judge]'
    result = judged(tmp_path, [('"20 mm"', '"56 mm"'), ("[judge]", waiver)])
    assert result.verdict == "withheld"
    assert "impossible-geometry" in {finding.code for finding in result.findings}


@pytest.mark.parametrize(("modulus", "found"), [("80 GPa", False), ("8 GPa", True), ("800 GPa", False)])
def test_a_shear_modulus_of_another_unit(modulus: str, found: bool, tmp_path: Path) -> None:
    if modulus == "800 GPa":  # past Young's modulus: no spring at all
        with pytest.raises(InputError, match="shear_modulus"):
            judged(tmp_path, [("total_coils", f'shear_modulus = "{modulus}"\ntotal_coils')])
        return
    result = judged(tmp_path, [("total_coils", f'shear_modulus = "{modulus}"\ntotal_coils')])
    assert ("unit-mismatch" in {finding.code for finding in result.findings}) == found


def test_a_limit_set_in_the_case_is_used(tmp_path: Path) -> None:
    result = judged(tmp_path, [('"20 mm"', '"28 mm"'), ("[judge]", "[limits]\nclash_allowance = 0.05\n[judge]")])
    assert "near-solid" not in {finding.code for finding in result.findings}


def test_every_finding_of_the_catalogue_has_a_test() -> None:
    text = "".join(file.read_text(encoding="utf-8") for file in sorted(Path(__file__).parent.glob("test_*.py")))
    untested = {code for code in CATALOGUE if f'"{code}"' not in text}
    assert not untested
