"""Sizing finds the best of its grid, says why near misses fail, and gives the greatest stroke."""

from __future__ import annotations

import json
from itertools import product
from pathlib import Path

import numpy as np
import pytest
from casefile import write_case
from test_findings import QUIET

from springlife.cli import main
from springlife.errors import InputError
from springlife.life.assess import assess
from springlife.life.case import load_case
from springlife.life.size import Sizing, size, wire_sizes

ROOT = Path(__file__).parent.parent
PUMP = ROOT / "loadcases" / "dosing-pump" / "case.toml"
GRID = (
    '[size]\nsizes = ["1.8 mm", "2.0 mm", "2.25 mm"]\ndiameter_step = "2 mm"\ncoil_step = 0.5\nrate_tolerance = 0.08\n'
)
LIMITS = 'largest_outer_diameter = "22 mm"\nleast_inner_diameter = "10 mm"\n'


def sized(folder: Path, table: str = GRID, case: str = QUIET) -> Sizing:
    return size(load_case(write_case(folder, case + table, None)))


def brute_force(folder: Path, rate: float, goal: str) -> tuple[float, float, float] | None:
    """Judge every spring of the grid on its own, by its findings; return (d, D, coils) of the best, mm."""
    good = []
    for d, D, half_coils in product((1.8, 2.0, 2.25), range(10, 21, 2), range(8, 60)):
        coils = half_coils / 2
        if not D - d >= 10 or not D + d <= 22 or not 4 <= D / d <= 12 or coils - 2 < 3:
            continue
        free = coils * d + 20 * 1.15 * (1 + 1e-9)
        case = load_case(write_case(folder, QUIET, None)).varied(
            "one", {"wire_diameter": f"{d!r} mm", "mean_diameter": f"{D} mm", "total_coils": coils,
                    "free_length": f"{free!r} mm"}, {}, "",
        )  # fmt: skip
        spring = case.build_spring()
        if abs(spring.rate / rate - 1) > 0.08:
            continue
        result = assess(case)
        codes = {finding.code for finding in result.findings} - {"assumed-curve", "not-covered"}
        if result.verdict == "meets" and not codes:
            assert result.judgement is not None
            life = result.judgement.life_passes
            price = spring.mass if goal == "mass" else -(np.inf if life is None else life)
            good.append((price, (d, float(D), coils)))
    return min(good)[1] if good else None


@pytest.mark.parametrize("goal", ["mass", "life"])
def test_the_best_is_that_of_brute_force(goal: str, tmp_path: Path) -> None:
    result = sized(tmp_path, GRID + LIMITS + f'goal = "{goal}"\n')
    rate = result.assessment.judgement.spring.rate  # type: ignore[union-attr]
    best = result.found[0].spring
    ours = (best.wire_diameter * 1e3, best.mean_diameter * 1e3, best.total_coils)
    assert ours == pytest.approx(brute_force(tmp_path, rate, goal))


def test_what_is_found_meets_everything_when_judged_on_its_own(tmp_path: Path) -> None:
    for candidate in sized(tmp_path).found[:3]:
        s = candidate.spring
        case = load_case(write_case(tmp_path, QUIET, None)).varied(
            "one", {"wire_diameter": f"{s.wire_diameter!r} m", "mean_diameter": f"{s.mean_diameter!r} m",
                    "total_coils": s.total_coils, "free_length": f"{s.free_length!r} m"}, {}, "",
        )  # fmt: skip
        result = assess(case)
        assert result.verdict == "meets" and result.judgement is not None
        assert result.judgement.damage_at_target == pytest.approx(candidate.damage, rel=1e-9)
        assert {finding.code for finding in result.findings} == {"assumed-curve", "not-covered"}


def test_goals_order_the_results(tmp_path: Path) -> None:
    masses = [one.spring.mass for one in sized(tmp_path).found]
    assert masses == sorted(masses)
    costs = [one.cost for one in sized(tmp_path, GRID + 'goal = "cost"\ngrades = ["A228", "A401"]\n').found]
    assert costs == sorted(costs)
    lives = [np.inf if one.passes is None else one.passes for one in sized(tmp_path, GRID + 'goal = "life"\n').found]
    assert lives == sorted(lives, reverse=True)


def test_near_misses_fail_one_check_and_would_have_been_better(tmp_path: Path) -> None:
    result = sized(tmp_path)
    assert result.misses
    for miss in result.misses:
        assert len(miss.failed) == 1 and 0 <= min(miss.failed.values()) < 1
        assert miss.spring.mass < result.found[0].spring.mass


@pytest.mark.parametrize(
    ("limit", "check"),
    [
        ('greatest_solid_length = "5 mm"', "solid length"),
        ('greatest_free_length = "30 mm"', "free length"),
        ('greatest_mass = "2 g"', "mass"),
        ('working_frequency = "200 Hz"', "surge"),
    ],
)
def test_limits_that_nothing_meets_are_named(limit: str, check: str, tmp_path: Path) -> None:
    result = sized(tmp_path, GRID + limit + "\n")
    assert not result.found
    assert check in {name for miss in result.misses for name in miss.failed} or not result.misses


def test_force_held_scales_the_deflections(tmp_path: Path) -> None:
    stiff = GRID + 'hold = "force"\nrate = "6 N/mm"\n'
    result = sized(tmp_path, stiff)
    drawn = result.assessment.judgement.spring  # type: ignore[union-attr]
    one = result.found[0].spring
    room = one.free_length - one.solid_length
    assert room == pytest.approx(0.020 * drawn.rate / one.rate * 1.15, rel=1e-6)


def test_greatest_stroke_just_meets_the_target(tmp_path: Path) -> None:
    result = sized(tmp_path, case=QUIET.replace("100 h", "40000 h"))
    factor = result.stroke_factor
    assert factor is not None
    high = 5 + 15 * factor
    at = assess(load_case(write_case(tmp_path, QUIET.replace("100 h", "40000 h"), None)).varied("as is", {}, {}, ""))
    moved = QUIET.replace("100 h", "40000 h").replace('"20 mm"', f'"{high!r} mm"')
    judged = assess(write_case(tmp_path, moved, None)).judgement
    assert at.judgement is not None and judged is not None
    if result.stroke_governed_by == "fatigue":
        assert judged.damage_at_target == pytest.approx(1.0, rel=1e-6)
    else:
        assert judged.damage_at_target < 1.0


def test_series_rise() -> None:
    for series in ("metric", "inch"):
        sizes = wire_sizes(series)
        assert sizes == sorted(set(sizes)) and sizes[0] > 1e-4 and sizes[-1] < 0.02


@pytest.mark.parametrize(
    ("table", "words"),
    [
        ('[size]\ngoal = "weight"\n', "size.goal"),
        ('[size]\nsizes = ["9 mm"]\n', "leaves no spring"),
        ('[size]\nlargest_outer_diameter = "0.1 mm"\n', "leaves no spring"),
        ('[size]\ngrades = ["A999"]\n', "A999"),
        ('[size]\nrate = "3 mm"\n', "size.rate"),
        ("[size]\nfoo = 1\n", "size.foo"),
    ],
)
def test_what_cannot_be_searched(table: str, words: str, tmp_path: Path) -> None:
    with pytest.raises(InputError, match=words):
        sized(tmp_path, table)


def test_command(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    figure = tmp_path / "size.svg"
    assert main(["size", str(PUMP), "--figure", str(figure)]) == 0
    assert "MEET EVERYTHING" in capsys.readouterr().out and figure.stat().st_size > 10_000
    assert main(["size", str(PUMP), "--json"]) == 0
    data = json.loads(capsys.readouterr().out)
    assert data["found"][0]["mass_kg"] <= data["found"][-1]["mass_kg"] and data["tried"] > 1000
