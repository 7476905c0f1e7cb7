"""Own tests, from the table through the curve file into a judged case."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
from casefile import write_case
from test_findings import QUIET

from springlife.cli import main
from springlife.life.assess import assess

TESTS = Path(__file__).parent.parent / "loadcases" / "own-tests" / "tests.csv"
FIT = ["fit", str(TESTS), "--grade", "A232", "--wire", "6.5 mm"]


def test_curve_file_of_own_tests_judges_a_case(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """The life comes from the design curve: twice the stress margin in amplitude shows its own slope."""
    assert main([*FIT, "-o", str(tmp_path / "curve.toml"), "--figure", str(tmp_path / "fit.png")]) == 0
    assert "90 % at 90 % confidence" in capsys.readouterr().out
    assert (tmp_path / "fit.png").read_bytes().startswith(b"\x89PNG")
    case = QUIET.replace('criterion = "gerber"', 'criterion = "gerber"\nendurance = "curve.toml"')
    result = assess(write_case(tmp_path, case, None))
    assert result.judgement is not None
    assert "90 % of springs at 90 % confidence" in result.reliability
    assert [name for name, _ in result.inputs] == ["case.toml", "curve.toml"]
    assert "assumed-curve" not in {finding.code for finding in result.findings}
    assert {row.criterion for row in result.judgement.band if row.endurance == "curve.toml" and not row.withheld} == {
        "gerber"
    }


def test_json_holds_lines_comparisons_and_the_design_curve(capsys: pytest.CaptureFixture[str]) -> None:
    assert main([*FIT, "--json"]) == 0
    data = json.loads(capsys.readouterr().out)
    assert {line["group"] for line in data["lines"]} == {"peened", "unpeened"}
    assert all(row["cycles"] > 0 for row in data["design_curve"]["peened"])
    # The made-up truth behind the demo table: slopes 11 and 8.5 lie inside the intervals.
    truth = {"peened": 11.0, "unpeened": 8.5}
    for line in data["lines"]:
        low, high = line["slope_interval"]
        assert low < truth[line["group"]] < high


@pytest.mark.parametrize(
    ("words", "message"),
    [
        (["--grade", "A999"], "A999"),
        (["--wire", "6.5"], "no unit"),
        (["--wire", "60 mm"], "60 mm"),
        (["--criterion", "gerbr"], "did you mean 'gerber'"),
        (["--reliability", "1.5"], "reliability is 1.5"),
        (["--tensile", "1500 mm"], "not a stress"),
        (["--figure", "fit.xyz"], ".xyz"),
        (["-o", "/nowhere/curve.toml"], "/nowhere"),
    ],
)
def test_what_fit_refuses(words: list[str], message: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert main([*FIT, *words]) == 2
    err = capsys.readouterr().err
    assert message in err and len(err.strip().splitlines()) == 1


def test_nothing_is_written_over_unasked(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    curve = tmp_path / "curve.toml"
    curve.write_text("mine")
    assert main([*FIT, "-o", str(curve)]) == 2
    assert "--force" in capsys.readouterr().err and curve.read_text() == "mine"
    assert main([*FIT, "-o", str(curve), "--force"]) == 0
    assert curve.read_text() != "mine"
    assert [path.name for path in tmp_path.iterdir()] == ["curve.toml"]
