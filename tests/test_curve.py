"""Life curves: they pass through their points, fall, scale, and read cycles under the knee in three ways."""

from __future__ import annotations

from importlib.resources import files
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

from springlife.errors import CriterionError, FileError, InputError
from springlife.strength.criteria import CRITERIA, criterion
from springlife.strength.curve import (
    MINERS,
    LifeCurve,
    cycles_to_failure,
    endurance_curve,
    handbook_curve,
    read_curve,
    two_point,
)
from springlife.strength.endurance import handbook

MPa = 1e6
every_reading = pytest.mark.parametrize("miner", MINERS)
strength = st.floats(100 * MPa, 800 * MPa)
share = st.floats(0.05, 0.95)


@every_reading
@given(strength, share, st.floats(1e5, 1e8))
def test_the_two_point_curve_passes_through_its_points(miner: str, Ssu: float, e: float, knee: float) -> None:
    Sse = 0.9 * Ssu * e
    curve = two_point(Sse, Ssu, f=0.9, knee=knee)
    assert curve.cycles(0.9 * Ssu, miner) == pytest.approx(1e3, rel=1e-9)
    assert curve.cycles(Sse, miner) == pytest.approx(knee, rel=1e-9)
    assert (curve.knee, curve.strength_at_knee) == (knee, Sse)
    # k = ln(knee/1000)/ln(f Ssu/Sse), by hand.
    assert curve.slope == pytest.approx(np.log(knee / 1e3) / -np.log(e), rel=1e-9)


def test_two_point_defaults_are_those_of_the_data_file() -> None:
    # f = 0.9 (memory: usual value for torsion), knee 1e7 (memory: Zimmerli's basis).
    assert two_point(300 * MPa, 1000 * MPa).points == ((1e3, 900 * MPa), (1e7, 300 * MPa))


def test_a_cycle_by_hand() -> None:
    # Sse = 0.09 Ssu: one decade of stress for four of life, k = 4; halfway in log S is halfway in log N.
    curve = two_point(90 * MPa, 1000 * MPa)
    assert curve.slope == pytest.approx(4)
    assert curve.cycles(np.sqrt(900 * 90) * MPa) == pytest.approx(1e5)
    # Shorter lives continue the slope: 10^(1/4) above f Ssu is 100 cycles.
    assert curve.cycles(900 * 10**0.25 * MPa) == pytest.approx(1e2)
    # Under the knee by 10^(1/4): elementary k = 4, Haibach 2k - 1 = 7, original none.
    under = 90 / 10**0.25 * MPa
    assert curve.cycles(under, "elementary") == pytest.approx(1e8)
    assert curve.cycles(under, "haibach") == pytest.approx(10**8.75)
    assert curve.cycles(under, "original") == np.inf


@every_reading
def test_no_stress_never_fails_and_a_static_failure_fails_at_once(miner: str) -> None:
    curve = two_point(300 * MPa, 1000 * MPa)
    assert curve.cycles(0.0, miner) == np.inf
    assert curve.cycles(np.inf, miner) == 0
    assert np.isnan(curve.cycles(np.nan, miner))


@every_reading
@given(strength, share, st.floats(0.1, 3.0), st.floats(1.001, 2.0))
def test_life_falls_with_stress(miner: str, Ssu: float, e: float, x: float, more: float) -> None:
    curve = two_point(0.9 * Ssu * e, Ssu)
    lower, higher = curve.cycles(np.array([x, x * more]) * Ssu, miner)
    assert lower > higher or lower == higher == np.inf


@every_reading
@given(strength, share, st.floats(0.1, 3.0), st.floats(1e-6, 1e3))
def test_every_stress_scaled_leaves_the_life(miner: str, Ssu: float, e: float, x: float, k: float) -> None:
    Sse = 0.9 * Ssu * e
    here = two_point(Sse, Ssu).cycles(x * Ssu, miner)
    there = two_point(k * Sse, k * Ssu).cycles(k * x * Ssu, miner)
    same_side = abs(np.log(x * Ssu / Sse)) > 1e-9  # rounding may cross the knee where the readings part
    assert there == pytest.approx(here, rel=1e-6) or not same_side


@given(strength, share)
def test_haibach_is_continuous_at_the_knee(Ssu: float, e: float) -> None:
    curve = two_point(0.9 * Ssu * e, Ssu)
    just_under, just_over = curve.cycles(curve.strength_at_knee * np.array([1 - 1e-12, 1 + 1e-12]), "haibach")
    # The step is no larger than the slopes make of a change of 1e-12 in stress.
    assert just_under == pytest.approx(just_over, rel=4e-12 * curve.slope + 1e-12)


@given(strength, share, st.floats(0.2, 0.999))
def test_under_the_knee_the_readings_are_ordered(Ssu: float, e: float, x: float) -> None:
    curve = two_point(0.9 * Ssu * e, Ssu)
    under = x * curve.strength_at_knee
    elementary, haibach, original = (curve.cycles(under, miner) for miner in ("elementary", "haibach", "original"))
    assert curve.knee < elementary < original == np.inf
    # 2k - 1 is steeper than k only for k > 1; wire is far above.
    assert (haibach > elementary) == (curve.slope > 1) or haibach == np.inf


@pytest.mark.parametrize("Sse", [0.0, -10 * MPa, np.inf, np.nan, 900 * MPa, 950 * MPa])
def test_a_strength_that_cannot_lie_on_a_falling_curve_is_incoherent(Sse: float) -> None:
    with pytest.raises(CriterionError, match=r"Sse = .*f Ssu = 0.9 x 1000 MPa = 900 MPa"):
        two_point(Sse, 1000 * MPa)


@pytest.mark.parametrize(
    ("options", "said"),
    [
        ({"f": 0.0}, "fraction f is 0"),
        ({"f": 1.2}, "f is 1.2"),
        ({"knee": 500}, "past the curve's start at 1000"),
    ],
)
def test_bad_settings_of_the_two_point_curve(options: dict[str, float], said: str) -> None:
    with pytest.raises(InputError, match=said):
        two_point(300 * MPa, 1000 * MPa, **options)


def test_an_unknown_reading_of_miner_lists_the_known_ones() -> None:
    with pytest.raises(InputError, match="'haibch' is not known; did you mean 'haibach'"):
        two_point(300 * MPa, 1000 * MPa).cycles(1.0, "haibch")


def test_handbook_points_are_converted_by_hand() -> None:
    # Peak 0.36, 0.33, 0.30 of Sut = 2,000 MPa at R = 0: tau_a = tau_m = 360, 330, 300 MPa.
    # Goodman with Ssu = 1,200: 360/0.7, 330/0.725, 300/0.75.
    fractions = handbook("music-stainless-nonferrous", False)
    curve = handbook_curve(criterion("goodman"), fractions, 2000 * MPa, 1200 * MPa, 900 * MPa)
    lives, amplitudes = zip(*curve.points, strict=True)
    assert lives == (1e5, 1e6, 1e7)
    assert amplitudes == pytest.approx([360 / 0.7 * MPa, 330 / 0.725 * MPa, 400 * MPa])
    assert curve.cycles(amplitudes) == pytest.approx([1e5, 1e6, 1e7])
    # The slope goes on upward: one decade shorter per ratio of the first two amplitudes.
    assert curve.cycles(amplitudes[0] ** 2 / amplitudes[1]) == pytest.approx(1e4)


def test_handbook_slope_on_peak_stress_is_about_25_and_30() -> None:
    # Derived: 2/log10(0.36/0.30) = 25.3 and 2/log10(0.42/0.36) = 29.9, on which Sines is peak stress itself.
    for shot_peened, slope in ((False, 25.3), (True, 29.9)):
        fractions = handbook("music-stainless-nonferrous", shot_peened)
        curve = handbook_curve(criterion("sines"), fractions, 2000 * MPa, 1340 * MPa, 900 * MPa)
        (N1, S1), *_, (N2, S2) = curve.points
        assert np.log(N2 / N1) / np.log(S1 / S2) == pytest.approx(slope, abs=0.05)


def test_a_criterion_without_value_on_the_handbook_is_withheld() -> None:
    fractions = handbook("alloy", True)
    with pytest.raises(CriterionError, match="goodman has no fully reversed strength"):
        handbook_curve(criterion("goodman"), fractions, 2000 * MPa, 480 * MPa, 400 * MPa)


WIRE: dict[str, Any] = {
    "shot_peened": False,
    "family": "alloy",
    "Sut": 1900 * MPa,
    "Ssu": 1273 * MPa,
    "Ssy": 950 * MPa,
}


@pytest.mark.parametrize("name", CRITERIA)
def test_on_zimmerli_the_pair_itself_lives_to_the_knee(name: str) -> None:
    rule = criterion(name)
    curve = endurance_curve("zimmerli", rule, **WIRE)
    kpsi = 6894757.293168361
    tau_ar = rule.equivalent(35 * kpsi, 55 * kpsi, WIRE["Ssu"], WIRE["Ssy"])
    assert curve.cycles(tau_ar, "elementary") == pytest.approx(1e7)
    assert curve.valid_from == 1e3 and curve.valid_to == 1e7
    assert any("Zimmerli" in source for source in curve.sources)


def test_zimmerli_at_or_above_f_Ssu_names_the_criterion() -> None:
    # Thick peened stainless: Ssm = 534 MPa comes close to Ssy = 540, Sse = 396/sqrt(1 - (534.3/540)^2).
    with pytest.raises(CriterionError, match=r"asme-elliptic on zimmerli peened: .*f Ssu = 0.9 x 1000 MPa"):
        endurance_curve(
            "zimmerli", criterion("asme-elliptic"), shot_peened=True, family=None,
            Sut=1500 * MPa, Ssu=1000 * MPa, Ssy=540 * MPa,
        )  # fmt: skip


def test_settings_reach_the_curve() -> None:
    curve = endurance_curve("zimmerli", criterion("gerber"), **WIRE, f=0.8, knee=2e6)
    assert curve.knee == 2e6 and curve.points[0] == pytest.approx((1e3, 0.8 * WIRE["Ssu"]))


def test_an_unknown_basis_lists_the_known_ones() -> None:
    with pytest.raises(InputError, match=r"endurance 'zimerli' is not known; did you mean 'zimmerli'.*\.toml"):
        endurance_curve("zimerli", criterion("gerber"), **WIRE)


@every_reading
def test_arrays_of_any_shape_and_series(miner: str) -> None:
    curve = endurance_curve("handbook", criterion("gerber"), **WIRE)
    amplitudes = np.array([0.0, 250.0, 330.0, 420.0, 440.0, 900.0]) * MPa
    one_by_one = np.array([curve.cycles(one, miner) for one in amplitudes])
    assert isinstance(curve.cycles(amplitudes[1], miner), float)
    assert curve.cycles(amplitudes, miner).tolist() == one_by_one.tolist()
    assert curve.cycles(pd.Series(amplitudes, index=range(6, 0, -1)), miner).tolist() == one_by_one.tolist()
    assert curve.cycles(amplitudes.reshape(2, 3), miner).tolist() == one_by_one.reshape(2, 3).tolist()


@every_reading
def test_each_sample_of_a_study_may_have_its_own_curve(miner: str) -> None:
    Sse = np.array([200.0, 300.0, 400.0]) * MPa
    got = cycles_to_failure(350 * MPa, (1e3, 1e7), (900 * MPa, Sse), miner)
    expected = [two_point(one, 1000 * MPa).cycles(350 * MPa, miner) for one in Sse]
    assert got == pytest.approx(expected)


def test_a_curve_must_fall() -> None:
    with pytest.raises(InputError, match="500 MPa at 1000 cycles is followed by 500 MPa at 1e\\+06"):
        LifeCurve(((1e3, 500 * MPa), (1e6, 500 * MPa)), "flat", (), 1e3, 1e6)
    with pytest.raises(InputError, match="1 points; a life curve needs at least two"):
        LifeCurve(((1e3, 500 * MPa),), "dot", (), 1e3, 1e6)


CURVE_FILE = """\
format = 1
title = "fork springs, batch of spring"
source = "own tests"
criterion = "gerber"
reliability = 0.9
confidence = 0.9
[[group]]
name = "peened"
shot_peened = true
line = { slope = 10, cycles = 1e6, amplitude = "400 MPa" }
tested = { shortest = 2e4, longest = 1e7 }
[[group]]
name = "unpeened"
shot_peened = false
points = [ { cycles = 1e4, amplitude = "500 MPa" }, { cycles = 1e6, amplitude = "50 kpsi" } ]
"""


def curve_file(folder: Path, text: str = CURVE_FILE) -> Path:
    path = folder / "own.toml"
    path.write_text(text, encoding="utf-8")
    return path


def test_a_curve_file_is_an_endurance_basis(tmp_path: Path) -> None:
    path = curve_file(tmp_path)
    wire = WIRE | {"shot_peened": True}
    peened = endurance_curve(str(path), criterion("gerber"), **wire)
    # By hand: N = 1e6 (S/400)^-10, so 1e6 cycles at 400 MPa and a knee at the longest test.
    assert peened.cycles(400 * MPa) == pytest.approx(1e6)
    assert peened.slope == pytest.approx(10)
    assert (peened.knee, peened.valid_from, peened.valid_to) == (1e7, 2e4, 1e7)
    assert peened.strength_at_knee == pytest.approx(400 * MPa * 10**-0.1)
    unpeened = endurance_curve(path, criterion("gerber"), **WIRE)
    assert unpeened.points[0] == (1e4, 500 * MPa)
    assert unpeened.points[1] == pytest.approx((1e6, 50 * 6894757.293168361))
    assert (unpeened.valid_from, unpeened.valid_to) == (1e4, 1e6)
    assert unpeened.sources == ("own tests",)
    assert (unpeened.reliability, unpeened.confidence, unpeened.scatter) == (0.9, 0.9, None)


def test_a_curve_file_serves_only_the_criterion_it_was_made_with(tmp_path: Path) -> None:
    with pytest.raises(CriterionError, match=r"own.toml.*fully reversed by gerber, so goodman has no value"):
        endurance_curve(curve_file(tmp_path), criterion("goodman"), **WIRE)


def test_a_curve_file_without_such_springs(tmp_path: Path) -> None:
    path = curve_file(tmp_path, CURVE_FILE.replace("shot_peened = true", "shot_peened = false"))
    for shot_peened, count in ((True, 0), (False, 2)):
        with pytest.raises(InputError, match=f"{count} groups are for shot_peened"):
            endurance_curve(path, criterion("gerber"), **WIRE | {"shot_peened": shot_peened})


@pytest.mark.parametrize(
    ("old", "new", "said"),
    [
        ("format = 1", "format = 2", "format is 2; this version reads format = 1"),
        ("format = 1\n", "", "format is missing; write a whole number"),
        ("title = ", "titel = ", "titel is not a known key; did you mean 'title'"),
        ('criterion = "gerber"', 'criterion = "geber"', "did you mean 'gerber'"),
        ("reliability = 0.9", "reliability = 90", "reliability is 90; it must be between 0 and 1"),
        ('source = "own tests"', "source = 7", "source is 7; write text in quotes"),
        ("slope = 10", "slope = -10", r"group\[1\].line.slope is -10; it must be above zero"),
        ("slope = 10", "slop = 10", r"group\[1\].line.slop is not a known key; did you mean 'slope'"),
        ('"400 MPa"', '"400"', r"group\[1\].line.amplitude: '400' has no unit; write a stress"),
        ('"400 MPa"', "400", r"group\[1\].line.amplitude is 400; write text in quotes"),
        ('"400 MPa"', '"-4 MPa"', r"group\[1\].line.amplitude is '-4 MPa'; it must be above zero"),
        ("longest = 1e7", "longest = 1e4", "shortest 20000 must be less than longest 10000"),
        ("tested = { shortest = 2e4, longest = 1e7 }\n", "", r"group\[1\].tested is missing"),
        ("line = {", "points = [{cycles = 1, amplitude = '1 Pa'}]\nline = {", "one of points and line"),
        ("1e6, amplitude = \"50 kpsi\"", "1e3, amplitude = \"50 kpsi\"", "cycles must rise"),
        ("shot_peened = true", 'shot_peened = "yes"', "shot_peened is 'yes'; write true or false"),
        ("cycles = 1e4", 'cycles = "1e4"', r"group\[2\].points\[1\].cycles is '1e4'; write a number"),
        ("[[group]]", "[group]", "not valid TOML"),
    ],
)  # fmt: skip
def test_faults_of_a_curve_file_say_where_and_what(tmp_path: Path, old: str, new: str, said: str) -> None:
    assert old in CURVE_FILE
    with pytest.raises(InputError, match=said) as caught:
        read_curve(curve_file(tmp_path, CURVE_FILE.replace(old, new, 1)))
    assert "own.toml" in str(caught.value)


def test_curve_files_that_cannot_be_read(tmp_path: Path) -> None:
    with pytest.raises(FileError, match="there is no such curve file"):
        read_curve(tmp_path / "none.toml")
    with pytest.raises(FileError, match="cannot be read"):
        read_curve(tmp_path)
    (tmp_path / "bytes.toml").write_bytes(b"\xff\xfe\x00")
    with pytest.raises(InputError, match="not valid TOML"):
        read_curve(tmp_path / "bytes.toml")
    with pytest.raises(InputError, match="write a list of one or more tables"):
        read_curve(curve_file(tmp_path, CURVE_FILE.split("[[group]]")[0] + "group = []\n"))


def test_the_manuals_curve_file_is_read(tmp_path: Path) -> None:
    manual = files("springlife").joinpath("manual/strength.md").read_text(encoding="utf-8")
    example = manual.split("```toml\n")[1].split("```")[0]
    peened, unpeened = read_curve(curve_file(tmp_path, example)).groups
    assert (peened.life.scatter, unpeened.life.scatter) == (0.18, None)
    assert unpeened.life.cycles(390 * MPa) == pytest.approx(1e6)
