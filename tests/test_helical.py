"""The spring itself: geometry, rate, force, solid, buckling, surge; what cannot exist is refused whole."""

from __future__ import annotations

import math
import pickle
from dataclasses import FrozenInstanceError, replace
from typing import Any

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

from springlife.errors import InputError
from springlife.spring.grade import Grade, WireRangeError, grade
from springlife.spring.helical import ENDS, SUPPORTS, GeometryError, HelicalSpring, buckling_constant

BASE: dict[str, Any] = {
    "grade": grade("A228"),
    "wire_diameter": 2e-3,
    "mean_diameter": 16e-3,
    "total_coils": 12.0,
    "free_length": 60e-3,
}


def spring(**changes: Any) -> HelicalSpring:
    return HelicalSpring(**BASE | changes)


def drawn_by(name: str, value: float, **changes: Any) -> HelicalSpring:
    rest = {key: kept for key, kept in BASE.items() if key != "mean_diameter"}
    return HelicalSpring(**rest | {name: value} | changes)


# Any spring that can be built of one wire: index, total coils, gap between coils in wires, ends.
springs = st.builds(
    lambda d, C, Nt, gap, ends: spring(
        wire_diameter=d, mean_diameter=C * d, total_coils=Nt, ends=ends, free_length=d * (Nt + 1) * (1 + gap)
    ),
    st.floats(0.3e-3, 6e-3),
    st.floats(3, 20),
    st.floats(3, 40),
    st.floats(0.05, 4),
    st.sampled_from(list(ENDS)),
)


# --- diameters ---------------------------------------------------------------------------------


def test_each_of_the_three_diameters_draws_the_same_spring() -> None:
    # D = outer - d = inner + d, by hand: 16, 18, 14 mm.
    for one in (spring(), drawn_by("outer_diameter", 18e-3), drawn_by("inner_diameter", 14e-3)):
        got = (one.mean_diameter, one.outer_diameter, one.inner_diameter)
        assert got == pytest.approx((16e-3, 18e-3, 14e-3), rel=1e-12)
        assert one.index == pytest.approx(8)


@pytest.mark.parametrize(
    ("name", "value", "mean"), [("mean_diameter", 16, 16), ("outer_diameter", 18, 15), ("inner_diameter", 14, 17)]
)
def test_replacing_the_wire_keeps_the_diameter_that_was_given(name: str, value: float, mean: float) -> None:
    thicker = replace(drawn_by(name, value * 1e-3), wire_diameter=3e-3)
    assert getattr(thicker, name) == value * 1e-3
    assert thicker.mean_diameter == pytest.approx(mean * 1e-3, rel=1e-12)


def test_another_diameter_is_given_by_dropping_the_first() -> None:
    other = replace(drawn_by("outer_diameter", 18e-3), outer_diameter=None, inner_diameter=12e-3)  # type: ignore[arg-type]
    assert other.mean_diameter == pytest.approx(14e-3)
    with pytest.raises(InputError, match=r"exactly one of .*; mean_diameter and outer_diameter given"):
        replace(drawn_by("outer_diameter", 18e-3), mean_diameter=16e-3)


def test_no_diameter_is_not_enough() -> None:
    with pytest.raises(InputError, match=r"exactly one of .*; none given"):
        spring(mean_diameter=None)


# --- rate, mass, scaling -----------------------------------------------------------------------


def test_rate_and_mass_by_hand() -> None:
    # k = d^4 G/(8 D^3 Na), G 11.75 Mpsi: 2^4 * 81013.398/(8 * 16^3 * 10) N/mm; m = pi^2 d^2 D Nt rho/4.
    one = spring()
    assert one.rate == pytest.approx(1e3 * 16 * 81013.398 / 327680, rel=1e-8)
    assert one.wire_length == pytest.approx(math.pi * 0.016 * 12)
    assert one.mass == pytest.approx(math.pi**2 * 4e-6 * 0.016 * 12 * 7850 / 4)
    assert one.active_mass == pytest.approx(one.mass * 10 / 12)


@given(springs, st.floats(0.2, 5))
def test_all_lengths_times_k(one: HelicalSpring, k: float) -> None:
    # With the material held: rate goes with k, forces with k^2, mass with k^3, frequency with 1/k.
    held = replace(one, tensile_strength=1800e6, shear_modulus=79e9)
    big = replace(
        held,
        wire_diameter=k * held.wire_diameter,
        mean_diameter=k * held.mean_diameter,
        free_length=k * held.free_length,
    )
    ratios = {
        "index": 1, "rate": k, "solid_length": k, "solid_deflection": k, "pitch": k, "solid_force": k**2,
        "mass": k**3, "active_mass": k**3, "surge_frequency": 1 / k,
    }  # fmt: skip
    for name, ratio in ratios.items():
        assert getattr(big, name) == pytest.approx(ratio * getattr(held, name), rel=1e-9)
    if held.E == big.E and held.buckling_deflection and big.buckling_deflection:
        assert big.buckling_deflection == pytest.approx(k * held.buckling_deflection, rel=1e-6)


@given(springs)
def test_rate_is_that_of_the_wire_in_torsion(one: HelicalSpring) -> None:
    # Independent form: twist of a straight bar of length pi D Na under the torque F D/2.
    polar = math.pi * one.wire_diameter**4 / 32
    length = math.pi * one.mean_diameter * one.active_coils
    assert one.rate == pytest.approx(one.G * polar / length / (one.mean_diameter / 2) ** 2, rel=1e-9)


def test_a_measured_rate_is_used_and_the_calculated_one_kept() -> None:
    one = spring(measured_rate=4000.0)
    assert one.rate == 4000 and one.calculated_rate == spring().calculated_rate
    assert one.solid_force == pytest.approx(4000 * one.solid_deflection)
    # Frequency goes with the square root of the rate.
    assert one.surge_frequency == pytest.approx(spring().surge_frequency * math.sqrt(4000 / spring().rate))


def test_a_modulus_given_replaces_the_grades() -> None:
    one = spring(shear_modulus=70e9)
    assert one.G == 70e9 and one.E == spring().E
    assert one.rate == pytest.approx(spring().rate * 70e9 / spring().G)


@pytest.mark.parametrize("ends", ENDS)
def test_pitch_closes_to_the_wire_at_solid(ends: str) -> None:
    # Limiting case of Shigley's table 10-1: a spring whose free length just passes solid has the pitch d.
    one = spring(ends=ends)
    closed = replace(one, free_length=one.solid_length * (1 + 1e-9))
    assert closed.pitch == pytest.approx(one.wire_diameter, rel=1e-6)


# --- strengths ---------------------------------------------------------------------------------


def test_strengths_follow_the_grade_or_the_certificate() -> None:
    # Shigley's eq. 10-30 and table 10-6 (memory): Ssu 0.67 Sut, music wire 0.45, after set removal from 0.60.
    for one, Sut in ((spring(), grade("A228").tensile_strength(2e-3)), (spring(tensile_strength=1700e6), 1700e6)):
        assert one.Sut == Sut
        assert one.Ssu == pytest.approx(0.67 * Sut)
        assert one.Ssy == one.static_limit == pytest.approx(0.45 * Sut)
        pressed = replace(one, set_removed=True)
        assert pressed.static_limit == pytest.approx(0.60 * Sut)
        assert pressed.Ssy == one.Ssy


def test_wire_off_the_table_needs_a_certificate() -> None:
    off: dict[str, Any] = {"wire_diameter": 7e-3, "mean_diameter": 56e-3, "free_length": 200e-3}
    with pytest.raises(WireRangeError, match="7 mm"):
        spring(**off)
    assert spring(**off, tensile_strength=1500e6).Sut == 1500e6


def test_a_grade_is_taken_by_name_too() -> None:
    assert spring(grade="astm a228") == spring()


# --- force -------------------------------------------------------------------------------------


def test_force_is_zero_off_the_seat_and_stops_at_solid() -> None:
    one = spring()
    solid = one.solid_deflection
    got = one.force([-1.0, 0.0, 0.01, solid, 2 * solid])
    assert got.tolist() == pytest.approx([0, 0, one.rate * 0.01, one.solid_force, one.solid_force])


def test_force_of_scalar_array_series_and_nothing() -> None:
    one = spring()
    assert isinstance(one.force(0.01), float)
    assert one.force(pd.Series([0.01, 0.02], index=[5, 6])).tolist() == [one.force(0.01), one.force(0.02)]
    assert one.force(np.zeros((2, 3))).shape == (2, 3)
    assert one.force([]).shape == (0,)
    assert math.isnan(one.force(math.nan))


# --- buckling ----------------------------------------------------------------------------------


def test_buckling_by_hand() -> None:
    # E 28.5, G 11.75 Mpsi: C1' = 28.5/33.5, C2' = 2 pi^2 16.75/52; lambda = 0.5 * 160/16 = 5;
    # y_cr = 160 C1' (1 - sqrt(1 - C2'/25)) mm.
    one = spring(free_length=160e-3)
    assert not one.absolutely_stable
    expected = 0.160 * 28.5 / 33.5 * (1 - math.sqrt(1 - 2 * math.pi**2 * 16.75 / 52 / 25))
    assert one.buckling_deflection == pytest.approx(expected, rel=1e-9)


@pytest.mark.parametrize("supports", SUPPORTS)
def test_stability_turns_at_the_constant_times_D_over_alpha(supports: str) -> None:
    border = buckling_constant(spring().E, spring().G) * 16e-3 / SUPPORTS[supports]
    coils = {"total_coils": 4.0, "supports": supports}
    assert spring(free_length=0.999 * border, **coils).buckling_deflection is None
    above = spring(free_length=1.001 * border, **coils)
    # Limiting case: at the border it buckles at L0 C1', C1' = E/(2(E - G)).
    C1 = above.E / (2 * (above.E - above.G))
    assert above.buckling_deflection == pytest.approx(above.free_length * C1, rel=0.05)
    assert above.buckling_deflection < above.free_length * C1


def test_end_condition_constants() -> None:
    # Shigley's table 10-2 (memory).
    assert SUPPORTS == {"flat-flat": 0.5, "flat-pivoted": 0.707, "pivoted-pivoted": 1.0, "clamped-free": 2.0}


@given(springs)
def test_freer_ends_never_buckle_later(one: HelicalSpring) -> None:
    at = [replace(one, supports=name).buckling_deflection or math.inf for name in SUPPORTS]
    assert at == sorted(at, reverse=True)


# --- surge -------------------------------------------------------------------------------------


@given(springs)
def test_surge_frequency_from_the_wave_speed(one: HelicalSpring) -> None:
    # f1 = d/(2 pi D^2 Na) sqrt(G/(2 rho)): Shigley's eq. 10-25 with rate and mass put in, by hand.
    d, D = one.wire_diameter, one.mean_diameter
    expected = d / (2 * math.pi * D**2 * one.active_coils) * math.sqrt(one.G / (2 * one.grade.density))
    assert one.surge_frequency == pytest.approx(expected, rel=1e-9)


# --- refusals ----------------------------------------------------------------------------------

IMPOSSIBLE = [
    ({"mean_diameter": 1.9e-3}, "inner diameter -0.1 mm .* mean diameter 1.9 mm .* wire 2 mm"),
    ({"mean_diameter": 2e-3}, "inner diameter 0 mm"),
    ({"free_length": 24e-3}, "free length 24 mm .* is not above the solid length 24 mm"),
    ({"total_coils": 2.0}, "0 active coils are left of total_coils 2 with squared and ground ends"),
    ({"total_coils": 0.5, "ends": "plain and ground"}, "-0.5 active coils"),
    ({"free_length": -0.06}, "free_length is -0.06 m; it must be above 0"),
    ({"wire_diameter": 0.0}, "wire_diameter is 0 m"),
    ({"mean_diameter": math.nan}, "mean_diameter is nan m"),
    ({"total_coils": math.inf}, "total_coils is inf coils"),
    ({"total_coils": 10**400}, "total_coils is inf coils"),
    (
        {"wire_diameter": 1e200, "mean_diameter": 1e201, "free_length": 1e203, "tensile_strength": 1e9},
        "the mass as inf kg; check the units",
    ),
    (
        {"wire_diameter": 1e-200, "mean_diameter": 1e-199, "tensile_strength": 1e9},
        "the mass as 0 kg; check the units",
    ),
]  # fmt: skip


@pytest.mark.parametrize(("changes", "message"), IMPOSSIBLE, ids=lambda value: str(value)[:60])
def test_what_cannot_exist_is_refused(changes: dict[str, Any], message: str) -> None:
    with pytest.raises(GeometryError, match=message) as caught:
        spring(**changes)
    assert len(caught.value.faults) == 1


def test_all_faults_are_named_at_once() -> None:
    with pytest.raises(GeometryError) as caught:
        spring(mean_diameter=1e-3, total_coils=1.0)
    assert len(caught.value.faults) == 2
    assert all(fault in str(caught.value) for fault in caught.value.faults)
    assert pickle.loads(pickle.dumps(caught.value)).faults == caught.value.faults


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"ends": "closed"}, "ends 'closed' is not known; .*squared and ground"),
        ({"supports": "flat"}, "supports 'flat' is not known; .*flat-flat"),
        ({"temperature": 0.0}, "temperature is 0 K; it must be above 0"),
        ({"temperature": None}, "temperature is None; give it as a number in K"),
        ({"tensile_strength": -1e9}, r"tensile_strength is -1e\+09 Pa"),
        ({"shear_modulus": math.inf}, "shear_modulus is inf Pa"),
        ({"shear_modulus": 250e9}, "shear_modulus 250 GPa is not below Young's modulus 196.5 GPa of A228"),
        ({"measured_rate": 0}, "measured_rate is 0 N/m"),
        ({"wire_diameter": "2 mm"}, "wire_diameter is '2 mm'; give it as a number in m"),
        ({"total_coils": True}, "total_coils is True; give it as a number"),
        ({"grade": "A999"}, "grade 'A999' is not known"),
    ],
    ids=lambda value: str(value)[:50],
)  # fmt: skip
def test_arguments_of_the_wrong_kind_are_refused(changes: dict[str, Any], message: str) -> None:
    with pytest.raises(InputError, match=message) as caught:
        spring(**changes)
    assert not isinstance(caught.value, GeometryError)


def test_wrong_arguments_are_named_at_once() -> None:
    with pytest.raises(InputError, match=r"temperature is -3 K.*measured_rate is '8'.*ends 'flat'"):
        spring(temperature=-3, measured_rate="8", ends="flat")


def test_a_spring_is_frozen_and_passes_between_processes() -> None:
    one = drawn_by("outer_diameter", 18e-3, grade=BASE["grade"])
    assert isinstance(one.grade, Grade)
    with pytest.raises(FrozenInstanceError):
        one.wire_diameter = 1.0  # type: ignore[misc]
    back = pickle.loads(pickle.dumps(one))
    assert back == one and replace(back, wire_diameter=1e-3).outer_diameter == 18e-3


def test_numbers_of_numpy_and_whole_numbers_are_floats_inside() -> None:
    one = spring(total_coils=12, wire_diameter=np.float32(2e-3), free_length=np.float64(0.06))
    assert {type(value) for value in (one.total_coils, one.wire_diameter, one.free_length)} == {float}
