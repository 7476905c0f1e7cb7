"""A case with the wave in its coils: amplification, worst coil, lives, contact, and what the record cannot show."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest
from casefile import CASE, write_case
from numpy.typing import NDArray

from springlife.cli import main
from springlife.errors import InputError
from springlife.life.assess import assess
from springlife.life.surge import surge
from springlife.spring.surge import transfer

# The spring of the case: f1 = d/(2 pi D^2 Na) sqrt(G/(2 rho)), 282 Hz; the rest of the duty is one record.
RATE = 8000.0
LIGHT = "[surge]\npositions = 5\n"


def sine(over_first: float, amplitude: float = 2.0, middle: float = 15.0, seconds: float = 0.4) -> NDArray[np.float64]:
    """Deflection in mm at a frequency over the first natural one."""
    t = np.arange(round(seconds * RATE)) / RATE
    return np.asarray(middle + amplitude * np.sin(2 * np.pi * over_first * 282.45 * t))


def record(y: NDArray[np.float64], rate: float = RATE) -> str:
    return "t,travel\n" + "".join(f"{n / rate:.7f},{value:.9f}\n" for n, value in enumerate(y))


def write(folder: Path, y: NDArray[np.float64], case: str = CASE + LIGHT, rate: float = RATE) -> Path:
    return write_case(folder, case, record(y, rate))


@pytest.mark.parametrize(
    ("over_first", "fixed_end", "moving_end"), [(0.25, 1.11072, 0.78540), (1 / 13, 1.00980, 0.98046)]
)
def test_a_sine_is_amplified_as_the_closed_form_says(
    tmp_path: Path, over_first: float, fixed_end: float, moving_end: float
) -> None:
    # Derived: w T/sin(w T) at the fixed end, w T cot(w T) at the moving one.
    result = surge(write(tmp_path, sine(over_first)))
    assert result.wave.first_frequency == pytest.approx(282.45, abs=0.1)
    event = result.events[0]
    span = (event.high - event.low) / (event.static_high - event.static_low)
    # What went before the record is guessed, so that its first waves may differ by some 1 %.
    assert (span[0], span[-1]) == pytest.approx((fixed_end, moving_end), rel=0.01)
    assert event.amplification == pytest.approx(fixed_end, rel=2e-3)
    assert result.coil(event.worst) == 0.0
    k = result.static.spring.rate
    assert event.fixed_force[1] == pytest.approx(k * (0.015 + 0.002 * fixed_end), rel=1e-3)
    assert event.moving_force[0] == pytest.approx(k * (0.015 - 0.002 * moving_end), rel=1e-3)
    assert (event.closed, event.lifted) == (0.0, 0.0)
    assert result.warnings == ()


def test_slow_motion_is_judged_as_without_the_wave(tmp_path: Path) -> None:
    # Static limit: at f1/100 the wave adds (pi/100)^2/6, 0.02 %, to the range.
    result = surge(write(tmp_path, sine(0.01, amplitude=12.0, middle=16.0)))
    static = result.static.damage_per_pass
    assert static > 0
    for one in result.dampings:
        assert one.damage == pytest.approx(static, rel=0.02)
        assert one.judgement.life_passes == pytest.approx(result.static.life_passes, rel=0.02)
    assert result.verdict == result.assessment.verdict


def test_the_life_falls_with_the_amplification_and_rises_with_damping(tmp_path: Path) -> None:
    # Near f1 the response is that of a resonance: less damping, more damage. The worst coil is at a seat.
    result = surge(write(tmp_path, sine(0.97, amplitude=0.3, middle=15.0)))
    assert [one.zeta for one in result.dampings] == [0.005, 0.01, 0.02]
    lives = [one.judgement.life_passes for one in result.dampings]
    assert lives[0] < lives[1] < lives[2] < (result.static.life_passes or np.inf)
    assert result.nominal.zeta == 0.01
    assert result.nominal.worst in (0, 4)
    # Derived: the steady range is that of the transfer function.
    H = abs(transfer(0.97 * 282.45, 0.0, result.wave))
    assert result.events[0].amplification == pytest.approx(H, rel=0.05)


def test_the_damping_of_the_case_is_taken(tmp_path: Path) -> None:
    given = CASE + "[surge]\npositions = 3\ndamping = 0.04\n"
    result = surge(write(tmp_path, sine(0.97, amplitude=0.3), given))
    assert [one.zeta for one in result.dampings] == pytest.approx([0.02, 0.04, 0.08])
    assert result.positions.tolist() == [0.0, 0.5, 1.0]
    H = abs(transfer(0.97 * 282.45, 0.0, result.wave))
    assert result.events[0].amplification == pytest.approx(H, rel=0.02)
    ranged = CASE + "[surge]\npositions = 3\ndamping_range = [0.01, 0.03]\n"
    assert [one.zeta for one in surge(write(tmp_path, sine(0.1), ranged)).dampings] == [0.01, 0.03]


def test_both_ends_moving_excite_no_first_mode(tmp_path: Path) -> None:
    # Symmetry, as in the transfer function.
    both = CASE + LIGHT + 'moving_ends = "both"\n'
    event = surge(write(tmp_path, sine(1.0, amplitude=0.2), both)).events[0]
    # By hand: b/(2 sin(b/2)) at b = pi is pi/2, at both ends; the middle coil b/(2 sin(b/2)) cos... is larger by none.
    assert event.amplification == pytest.approx(np.pi / 2, rel=0.02)


def test_clash_and_lift_off_withhold_the_verdict_unless_waived(tmp_path: Path) -> None:
    path = write(tmp_path, sine(1.0, amplitude=2.0))  # a hundredfold at resonance
    result = surge(path)
    assert result.assessment.verdict != "withheld"
    event = result.events[0]
    assert event.closed > 0 and event.lifted > 0.01
    assert event.fixed_force[0] < 0
    said = " ".join(result.warnings)
    for word in ("closes the gap of a coil", "would have a seat pull", "tension counts as no stress"):
        assert word in said
    assert result.verdict == "withheld"
    waived = (
        CASE.replace('"100 h"', '"100000 h"')
        + LIGHT
        + "".join(
            f'[[waive]]\nfinding = "{code}"\nby = "A. Tester"\nreason = "shown on the rig"\n'
            for code in ("past-solid", "lift-off")
        )
    )
    assert surge(write(tmp_path, sine(1.0, amplitude=2.0), waived)).verdict == "falls short"


def test_a_rate_too_low_for_the_wave_is_said(tmp_path: Path) -> None:
    # By hand: 2.56 x 3 x 282.45 Hz = 2169 Hz.
    y = 15 + 2 * np.sin(2 * np.pi * 20 * np.arange(400) / 1000)
    result = surge(write(tmp_path, y, rate=1000.0))
    assert result.events[0].rate_too_low
    assert result.events[0].needed_rate == pytest.approx(2169, rel=1e-3)
    assert "sampled at 1000 Hz" in result.warnings[0]


def test_motion_above_the_band_is_left_out(tmp_path: Path) -> None:
    y = sine(0.05) + sine(3.0, amplitude=0.05, middle=0.0)
    wide = surge(write(tmp_path, y)).events[0]
    narrow = surge(write(tmp_path, y, CASE + LIGHT + 'up_to = "400 Hz"\n')).events[0]
    # By hand: |H| at 3 f1 is 3/zeta = 300, of 0.05 mm: 15 mm beside the 2 mm of the motion itself.
    assert wide.amplification > 5
    assert narrow.amplification == pytest.approx(2 / 2.05 * 1.00412, rel=0.01)


def test_what_has_no_clock_is_slow_and_said(tmp_path: Path) -> None:
    blocks = (
        CASE[: CASE.index('record = "work.csv"')] + 'blocks = [{low = "5 mm", high = "25 mm", cycles = 10}]\n' + LIGHT
    )
    result = surge(write_case(tmp_path, blocks))
    assert result.events[0].slow == "a specified programme has no clock"
    assert result.nominal.damage == pytest.approx(result.static.damage_per_pass, rel=1e-12)
    clockless = CASE.replace('time = "t"\n', "") + LIGHT
    assert (
        surge(write_case(tmp_path, clockless)).events[0].slow
        == "the record has neither a time column nor a sample rate"
    )
    force = CASE.replace('unit = "mm"\nmeasures = "deflection"', 'unit = "N"\nmeasures = "force"') + LIGHT
    result = surge(write_case(tmp_path, force))
    assert result.events[0].slow == "a force at a seat holds the wave already"
    assert result.nominal.damage == pytest.approx(result.static.damage_per_pass, rel=1e-12)


def test_pieces_between_gaps_are_followed_apart(tmp_path: Path) -> None:
    # Nothing is known of a gap: each piece alone must give the same extremes and cycles.
    case = CASE.replace('time = "t"', 'time = "t"\ngaps = "split"') + LIGHT
    one, two = sine(0.2, seconds=0.1), sine(0.3, middle=18.0, seconds=0.1)
    gap = record(np.concatenate([one, two])).splitlines()
    gap[len(one) + 1] = gap[len(one) + 1].split(",")[0] + ","  # the first value of the second piece is missing
    both = surge(write_case(tmp_path, case, "\n".join(gap) + "\n")).events[0]
    first, second = (surge(write(tmp_path, part)).events[0] for part in (one, two[1:]))
    assert both.high == pytest.approx(np.maximum(first.high, second.high), rel=1e-9)
    assert both.low == pytest.approx(np.minimum(first.low, second.low), rel=1e-9)


def test_a_travel_counts_from_the_installed_deflection(tmp_path: Path) -> None:
    case = CASE.replace('measures = "deflection"', 'measures = "travel"\ninstalled_deflection = "5 mm"') + LIGHT
    travel = surge(write(tmp_path, sine(0.1, middle=10.0), case)).events[0]
    plain = surge(write(tmp_path, sine(0.1, middle=15.0))).events[0]
    assert travel.high == pytest.approx(plain.high, rel=1e-9)


def test_what_cannot_be_judged_has_no_wave(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="cannot be judged, so there is no wave to follow"):
        surge(write(tmp_path, sine(0.1), CASE.replace('"60 mm"', '"20 mm"')))


@pytest.mark.parametrize(
    ("table", "says"),
    [
        ("damping = 0.0", r"surge.damping: 0.0 cannot be used"),
        ("damping = 0.9", r"surge.damping: 0.9 cannot be used"),
        ("damping_range = [0.03, 0.01]", "give the lower ratio first"),
        ("damping_range = [0.03]", "surge.damping_range: a list cannot be used"),
        ("damping = 0.1\ndamping_range = [0.01, 0.03]", "0.1 is not within damping_range"),
        ("positions = 1", "surge.positions: 1 cannot be used"),
        ('up_to = "5 mm"', "surge.up_to"),
        ('moving_ends = "two"', "'two' is not known; valid: one, both"),
        ("dampening = 0.01", "did you mean 'damping'"),
    ],
)
def test_faults_of_the_table_are_told(tmp_path: Path, table: str, says: str) -> None:
    with pytest.raises(InputError, match=says):
        surge(write(tmp_path, sine(0.1), f"{CASE}[surge]\n{table}\n"))


def test_commands(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = str(write(tmp_path, sine(0.25)))
    assert main(["surge", path, "--json"]) == 0
    data = json.loads(capsys.readouterr().out)
    assert data["verdict"] == "meets"
    assert data["events"][0]["amplification"] == pytest.approx(1.11072, rel=2e-3)
    assert [row["damping"] for row in data["dynamic"]] == [0.005, 0.01, 0.02]
    assert main(["surge", path]) == 0
    out = capsys.readouterr().out
    assert "Events" in out and "1.11" in out and "282.4 Hz" in out
    assert main(["assess", path, "--surge", "--json"]) == 0
    data = json.loads(capsys.readouterr().out)
    assert data["verdict"] == "meets" and data["surge"]["first_frequency_Hz"] == pytest.approx(282.45, abs=0.1)
    path = str(write(tmp_path, sine(1.0)))
    assert main(["assess", path]) == 0
    assert main(["assess", path, "--surge"]) == main(["surge", path]) == 3
    assert "closes the gap of a coil" in capsys.readouterr().out


def test_an_assess_without_the_wave_has_none(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = write(tmp_path, sine(0.25))
    main(["assess", str(path), "--json"])
    assert "surge" not in json.loads(capsys.readouterr().out)
    assert assess(path).verdict == "meets"
