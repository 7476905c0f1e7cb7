"""The proposed test does the duty's damage; sample sizes are the published ones; refusals are named."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
from casefile import write_case
from test_findings import QUIET

from springlife.cli import main
from springlife.errors import InputError
from springlife.life.assess import assess
from springlife.life.case import load_case
from springlife.life.rig import rig, success_run

ROOT = Path(__file__).parent.parent
PUMP = ROOT / "loadcases" / "dosing-pump" / "case.toml"
SEAT = ROOT / "loadcases" / "forwarder-seat" / "case.toml"


@pytest.mark.parametrize(
    ("reliability", "confidence", "springs"),
    # Success run n = ceil(ln(1 - C)/ln R): derived, and in standard tables of zero-failure demonstration.
    [(0.90, 0.90, 22), (0.90, 0.95, 29), (0.90, 0.99, 44), (0.95, 0.90, 45), (0.95, 0.95, 59), (0.95, 0.99, 90),
     (0.99, 0.90, 230), (0.99, 0.95, 299), (0.99, 0.99, 459)],
)  # fmt: skip
def test_success_run(reliability: float, confidence: float, springs: int) -> None:
    assert success_run(reliability, confidence) == springs


def test_success_run_with_a_life_factor() -> None:
    """Life factor 2 and Weibull slope 2 at R = C = 0.90: 6 springs (derived)."""
    assert success_run(0.9, 0.9, life_factor=2.0, weibull_slope=2.0) == 6
    assert success_run(0.9, 0.9, life_factor=1e200, weibull_slope=9.0) == 1


def as_blocks(low: float, high: float, cycles: int) -> str:
    """The quiet case's spring under the proposed test, one pass a test."""
    text = QUIET.replace('one_pass = "1 h"', 'one_pass = "1 test"').replace('"100 h"', '"1 test"')
    return text.replace(
        'low = "5 mm", high = "20 mm", cycles = 100', f'low = "{low!r} m", high = "{high!r} m", cycles = {cycles}'
    )


@pytest.mark.parametrize("limits", [(None, None), (0.002, 0.024), (0.004, 0.019)])
def test_assessing_the_proposed_test_gives_the_damage_back(
    limits: tuple[float | None, float | None], tmp_path: Path
) -> None:
    duty = QUIET.replace("cycles = 100 }", 'cycles = 900 }, { low = "2 mm", high = "24 mm", cycles = 90 }')
    duty = duty.replace('"100 h"', '"90000 h"')
    test = rig(load_case(write_case(tmp_path, duty, None)), low=limits[0], high=limits[1])
    assert test.exact_cycles > 1e6  # rounding to whole cycles stays under 1e-6
    proposed = assess(write_case(tmp_path, as_blocks(test.low, test.high, test.cycles), None)).judgement
    assert proposed is not None
    assert proposed.damage_at_target == pytest.approx(test.judgement.damage_at_target, rel=1e-6)


def test_of_a_constant_amplitude_duty_the_test_is_the_duty(tmp_path: Path) -> None:
    test = rig(load_case(write_case(tmp_path, QUIET, None)))
    assert (test.low, test.high) == pytest.approx((0.005, 0.020))
    assert test.cycles == 100 * 100  # 100 cycles a pass, 100 passes


def test_spread_has_the_chosen_model_at_the_proposed_cycles() -> None:
    test = rig(PUMP)
    ours = test.assessment.case.judge
    chosen = [
        n
        for row, n in test.spread
        if (row.criterion, row.endurance, row.miner) == (ours.criterion, ours.endurance, ours.miner)
    ]
    assert chosen == [pytest.approx(test.exact_cycles)]


@pytest.mark.parametrize(
    ("options", "finding"),
    [
        ({"high": 0.033}, "past-solid"),
        ({"low": -0.001}, "lift-off"),
        ({"frequency": 60.0}, "near-surge"),
    ],
)
def test_refusals(options: dict[str, float], finding: str, tmp_path: Path) -> None:
    test = rig(load_case(write_case(tmp_path, QUIET, None)), **options)
    assert finding in {f.code for f in test.findings if f.level == "stop"} and test.stopped


def test_refused_when_it_would_yield_or_end_at_once(tmp_path: Path) -> None:
    soft = QUIET.replace("total_coils", 'tensile_strength = "1300 MPa"\ntotal_coils')
    codes = {finding.code for finding in rig(load_case(write_case(tmp_path, soft, None)), low=0.0, high=0.030).findings}
    assert {"yields", "below-1e3"} <= codes


def test_a_duty_that_is_withheld_is_no_measure(tmp_path: Path) -> None:
    past = QUIET.replace("cycles = 100 }", 'cycles = 100 }, { low = "5 mm", high = "32 mm", cycles = 1 }')
    test = rig(load_case(write_case(tmp_path, past, None)), low=0.005, high=0.020)
    assert [finding.message[:11] for finding in test.findings if finding.code == "past-solid"] == ["in the duty"]
    assert test.stopped
    waived = past + '[[waive]]\nfinding = "past-solid"\nby = "T"\nreason = "R"\n'
    waived += '[[waive]]\nfinding = "yields"\nby = "T"\nreason = "R"\n'
    assert not rig(load_case(write_case(tmp_path, waived, None)), low=0.005, high=0.020).stopped


def test_a_test_longer_than_the_data_is_marked(tmp_path: Path) -> None:
    test = rig(load_case(write_case(tmp_path, QUIET.replace('"100 h"', '"1000000 h"'), None)))
    assert "endurance-scope" in {finding.code for finding in test.findings}


@pytest.mark.parametrize(
    ("options", "words"),
    [
        ({"low": 0.02, "high": 0.01}, "low must be below high"),
        ({"frequency": 0.0}, "rig frequency"),
        ({"reliability": 1.0}, "reliability is 1"),
        ({"confidence": 0.0}, "confidence is 0"),
        ({"life_factor": -1.0}, "life factor is -1"),
        ({"life_factor": 1e-200, "weibull_slope": 9.0}, "more than 1e"),
        ({"reliability": 0.9999999999999}, "more than 1e"),
        ({"low": 0.040, "high": 0.050}, "some damage"),
    ],
)
def test_what_cannot_be_a_test(options: dict[str, float], words: str) -> None:
    with pytest.raises(InputError, match=words):
        rig(PUMP, **options)


def test_no_test_equals_a_duty_without_damage(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="no test can equal it"):
        rig(load_case(write_case(tmp_path, QUIET.replace("[judge]", '[judge]\nminer = "original"'), None)))


def test_command(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    figure = tmp_path / "rig.png"
    words = ["rig", str(PUMP), "--low", "0.2 in", "--high", "0.95 in", "--frequency", "8 Hz", "--life-factor", "1.5"]
    assert main([*words, "--figure", str(figure)]) == 0
    out = " ".join(capsys.readouterr().out.split())
    assert "0.2 in to 0.95 in" in out and "8 Hz" in out and "90 % reliability at 90 % confidence" in out
    assert figure.stat().st_size > 10_000
    assert main([*words, "--json"]) == 0
    data = json.loads(capsys.readouterr().out)
    assert data["cycles"] == round(1.5 * data["equal_damage_cycles"])
    assert main(["rig", str(SEAT), "--frequency", "50 Hz"]) == 3
