"""Stress factors, and the map from deflection to stress: monotone, clipped, and blind to the order of counting."""

from __future__ import annotations

from collections import defaultdict
from dataclasses import FrozenInstanceError, replace
from typing import Any

import numpy as np
import pandas as pd
import pytest
import rainflow
from hypothesis import given
from hypothesis import strategies as st

from springlife.errors import InputError
from springlife.spring.grade import grade
from springlife.spring.helical import HelicalSpring
from springlife.spring.stress import CURVATURE_ON, FACTORS, bergstraesser, direct_shear, stress_map, wahl

SPRING = HelicalSpring(grade=grade("A228"), wire_diameter=2e-3, mean_diameter=16e-3, total_coils=12, free_length=60e-3)
SOLID = SPRING.solid_deflection
each_factor = pytest.mark.parametrize("name", FACTORS)
index = st.floats(3, 30)

# Spring index; torsion of a ring sector (Michell, Goehner) solved numerically; Goehner's series
# 1 + 5/(4C) + 7/(8C^2) + 1/C^3 (old DIN 2089, memory). Derived apart from this package.
ELASTICITY = [
    (4, 1.38276, 1.38281),
    (5, 1.29252, 1.29300),
    (6, 1.23683, 1.23727),
    (8, 1.17162, 1.17188),
    (10, 1.13460, 1.13475),
    (12, 1.11072, 1.11082),
]


# --- factors -----------------------------------------------------------------------------------


@pytest.mark.parametrize(("C", "exact", "series"), ELASTICITY)
def test_factors_against_elasticity(C: float, exact: float, series: float) -> None:
    assert series == pytest.approx(1 + 5 / (4 * C) + 7 / (8 * C**2) + 1 / C**3, abs=5.01e-6)
    # KB lies within 0.135 % (printed as 0.13 %) of the exact value, KW 0.5 to 1.6 % above it.
    assert abs(bergstraesser(C) / exact - 1) < 0.00135
    assert 1.005 < wahl(C) / exact < 1.016


@pytest.mark.parametrize(("C", "percent"), [(4, 1.363), (12, 0.743)])
def test_the_two_factors_differ_by_the_printed_share(C: float, percent: float) -> None:
    # (KW - KB)/KW, derived by hand from the formulas.
    assert 100 * (wahl(C) - bergstraesser(C)) / wahl(C) == pytest.approx(percent, abs=5e-4)


@given(index)
def test_bergstraesser_is_the_factor_of_en_13906(C: float) -> None:
    # EN 13906-1: k = (w + 0.5)/(w - 0.75).
    assert bergstraesser(C) == pytest.approx((C + 0.5) / (C - 0.75), rel=1e-12)


@each_factor
@given(C=index, more=st.floats(0.01, 10))
def test_a_factor_falls_with_the_index_and_stays_above_direct_shear(name: str, C: float, more: float) -> None:
    factor = FACTORS[name]
    assert factor(C) > factor(C + more) > 1
    assert factor(C) > direct_shear(C) > 1


@each_factor
def test_a_straight_bar_has_no_factor(name: str) -> None:
    # Limiting case C -> infinity.
    assert FACTORS[name](1e9) == pytest.approx(1.0, abs=1e-8)
    assert direct_shear(1e9) == pytest.approx(1.0, abs=1e-8)


@each_factor
def test_a_factor_of_an_array_is_that_of_each_element(name: str) -> None:
    C = np.array([4.0, 8.0, 12.0])
    assert FACTORS[name](C).tolist() == [FACTORS[name](float(one)) for one in C]  # type: ignore[arg-type,attr-defined]
    assert direct_shear(C).tolist() == [direct_shear(float(one)) for one in C]


# --- the map -----------------------------------------------------------------------------------


def test_stress_by_hand() -> None:
    # C 8: KB 34/29, Ks 1.0625. F = 100 N: tau = K 8 F D/(pi d^3) = K 8 * 100 * 16/(pi 8) N/mm^2.
    plain = 8 * 100 * 16 / (np.pi * 8) * 1e6
    y = 100 / SPRING.rate
    stress = stress_map(SPRING)
    assert stress.of_deflection(y) == pytest.approx(34 / 29 * plain)
    assert stress.static(y) == pytest.approx(34 / 29 * plain)
    assert stress_map(replace(SPRING, set_removed=True)).static(y) == pytest.approx(1.0625 * plain)
    assert stress_map(SPRING, "wahl").of_deflection(y) == pytest.approx((31 / 28 + 0.615 / 8) * plain)


def test_curvature_on_the_amplitude_leaves_direct_shear_on_the_mean() -> None:
    plain = 8 * 100 * 16 / (np.pi * 8) * 1e6
    low, high = 75 / SPRING.rate, 125 / SPRING.rate  # amplitude 25 N, mean 100 N
    assert stress_map(SPRING).cycles(low, high) == pytest.approx((34 / 29 * plain / 4, 34 / 29 * plain))
    apart = stress_map(SPRING, curvature_on="alternating")
    assert apart.cycles(low, high) == pytest.approx((34 / 29 * plain / 4, 1.0625 * plain))
    # The static check and the stress of a deflection are not touched by the practice.
    assert apart.static(high) == stress_map(SPRING).static(high)
    assert apart.of_deflection(high) == stress_map(SPRING).of_deflection(high)


def test_a_measured_rate_scales_every_stress() -> None:
    twice = stress_map(replace(SPRING, measured_rate=2 * SPRING.rate))
    assert twice.of_deflection(0.01) == pytest.approx(2 * stress_map(SPRING).of_deflection(0.01))


@each_factor
@given(st.floats(0.2, 5), st.floats(0.01, 0.99))
def test_all_lengths_times_k_leave_the_stress(name: str, k: float, part: float) -> None:
    # tau/G = K d y/(pi D^2 Na): the same at the same part of the solid deflection.
    held = replace(SPRING, tensile_strength=1800e6, shear_modulus=79e9)
    big = replace(held, wire_diameter=k * 2e-3, mean_diameter=k * 16e-3, free_length=k * 60e-3)
    ours, theirs = (stress_map(one, name).of_deflection(part * one.solid_deflection) for one in (held, big))
    assert theirs == pytest.approx(ours, rel=1e-9)


@given(st.floats(0, 1), st.floats(2, 30))
def test_stress_depends_on_the_geometry_as_wahl_writes_it(part: float, C: float) -> None:
    # Independent form without force: tau = K G d y/(pi D^2 Na) (Wahl, Mechanical Springs; memory).
    one = replace(SPRING, mean_diameter=C * 2e-3)
    y = part * SOLID
    expected = bergstraesser(C) * one.G * 2e-3 * y / (np.pi * one.mean_diameter**2 * 10)
    assert stress_map(one).of_deflection(y) == pytest.approx(expected, rel=1e-9)


deflections = st.floats(-2 * SOLID, 3 * SOLID)


@each_factor
@given(a=deflections, b=deflections)
def test_the_map_is_monotone(name: str, a: float, b: float) -> None:
    stress = stress_map(SPRING, name)
    low, high = min(a, b), max(a, b)
    assert stress.of_deflection(low) <= stress.of_deflection(high)
    assert stress.static(low) <= stress.static(high)
    assert 0 <= stress.of_deflection(low) <= stress.of_deflection(SOLID)


@pytest.mark.parametrize("curvature_on", CURVATURE_ON)
@given(a=deflections, b=deflections)
def test_a_cycle_lies_between_the_stresses_of_its_ends(curvature_on: str, a: float, b: float) -> None:
    low, high = min(a, b), max(a, b)
    stress = stress_map(SPRING, curvature_on=curvature_on)
    tau_a, tau_m = stress.cycles(low, high)
    assert tau_a >= 0
    if curvature_on == "both":
        assert tau_m - tau_a == pytest.approx(stress.of_deflection(low), abs=1e-3)
        assert tau_m + tau_a == pytest.approx(stress.of_deflection(high), abs=1e-3)


@pytest.mark.parametrize(
    ("low", "high"), [(-2.0, -1.0), (-1.0, 0.0), (SOLID, 2 * SOLID), (2 * SOLID, 3 * SOLID), (0.01, 0.01)]
)
def test_a_cycle_off_the_seat_or_past_solid_has_no_amplitude(low: float, high: float) -> None:
    tau_a, tau_m = stress_map(SPRING).cycles(low, high)
    assert tau_a == 0
    assert tau_m == pytest.approx(stress_map(SPRING).of_deflection(high), abs=1e-6)


def test_scalar_array_series_and_nothing() -> None:
    stress = stress_map(SPRING)
    low, high = [0.0, 0.005, 0.01], [0.01, 0.02, 0.05]
    tau_a, tau_m = stress.cycles(low, high)
    one_by_one = [stress.cycles(a, b) for a, b in zip(low, high, strict=True)]
    assert tau_a.tolist() == [a for a, _ in one_by_one] and tau_m.tolist() == [m for _, m in one_by_one]
    by_series = stress.cycles(pd.Series(low, index=[3, 4, 5]), pd.Series(high))  # taken by position
    assert by_series[0].tolist() == tau_a.tolist() and by_series[1].tolist() == tau_m.tolist()
    assert [part.shape for part in stress.cycles([], [])] == [(0,), (0,)]
    assert isinstance(stress.static(0.01), float) and isinstance(stress.of_deflection(0.01), float)
    assert stress.static([0.01, 0.02]).shape == (2,)


def counted(series: np.ndarray, stress: Any) -> dict[tuple[float, float], float]:
    """Rainflow cycles of a series by the public package, as summed counts of unordered pairs of stress."""
    pairs: dict[tuple[float, float], float] = defaultdict(float)
    for _, _, count, start, end in rainflow.extract_cycles(series.tolist()):
        low, high = sorted((float(stress(series[start])), float(stress(series[end]))))
        if low < high:
            pairs[low, high] += count
    return dict(pairs)


@given(st.lists(st.integers(-3, 12), min_size=3, max_size=40))
def test_counting_and_mapping_commute(levels: list[int]) -> None:
    # Nine levels of the working range, three below the free length and some past solid: clipped at both ends.
    y = np.array(levels) * SOLID / 9
    stress = stress_map(SPRING)
    mapped_after = counted(y, stress.of_deflection)
    mapped_before = counted(np.asarray(stress.of_deflection(y)), lambda tau: tau)
    assert mapped_after == mapped_before


def test_counting_and_mapping_commute_on_a_long_history() -> None:
    y = np.random.default_rng(8).uniform(-0.5 * SOLID, 1.5 * SOLID, 5000)
    stress = stress_map(SPRING)
    mapped_after = counted(y, stress.of_deflection)
    assert mapped_after == counted(np.asarray(stress.of_deflection(y)), lambda tau: tau)
    # The history does reach past both ends, many times.
    assert (y < 0).sum() > 500 and (y > SOLID).sum() > 500


# --- refusals ----------------------------------------------------------------------------------


def test_unknown_choices_list_the_known_ones() -> None:
    with pytest.raises(InputError, match="'whal' is not known; did you mean 'wahl'"):
        stress_map(SPRING, "whal")
    with pytest.raises(InputError, match="'mean' is not known; valid: both, alternating"):
        stress_map(SPRING, curvature_on="mean")


def test_a_map_is_frozen() -> None:
    with pytest.raises(FrozenInstanceError):
        stress_map(SPRING).mean = 0.0  # type: ignore[misc]
