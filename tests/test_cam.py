"""A spring under a cam: the lift table, slow turning, resonance of a harmonic, and what is refused."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest
from casefile import CASE, write_case
from numpy.typing import NDArray

from springlife.cli import main
from springlife.errors import InputError
from springlife.life.cam import lift_of
from springlife.life.case import load_case
from springlife.life.surge import surge
from springlife.spring.surge import transfer

CAM = """\
[surge]
positions = 5
[[surge.cam]]
name = "inlet"
cam = "lift.csv"
angle = "angle"
lift = "lift"
unit = "mm"
installed_deflection = "12 mm"
speeds = [1, 600, 2824]
"""
ANGLE = np.arange(0.0, 360.0, 5.0)


def harmonic(n: int) -> NDArray[np.float64]:
    """Lift in mm: 6 mm once a turn, and 0.06 mm n times a turn."""
    a = np.radians(ANGLE)
    return np.asarray(3 * (1 - np.cos(a)) + 0.03 * (1 - np.cos(n * a)))


def write(
    folder: Path, angle: NDArray[np.float64] = ANGLE, lift: NDArray[np.float64] | None = None, cam: str = CAM
) -> Path:
    lift = harmonic(6) if lift is None else lift
    rows = "".join(f"{a:.6f},{y:.9f}\n" for a, y in zip(angle, lift, strict=True))
    (folder / "lift.csv").write_text("angle,lift\n" + rows, encoding="utf-8")
    return write_case(folder, CASE + cam)


def test_a_cam_that_turns_slowly_moves_all_coils_alike(tmp_path: Path) -> None:
    sweep = surge(write(tmp_path)).cams[0]
    slow = sweep.speeds[0]
    assert slow.amplification == pytest.approx(1.0, abs=1e-4)
    assert slow.damage == pytest.approx(sweep.slow_damage, rel=1e-3)
    # By hand: 12 mm installed, 6 mm lift; the sixth harmonic is nothing at either end of the lift.
    assert (slow.low, slow.high) == pytest.approx((0.012, 0.018), abs=2e-6)


def test_a_harmonic_that_meets_the_first_frequency_is_amplified(tmp_path: Path) -> None:
    # f1 = 282.45 Hz is six times 47.07 turns a second, 2824 rpm; |H| there is 1/zeta = 100 times 0.03 mm.
    result = surge(write(tmp_path))
    speed = result.cams[0].speeds[2]
    H6 = abs(transfer(6 * 2824 / 60, 0.0, result.wave))
    H1 = abs(transfer(2824 / 60, 0.0, result.wave))
    reach = 2 * (0.003 * H1 + 0.00003 * H6)
    assert pytest.approx(100, rel=0.01) == H6  # the linter takes a capital for a constant
    assert speed.amplification * 0.006 == pytest.approx(reach, rel=0.1)
    assert speed.damage > 10 * result.cams[0].speeds[1].damage >= 10 * result.cams[0].slow_damage
    assert speed.hours is not None
    assert speed.hours == pytest.approx(1 / speed.damage / 60 / 2824)


def test_speeds_past_what_the_model_holds_are_said(tmp_path: Path) -> None:
    result = surge(write(tmp_path, lift=harmonic(6) + 9 * (harmonic(6) - harmonic(0))))
    said = " ".join(result.warnings)
    assert "cam 'inlet' closes the gap of a coil from 2824 rpm" in said
    assert "would have a seat pull from 2824 rpm" in said


@pytest.mark.parametrize("closing", [False, True])
def test_the_turn_may_be_closed_or_not_and_unevenly_spaced(tmp_path: Path, closing: bool) -> None:
    # Bound of cubic splines, 5/384 h^4 of the amplitude, where a row is missing and h is 10 degrees: 3.6e-8 m.
    angle = np.delete(ANGLE, [7, 20, 41])
    angle = np.append(angle, 360.0) if closing else angle
    path = write(tmp_path, angle, 3 * (1 - np.cos(np.radians(angle))))
    case = load_case(path)
    lift = lift_of(case, case.input.surge.cam[0])
    even = 2 * np.pi * np.arange(lift.size) / lift.size
    assert lift.size == 128
    assert lift == pytest.approx(0.003 * (1 - np.cos(even)), abs=3.7e-8)


@pytest.mark.parametrize(
    ("angle", "lift", "says"),
    [
        (ANGLE[:40], harmonic(6)[:40], "covers 195 degrees; a lift table covers 360"),
        (ANGLE[::-1], harmonic(6), "row 2 of the table does not increase the angle"),
        (np.append(ANGLE, 360.0), np.append(harmonic(6), 2.0), "ends at 2 mm and starts at 0 mm"),
        (np.radians(ANGLE), harmonic(6), "covers 6.19592 degrees"),
    ],
)
def test_a_table_that_is_no_turn_is_refused(
    tmp_path: Path, angle: NDArray[np.float64], lift: NDArray[np.float64], says: str
) -> None:
    with pytest.raises(InputError, match=says):
        surge(write(tmp_path, angle, lift))


@pytest.mark.parametrize(
    ("change", "says"),
    [
        (("[1, 600, 2824]", "[]"), "surge.cam"),
        (("[1, 600, 2824]", "[-5]"), "surge.cam"),
        (('"lift"\n', '"rise"\n'), "rise"),
        (("lift.csv", "gone.csv"), "there is no such file"),
        (('unit = "mm"', 'unit = "N"'), "N"),
    ],
)
def test_faults_are_told(tmp_path: Path, change: tuple[str, str], says: str) -> None:
    with pytest.raises((InputError, OSError), match=says):
        surge(write(tmp_path, cam=CAM.replace(*change)))


def test_two_cams_of_one_name_are_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="cam name 'inlet' is used twice"):
        surge(write(tmp_path, cam=CAM + CAM[CAM.index("[[") :]))


def test_command(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = str(write(tmp_path))
    main(["surge", path, "--json"])
    cam = json.loads(capsys.readouterr().out)["cams"][0]
    assert [row["turns_per_minute"] for row in cam["speeds"]] == [1, 600, 2824]
    main(["surge", path])
    assert "Cam 'inlet'" in capsys.readouterr().out
