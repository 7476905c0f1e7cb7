"""Own tests: run-outs counted as what they are, intervals that cover, groups told apart, refusals."""

from __future__ import annotations

import json
from importlib.resources import files
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray

from springlife.errors import CriterionError, FileError, InputError
from springlife.strength.criteria import criterion
from springlife.strength.curve import endurance_curve, read_curve
from springlife.strength.fit import Fit, fit_tests, write_curve
from springlife.strength.likelihood import Censored, coefficient, quantile, scatter
from springlife.strength.own_tests import read_tests

MPa = 1e6
Floats = NDArray[np.float64]
LEVELS = np.array([400.0, 450.0, 500.0, 560.0, 630.0]) * MPa
# The truth of the simulated tests: log10 N = 5.5 - 11 log10(S/500 MPa), scatter 0.2.
MIDDLE, SLOPE, SCATTER = 5.5, 11.0, 0.2
SINES: dict[str, Any] = {"criterion": criterion("sines"), "Ssu": 1500 * MPa, "Ssy": 1000 * MPa}


def simulated(
    rng: np.random.Generator, springs_a_level: int, stop: float, shift: float = 0.0
) -> tuple[Floats, Floats, NDArray[np.bool_]]:
    """Amplitudes, cycles and failed of tests stopped at ``stop`` cycles."""
    S = np.repeat(LEVELS, springs_a_level)
    y = MIDDLE + shift - SLOPE * np.log10(S / (500 * MPa)) + SCATTER * rng.standard_normal(len(S))
    failed = y < np.log10(stop)
    return S, 10 ** np.minimum(y, np.log10(stop)), failed


def fitted(S: Floats, N: Floats, failed: Any, groups: list[str] | None = None, **options: Any) -> Fit:
    return fit_tests(S, np.zeros_like(S), N, failed, groups, **(SINES | options))


def test_known_parameters_come_back_from_tests_with_run_outs() -> None:
    S, N, failed = simulated(np.random.default_rng(11), 400, stop=1e6)
    assert 0.25 < 1 - failed.mean() < 0.35  # three in ten are run-outs
    (line,) = fitted(S, N, failed).lines
    # Four standard errors of 2,000 springs.
    assert line.slope == pytest.approx(SLOPE, abs=0.45)
    assert line.s == pytest.approx(SCATTER, abs=0.02)
    assert np.log10(line.life(500 * MPa)) == pytest.approx(MIDDLE, abs=0.02)
    assert np.log10(line.life(500 * MPa, 0.9)) == pytest.approx(MIDDLE - 1.2816 * SCATTER, abs=0.04)


def test_dropping_run_outs_or_failing_them_is_another_answer() -> None:
    # Both habits shorten the long lives, so the line falls less and the truth leaves the interval.
    S, N, failed = simulated(np.random.default_rng(11), 400, stop=1e6)
    kept, dropped, as_failures = (
        fitted(*tests).lines[0].slope_interval(0.99)
        for tests in ((S, N, failed), (S[failed], N[failed], failed[failed]), (S, N, np.ones_like(failed)))
    )
    assert kept[0] < SLOPE < kept[1]
    assert dropped[1] < SLOPE and as_failures[1] < SLOPE


def test_an_independent_censored_fit_agrees() -> None:
    # scipy.stats on censored data, normal in log10 N: location and scale of one stress level.
    from scipy import stats

    rng = np.random.default_rng(5)
    y = 5 + 0.3 * rng.standard_normal(40)
    failed = y < 5.2
    y = np.minimum(y, 5.2)
    ours = Censored(np.ones((40, 1)), y - 5, failed)
    location, scale = stats.norm.fit(stats.CensoredData(uncensored=y[failed], right=y[~failed]))
    assert ours.beta[0] + 5 == pytest.approx(location, abs=1e-4)
    assert ours.sigma == pytest.approx(scale, abs=1e-4)


def test_without_run_outs_the_line_is_least_squares() -> None:
    S, N, _ = simulated(np.random.default_rng(2), 4, stop=1e30)
    (line,) = fitted(S, N, np.ones(20, bool)).lines
    B, A = np.polyfit(np.log10(S), np.log10(N), 1)
    residuals = np.log10(N) - A - B * np.log10(S)
    assert pytest.approx(B, rel=1e-8) == line.B
    assert pytest.approx(A, rel=1e-8) == line.A
    assert line.s == pytest.approx(np.sqrt(np.mean(residuals**2)), rel=1e-6)


def test_intervals_of_complete_data_are_the_likelihoods_own() -> None:
    # Derived: for a normal mean and scatter unknown, the profile of the mean is n/2 ln(1 + t^2/(n - 1)), so the
    # interval is mean +- s sqrt(exp(z^2/n) - 1).
    y = np.array([0.1, -0.4, 0.3, 0.5, -0.2, 0.0, -0.3])
    observed = Censored(np.ones((7, 1)), y, np.ones(7, bool))
    half = np.std(y) * np.sqrt(np.exp(1.6448536**2 / 7) - 1)
    assert observed.interval(coefficient(0, 1), 0.9) == pytest.approx((y.mean() - half, y.mean() + half), abs=1e-4)
    assert observed.interval(quantile((1.0,), 0.5), 0.9) == pytest.approx((y.mean() - half, y.mean() + half), abs=1e-4)


def test_an_interval_far_out_still_ends() -> None:
    # The same derivation at a confidence of 1 - 1e-6 (z = 4.8916) with four results: 20 scatters wide.
    y = np.array([0.1, -0.4, 0.3, 0.2])
    half = np.std(y) * np.sqrt(np.exp(4.8916385**2 / 4) - 1)
    low, high = Censored(np.ones((4, 1)), y, np.ones(4, bool)).interval(coefficient(0, 1), 1 - 1e-6)
    assert (low, high) == pytest.approx((y.mean() - half, y.mean() + half), rel=1e-3)


def test_results_without_scatter_have_no_likeliest_scatter() -> None:
    with pytest.raises(InputError, match="the likelihood has no maximum"):
        _ = Censored(np.ones((4, 1)), np.zeros(4), np.ones(4, bool)).theta


def test_the_profile_at_the_ends_of_an_interval_has_lost_what_the_confidence_asks() -> None:
    S, N, failed = simulated(np.random.default_rng(8), 5, stop=1e6)
    observed = fitted(S, N, failed).lines[0].observed
    for of in (coefficient(1, 2), quantile((1.0, 0.03), 0.1), scatter(2)):
        for end in observed.interval(of, 0.9):
            # Half of the 0.90 quantile of chi-square with one degree of freedom, 2.7055 (standard tables).
            assert observed.log_likelihood - observed.profile(of, end) == pytest.approx(2.7055 / 2, abs=1e-3)


def test_intervals_cover_the_truth_as_often_as_they_say() -> None:
    rng = np.random.default_rng(90)
    truth = np.array([SLOPE, 10 ** (MIDDLE - 1.2815516 * SCATTER)])
    hits = np.zeros(2)
    rounds = 500
    for _ in range(rounds):
        S, N, failed = simulated(rng, 6, stop=1e6)
        (line,) = fitted(S, N, failed).lines
        early = line.estimate(500 * MPa, 0.9, 0.9)
        for i, (low, high) in enumerate((line.slope_interval(0.9), (early.low, early.high))):
            hits[i] += low <= truth[i] <= high
    assert np.all((hits / rounds > 0.85) & (hits / rounds < 0.95)), hits / rounds


def test_design_lives_hold_their_confidence() -> None:
    # 0.90 +- 0.04 is three standard errors of 500; with run-outs the bound may be a little cautious.
    rng = np.random.default_rng(91)
    for stop, most in ((1e30, 0.94), (1e6, 0.97)):
        truth = 10 ** (MIDDLE - SLOPE * np.log10(450 / 500) - 1.2815516 * SCATTER)
        held = [fitted(*simulated(rng, 4, stop)).lines[0].design_life(450 * MPa, 0.9, 0.9) <= truth for _ in range(500)]
        assert 0.86 < np.mean(held) < most


def test_a_design_life_is_shorter_the_more_is_asked() -> None:
    S, N, failed = simulated(np.random.default_rng(8), 5, stop=1e6)
    (line,) = fitted(S, N, failed).lines
    lives = [line.design_life(450 * MPa, R, C) for R, C in ((0.9, 0.9), (0.9, 0.95), (0.99, 0.95))]
    assert float(line.life(450 * MPa, 0.9)) > lives[0] > lives[1] > lives[2]
    assert "approximate" in line.design_method
    assert "exact" in fitted(S[failed], N[failed], failed[failed]).lines[0].design_method


def test_more_springs_narrow_the_interval_as_one_over_the_root() -> None:
    few, many = (
        fitted(*simulated(np.random.default_rng(4), each, stop=1e6)).lines[0].slope_interval() for each in (10, 160)
    )
    assert (few[1] - few[0]) / (many[1] - many[0]) == pytest.approx(4, rel=0.35)


def test_scaling_stress_and_life_moves_the_line_and_nothing_else() -> None:
    S, N, failed = simulated(np.random.default_rng(8), 5, stop=1e6)
    here, there = fitted(S, N, failed).lines[0], fitted(3 * S, 10 * N, failed).lines[0]
    assert there.slope == pytest.approx(here.slope, rel=1e-6)
    assert there.s == pytest.approx(here.s, rel=1e-6)
    assert there.life(3 * 500 * MPa) == pytest.approx(10 * here.life(500 * MPa), rel=1e-6)
    assert there.design_life(1500 * MPa, 0.9, 0.9) == pytest.approx(
        10 * here.design_life(500 * MPa, 0.9, 0.9), rel=1e-6
    )


def test_a_mean_stress_enters_by_the_criterion() -> None:
    # Goodman with tau_m = Ssu/2 doubles every amplitude.
    S, N, failed = simulated(np.random.default_rng(8), 5, stop=1e6)
    fit = fit_tests(
        S / 2, np.full_like(S, 750 * MPa), N, failed,
        criterion=criterion("goodman"), Ssu=1500 * MPa, Ssy=1000 * MPa,
    )  # fmt: skip
    assert pytest.approx(fitted(S, N, failed).lines[0].A, rel=1e-9) == fit.lines[0].A
    assert fit.criterion == "goodman"


@pytest.mark.parametrize(
    ("amplitude", "reliability", "said"),
    [
        (399 * MPa, 0.5, "399 MPa is below the least amplitude tested, 400 MPa"),
        (631 * MPa, 0.5, "631 MPa is above the greatest amplitude tested, 630 MPa"),
        (400 * MPa, 0.5, "cycles are past the longest test, 1000000"),
        (500 * MPa, 0.5, None),
        (630 * MPa, 0.99, None),
    ],
)
def test_an_estimate_beyond_the_tested_range_says_so(amplitude: float, reliability: float, said: str | None) -> None:
    S, N, failed = simulated(np.random.default_rng(8), 5, stop=1e6)
    beyond = fitted(S, N, failed).lines[0].estimate(amplitude, reliability).beyond
    assert beyond is None if said is None else said in str(beyond)


def two_groups(shift: float, seed: int) -> Fit:
    rng = np.random.default_rng(seed)
    parts = [simulated(rng, 6, 1e6), simulated(rng, 6, 1e6, shift)]
    S, N, failed = (np.concatenate(columns) for columns in zip(*parts, strict=True))
    return fitted(S, N, failed, ["unpeened"] * 30 + ["peened"] * 30)


def test_groups_that_differ_in_life_are_told_apart_by_position_alone() -> None:
    fit = two_groups(shift=0.5, seed=21)  # 0.5 in log10 N is 2.5 times the scatter
    scatter_alike, slope_alike, one_line, all_alike = fit.comparisons
    assert one_line.p_value < 1e-6 and all_alike.p_value < 1e-6
    assert scatter_alike.p_value > 0.05 and slope_alike.p_value > 0.05
    assert [test.dof for test in fit.comparisons] == [1, 1, 1, 3]
    assert all_alike.statistic == pytest.approx(sum(test.statistic for test in fit.comparisons[:3]), abs=1e-6)
    assert [line.group for line in fit.lines] == ["unpeened", "peened"]


def test_equal_groups_are_called_different_as_rarely_as_the_p_value_says() -> None:
    called = [two_groups(shift=0.0, seed=seed).comparisons[3].p_value < 0.1 for seed in range(200)]
    # 0.10 +- 0.06 is three standard errors of 200, and the test is a little eager for 60 springs.
    assert 0.04 < np.mean(called) < 0.18


def with_limit(rng: np.random.Generator, limit: float) -> tuple[Floats, Floats, NDArray[np.bool_]]:
    S = np.repeat(np.array([420.0, 450.0, 480.0, 520.0, 560.0, 630.0]) * MPa, 8)
    y = 5.5 - 2 * np.log10((S - limit) / (100 * MPa)) + 0.15 * rng.standard_normal(len(S))
    return S, 10 ** np.minimum(y, 7.0), y < 7.0


def test_a_fatigue_limit_is_found_where_there_is_one() -> None:
    (line,) = fitted(*with_limit(np.random.default_rng(6), 400 * MPa)).lines
    limit = line.fatigue_limit()
    assert limit.p_value < 1e-3
    assert limit.low < 400 * MPa < limit.high < 420 * MPa
    assert limit.amplitude == pytest.approx(400 * MPa, rel=0.05)


def test_no_fatigue_limit_is_claimed_on_a_straight_line() -> None:
    S, N, failed = simulated(np.random.default_rng(8), 8, stop=1e6)
    limit = fitted(S, N, failed).lines[0].fatigue_limit()
    assert limit.p_value > 0.05
    assert limit.low == 0


def complete(S: list[float], N: list[float]) -> tuple[Floats, Floats, NDArray[np.bool_]]:
    return np.array(S) * MPa, np.array(N), np.ones(len(S), bool)


@pytest.mark.parametrize(
    ("tests", "said"),
    [
        ((np.array([4e8, 5e8]), np.array([1e7, 1e7]), np.zeros(2, bool)), "all 2 springs are run-outs"),
        (complete([500] * 5, [1e5, 2e5, 3e5, 4e5, 5e5]), "one stress level, 500 MPa"),
        (complete([400, 500, 600], [3e5, 1e5, 2e4]), "3 failures are too few.*at least 4"),
        (complete([400, 400, 500, 500], [1e5, 1e5, 1e4, 1e4]), "no scatter to estimate"),
        (complete([400, -500, 500, 600], [1e5] * 4), "test 2: stress amplitude is -5e\\+08"),
        (complete([400, 450, 500, 600], [1e5, 1e5, 0, 1e5]), "test 3: number of cycles is 0"),
        (complete([400, 450, 500, 600], [1e5, 1e5, np.nan, 1e5]), "test 3: number of cycles is nan"),
        ((np.array([4e8]), np.array([1e5, 1e6]), np.ones(2, bool)), r"lengths \[1, 2\]"),
    ],
)  # fmt: skip
def test_tests_that_determine_no_line_are_refused(tests: tuple[Floats, Floats, NDArray[np.bool_]], said: str) -> None:
    with pytest.raises(InputError, match=said):
        fitted(*tests)


def test_failures_at_one_level_are_refused_though_run_outs_are_at_another() -> None:
    S = np.array([400.0] * 4 + [500.0] * 5) * MPa
    failed = np.array([False] * 4 + [True] * 5)
    with pytest.raises(InputError, match="group 'peened': all failures are at one stress level, 500 MPa"):
        fitted(S, np.where(failed, np.geomspace(1e5, 2e5, 9), 1e7), failed, ["peened"] * 9)


def test_a_mean_past_the_intercept_is_refused_by_its_place() -> None:
    with pytest.raises(InputError, match="test 2: mean stress 1600 MPa has no value by goodman"):
        fit_tests(
            [4e8, 5e8], [1e8, 1.6e9], [1e5, 1e4], [True, True],
            criterion=criterion("goodman"), Ssu=1500 * MPa, Ssy=1000 * MPa,
        )  # fmt: skip


def test_few_springs_and_a_flat_line_are_noted() -> None:
    fit = fitted(*complete([400, 450, 500, 550, 600], [1e5, 2e5, 1.1e5, 2.5e5, 1.3e5]))
    few, flat = fit.notes
    assert "5 springs; ASTM E739 asks 12" in few
    assert "do not show that life falls" in flat
    S, N, failed = simulated(np.random.default_rng(8), 5, stop=1e6)
    assert fitted(S, N, failed).notes == ()


@pytest.mark.parametrize("share", [0.0, 1.0, 90.0])
def test_reliability_and_confidence_are_shares(share: float) -> None:
    S, N, failed = simulated(np.random.default_rng(8), 5, stop=1e6)
    (line,) = fitted(S, N, failed).lines
    for ask in (
        lambda: line.life(5e8, share),
        lambda: line.estimate(5e8, 0.9, share),
        lambda: line.design_life(5e8, share, 0.9),
        lambda: line.design_life(5e8, 0.9, share),
        lambda: line.slope_interval(share),
    ):
        with pytest.raises(InputError, match=f"is {share:g}; it must be between 0 and 1"):
            ask()


def test_the_result_is_plain_json() -> None:
    facts = json.loads(json.dumps(two_groups(0.5, 21).to_dict(), allow_nan=False))
    assert [line["group"] for line in facts["lines"]] == ["unpeened", "peened"]
    assert facts["lines"][0]["failures"] + facts["lines"][0]["run_outs"] == 30
    assert len(facts["comparisons"]) == 4


def test_a_curve_file_gives_back_the_design_lives(tmp_path: Path) -> None:
    fit = two_groups(0.5, 21)
    path = tmp_path / "fork.toml"
    write_curve(fit, path, title='the "fork" springs', source="own tests", reliability=0.9, confidence=0.9)
    wire: dict[str, Any] = {"family": None, "Sut": 2000 * MPa, "Ssu": 1340 * MPa, "Ssy": 1000 * MPa}
    for line in fit.lines:
        peened = line.group == "peened"
        curve = endurance_curve(path, criterion("sines"), shot_peened=peened, **wire)
        # At the ends of the tested range, to the six digits written; between points the curve is a chord.
        for amplitude, rel in ((400 * MPa, 2e-4), (630 * MPa, 2e-4), (510 * MPa, 0.02)):
            assert curve.cycles(amplitude) == pytest.approx(line.design_life(amplitude, 0.9, 0.9), rel=rel)
        assert (curve.valid_from, curve.valid_to) == pytest.approx(line.lives)
    read = read_curve(path)
    assert read.title == 'the "fork" springs'
    assert read.criterion == "sines"
    assert {(group.life.reliability, group.life.confidence) for group in read.groups} == {(0.9, 0.9)}
    assert [group.life.scatter for group in read.groups] == pytest.approx([line.s for line in fit.lines], rel=1e-3)
    with pytest.raises(CriterionError, match="judge by sines"):
        endurance_curve(path, criterion("gerber"), shot_peened=True, **wire)


def test_a_curve_file_of_best_estimates_is_the_line_itself(tmp_path: Path) -> None:
    S, N, failed = simulated(np.random.default_rng(8), 5, stop=1e6)
    fit = fitted(S, N, failed)
    path = tmp_path / "median.toml"
    write_curve(fit, path, title="t", source="s", reliability=0.5, confidence=None)
    read = read_curve(path)
    assert read.groups[0].life.confidence is None
    assert read.curve(criterion("sines"), shot_peened=False).slope == pytest.approx(fit.lines[0].slope, rel=1e-3)
    assert read.curve(criterion("sines"), shot_peened=True).cycles(500 * MPa) == pytest.approx(
        float(fit.lines[0].life(500 * MPa)), rel=1e-3
    )


def test_nothing_is_overwritten_unasked(tmp_path: Path) -> None:
    S, N, failed = simulated(np.random.default_rng(8), 5, stop=1e6)
    fit, path = fitted(S, N, failed), tmp_path / "own.toml"
    path.write_text("mine", encoding="utf-8")
    with pytest.raises(FileError, match=r"own.toml: is there already"):
        write_curve(fit, path, title="t", source="s")
    assert path.read_text(encoding="utf-8") == "mine"
    write_curve(fit, path, title="t", source="s", force=True)
    first = path.read_bytes()
    write_curve(fit, path, title="t", source="s", force=True)
    assert path.read_bytes() == first
    assert list(tmp_path.iterdir()) == [path]
    with pytest.raises(FileError, match="does not exist; make it first"):
        write_curve(fit, tmp_path / "none" / "own.toml", title="t", source="s")


def test_a_curve_that_does_not_fall_is_not_written(tmp_path: Path) -> None:
    fit = fitted(*complete([400, 450, 500, 550, 600], [1e5, 2e5, 1.1e5, 2.5e5, 1.3e5]))
    with pytest.raises(InputError, match="no curve at this reliability and confidence"):
        write_curve(fit, tmp_path / "own.toml", title="t", source="s")
    assert not list(tmp_path.iterdir())


def test_the_slope_is_called_falling_when_its_interval_is() -> None:
    flat = fitted(*complete([400, 450, 500, 550, 600], [1e5, 2e5, 1.1e5, 2.5e5, 1.3e5])).lines[0]
    steep = fitted(*simulated(np.random.default_rng(8), 5, stop=1e6)).lines[0]
    for line in (flat, steep):
        for confidence in (0.5, 0.9, 0.999):
            assert line.falls(confidence) == (line.slope_interval(confidence)[0] > 0)
    assert steep.falls() and not flat.falls()


TABLE = """\
stress_amplitude [MPa],stress_mean [kpsi],cycles,outcome,group
400,50,1e7,run-out,peened
500, 50 ,250000,failed,unpeened

"""


def table(folder: Path, text: str | bytes = TABLE) -> Path:
    path = folder / "tests.csv"
    path.write_bytes(text if isinstance(text, bytes) else text.encode())
    return path


def test_a_table_is_read_in_SI(tmp_path: Path) -> None:
    tests = read_tests(table(tmp_path))
    assert tests.amplitude.tolist() == [400 * MPa, 500 * MPa]
    assert tests.mean == pytest.approx([50 * 6894757.293168361] * 2)
    assert tests.cycles.tolist() == [1e7, 250000]
    assert tests.failed.tolist() == [False, True]
    assert tests.group == ("peened", "unpeened")
    assert len(tests.sha256) == 64


def test_a_group_column_may_be_left_out_and_columns_may_change_places(tmp_path: Path) -> None:
    text = "outcome,cycles,stress_mean [MPa],stress_amplitude [MPa]\r\nfailed,1e5,300,400\r\n"
    tests = read_tests(table(tmp_path, b"\xef\xbb\xbf" + text.encode()))
    assert tests.group is None
    assert (tests.amplitude[0], tests.mean[0]) == (400 * MPa, 300 * MPa)


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        ("stress_amplitude [MPa]", "stress_amplitude", "'stress_amplitude' has no unit.*'stress_amplitude .MPa.'"),
        ("stress_amplitude [MPa]", "stress_amplitude [mm]", "'mm' is not a stress"),
        ("stress_amplitude [MPa]", "amplitude [MPa]", "column 'amplitude .MPa.' is not known; did you mean 'stress_am"),
        ("cycles", "cycles [h]", "'cycles .h.' takes no unit; write it as 'cycles'"),
        (",group", ",outcome", "column 'outcome' is there twice"),
        ("cycles,outcome", "cycles,group", "there twice"),
        ("400,50,1e7", "x,50,1e7", "row 2, column 'stress_amplitude': 'x' must be a number, above zero"),
        ("400,50,1e7", "400,-50,1e7", "row 2, column 'stress_mean': '-50' must be a number, zero or above"),
        ("400,50,1e7", "400,50,0", "row 2, column 'cycles': '0' must be a number, above zero"),
        ("400,50,1e7", "400,50,nan", "row 2, column 'cycles': 'nan' must be a number"),
        ("run-out", "runout", "row 2, column 'outcome': 'runout' is not known; did you mean 'run-out'"),
        ("failed,unpeened", "failed", "row 3 has 4 cells; the header has 5"),
        ("failed,unpeened", "failed,", "row 3, column 'group': is empty"),
    ],
)  # fmt: skip
def test_faults_of_a_table_say_where_and_what(tmp_path: Path, old: str, new: str, said: str) -> None:
    assert old in TABLE
    with pytest.raises(InputError, match=said) as caught:
        read_tests(table(tmp_path, TABLE.replace(old, new, 1)))
    assert "tests.csv" in str(caught.value)


def test_all_faults_of_the_rows_are_told_at_once(tmp_path: Path) -> None:
    with pytest.raises(InputError) as caught:
        read_tests(table(tmp_path, TABLE.replace("400,", "x,").replace("failed", "broke")))
    assert len(str(caught.value).splitlines()) == 2


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("", "is empty; the first row names the columns stress_amplitude"),
        ("\n\n", "is empty"),
        (TABLE.splitlines()[0], "has a header but no tests"),
        ("cycles,outcome\n1,failed\n", "column 'stress_amplitude' is missing; the header names 'cycles', 'outcome'"),
        (b"\xff\xfe\x00", "not CSV in UTF-8"),
    ],
)  # fmt: skip
def test_tables_without_tests(tmp_path: Path, text: str | bytes, said: str) -> None:
    with pytest.raises(InputError, match=said):
        read_tests(table(tmp_path, text))


def test_tables_that_cannot_be_read(tmp_path: Path) -> None:
    with pytest.raises(FileError, match="there is no such file"):
        read_tests(tmp_path / "none.csv")
    with pytest.raises(FileError, match="cannot be read"):
        read_tests(tmp_path)


def test_the_manuals_table_is_read(tmp_path: Path) -> None:
    manual = files("springlife").joinpath("manual/strength.md").read_text(encoding="utf-8")
    example = "stress_amplitude" + manual.split("```\nstress_amplitude")[1].split("```")[0]
    tests = read_tests(table(tmp_path, example))
    assert tests.failed.tolist() == [True, False]
    assert tests.group == ("peened", "peened")
