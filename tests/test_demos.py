"""The demo cases tell their stories, and their records are what their scripts make."""

from __future__ import annotations

import runpy
from pathlib import Path

import pytest

from springlife.cli import main

CASES = Path(__file__).parent.parent / "loadcases"


def test_latch_passes_by_static_stress_and_not_with_its_own_mass(capsys: pytest.CaptureFixture[str]) -> None:
    case = str(CASES / "latch-release" / "case.toml")
    assert main(["assess", case]) == 0
    assert "impact" in capsys.readouterr().out
    assert main(["assess", case, "--surge"]) == 1
    assert "with it: FALLS SHORT" in capsys.readouterr().out
    assert main(["surge", case]) == 1


def test_surge_figures_of_a_cam_and_of_coils(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    for name in ("dosing-pump", "latch-release"):
        figure = tmp_path / f"{name}.svg"
        assert main(["surge", str(CASES / name / "case.toml"), "--figure", str(figure)]) in {0, 1}
        assert figure.stat().st_size > 10_000
    assert "plunger cam" in capsys.readouterr().out


def test_seat_meets_its_target_peened_and_falls_short_unpeened(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["compare", str(CASES / "forwarder-seat" / "case.toml")]) == 0
    verdicts = next(line for line in capsys.readouterr().out.splitlines() if line.startswith("verdict"))
    assert verdicts.split()[1:] == ["meets", "falls", "short"]


@pytest.mark.parametrize("script", sorted(CASES.glob("*/make_*.py")), ids=lambda path: path.parent.name)
def test_script_makes_the_records_that_are_kept(script: Path) -> None:
    """Rewrites the files beside the script: to a digit of the last place they must stay as they are."""
    before = {path: path.read_bytes() for path in script.parent.glob("*.csv")}
    assert before
    try:
        runpy.run_path(str(script), run_name="__main__")
        after = {path: path.read_bytes() for path in script.parent.glob("*.csv")}
    finally:
        for path, data in before.items():
            path.write_bytes(data)
    assert after.keys() == before.keys()
    same = sum(
        one == other for path in before for one, other in zip(before[path].split(), after[path].split(), strict=True)
    )
    assert same >= 0.999 * sum(len(data.split()) for data in before.values())
