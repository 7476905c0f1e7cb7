"""Criteria: limiting cases, scaling, order, and that every law of one criterion describes one line."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

from springlife.errors import CriterionError, InputError
from springlife.strength.criteria import CRITERIA, Criterion, criterion, yield_factor

MPa = 1e6
each = pytest.mark.parametrize("rule", CRITERIA.values(), ids=CRITERIA)
with_intercept = pytest.mark.parametrize(
    "rule", [rule for rule in CRITERIA.values() if rule.intercept], ids=lambda rule: rule.name
)

# Strengths of spring wire: Ssu 400 to 1,500 MPa, Ssy a fraction of it, Sse below both.
ultimate = st.floats(400 * MPa, 1500 * MPa)
part = st.floats(0.01, 0.99)


def strengths(Ssu: float, y: float, e: float) -> tuple[float, float, float]:
    """Ssu, Ssy between 0.5 and 0.8 of it, Sse up to 0.5 of it."""
    return Ssu, Ssu * (0.5 + 0.3 * y), Ssu * 0.5 * e


def limit(rule: Criterion, Ssu: float, Ssy: float) -> float:
    """The mean at which the criterion fails by itself; for Sines, Ssu as a stand-in."""
    return Ssy if rule.intercept == "Ssy" else Ssu


@each
@pytest.mark.parametrize("tau_m", [0.0, -200 * MPa])
def test_without_a_tensile_mean_the_amplitude_stands_for_itself(rule: Criterion, tau_m: float) -> None:
    # Limiting case tau_m -> 0 of every formula: tau_ar = tau_a.
    assert rule.equivalent(300 * MPa, tau_m, 1200 * MPa, 800 * MPa) == 300 * MPa
    assert rule.allowable(tau_m, 250 * MPa, 1200 * MPa, 800 * MPa) == 250 * MPa
    factor = rule.safety_factor(300 * MPa, tau_m, 250 * MPa, 1200 * MPa, 800 * MPa)
    assert factor == pytest.approx(250 / 300, rel=1e-14)


@pytest.mark.parametrize(
    ("name", "tau_ar"),
    [
        # By hand from the formulas, tau_a = 300, tau_m = 600, Ssu = 1,200, Ssy = 1,000 MPa:
        ("goodman", 600.0),  # 300/(1 - 0.5)
        ("gerber", 400.0),  # 300/(1 - 0.25)
        ("asme-elliptic", 375.0),  # 300/sqrt(1 - 0.36)
        ("sines", 300.0),
    ],
)
def test_a_cycle_by_hand(name: str, tau_ar: float) -> None:
    got = criterion(name).equivalent(300 * MPa, 600 * MPa, 1200 * MPa, 1000 * MPa)
    assert got == pytest.approx(tau_ar * MPa, rel=1e-14)


@with_intercept
@given(ultimate, part, part, st.floats(1.0, 5.0))
def test_a_mean_at_or_past_the_intercept_is_a_static_failure(
    rule: Criterion, Ssu: float, y: float, a: float, past: float
) -> None:
    Ssu, Ssy, _ = strengths(Ssu, y, a)
    assert rule.equivalent(a * Ssu, past * limit(rule, Ssu, Ssy), Ssu, Ssy) == np.inf
    assert rule.allowable(past * limit(rule, Ssu, Ssy), a * Ssu, Ssu, Ssy) == 0


@each
@given(ultimate, part, part, part, part)
def test_the_equivalent_amplitude_rises_with_mean_and_amplitude(
    rule: Criterion, Ssu: float, y: float, a: float, m: float, more: float
) -> None:
    Ssu, Ssy, tau_a = strengths(Ssu, y, a)
    tau_m = m * limit(rule, Ssu, Ssy)
    here = rule.equivalent(tau_a, tau_m, Ssu, Ssy)
    assert here >= tau_a
    assert rule.equivalent(tau_a, tau_m * (1 + more), Ssu, Ssy) >= here
    assert rule.equivalent(tau_a * (1 + more), tau_m, Ssu, Ssy) > here


@each
@given(ultimate, part, part, part, st.sampled_from([1e-6, 1 / 6.894757293168361, 1e3]))
def test_every_stress_scaled_scales_the_result(
    rule: Criterion, Ssu: float, y: float, a: float, m: float, k: float
) -> None:
    Ssu, Ssy, Sse = strengths(Ssu, y, 0.5)
    tau_a, tau_m = a * Ssu, m * limit(rule, Ssu, Ssy)
    scaled = rule.equivalent(k * tau_a, k * tau_m, k * Ssu, k * Ssy)
    assert scaled == pytest.approx(k * rule.equivalent(tau_a, tau_m, Ssu, Ssy), rel=1e-9)
    factor = rule.safety_factor(tau_a, tau_m, Sse, Ssu, Ssy)
    assert rule.safety_factor(k * tau_a, k * tau_m, k * Sse, k * Ssu, k * Ssy) == pytest.approx(factor)


@each
@given(ultimate, part, part, part)
def test_factor_one_lies_on_the_allowable_line(rule: Criterion, Ssu: float, y: float, e: float, m: float) -> None:
    Ssu, Ssy, Sse = strengths(Ssu, y, e)
    tau_m = m * limit(rule, Ssu, Ssy)
    tau_a = rule.allowable(tau_m, Sse, Ssu, Ssy)
    assert rule.safety_factor(tau_a, tau_m, Sse, Ssu, Ssy) == pytest.approx(1.0, rel=1e-9)
    assert rule.equivalent(tau_a, tau_m, Ssu, Ssy) == pytest.approx(Sse, rel=1e-9)
    assert rule.reversed_strength(tau_a, tau_m, Ssu, Ssy) == pytest.approx(Sse, rel=1e-9)


@each
@given(ultimate, part, part, part, part, part)
def test_the_point_times_its_factor_lies_on_the_allowable_line(
    rule: Criterion, Ssu: float, y: float, e: float, a: float, m: float, i: float
) -> None:
    Ssu, Ssy, Sse = strengths(Ssu, y, e)
    tau_a, tau_m = a * Ssu, m * limit(rule, Ssu, Ssy)
    n = rule.safety_factor(tau_a, tau_m, Sse, Ssu, Ssy)
    # Near the intercept the line is steep: compare relative to Sse.
    assert n * tau_a == pytest.approx(rule.allowable(n * tau_m, Sse, Ssu, Ssy), abs=1e-6 * Sse)
    tau_i = i * tau_m
    n = rule.factor_fixed_preload(tau_a, tau_m, tau_i, Sse, Ssu, Ssy)
    on_line = rule.allowable(tau_i + n * (tau_m - tau_i), Sse, Ssu, Ssy)
    assert n * tau_a == pytest.approx(on_line, abs=1e-6 * Sse)


@given(ultimate, part, part, part)
def test_gerber_factor_equals_the_printed_closed_form(Ssu: float, e: float, a: float, m: float) -> None:
    # Shigley's Mechanical Engineering Design, ch. 6, Gerber fatigue factor (memory).
    Sse, tau_a, tau_m = 0.5 * e * Ssu, a * Ssu, m * Ssu
    root = np.sqrt(1 + (2 * tau_m * Sse / (Ssu * tau_a)) ** 2) - 1
    printed = 0.5 * (Ssu / tau_m) ** 2 * (tau_a / Sse) * root
    # The printed form cancels when the mean is small; ours does not.
    got = CRITERIA["gerber"].safety_factor(tau_a, tau_m, Sse, Ssu, 0.7 * Ssu)
    assert got == pytest.approx(printed, rel=1e-6)


@pytest.mark.parametrize(
    ("name", "factor"),
    [
        # By hand: tau_a 100, tau_m 300, preload 200, Sse 400, Ssu 1,000, Ssy 600 MPa.
        ("goodman", 0.8 / 0.35),  # n/4 + (0.2 + 0.1 n) = 1
        ("gerber", (-0.29 + np.sqrt(0.29**2 + 4 * 0.01 * 0.96)) / 0.02),  # n/4 + (0.2 + 0.1 n)^2 = 1
        (
            "asme-elliptic",
            (-16 + np.sqrt(16**2 + 4 * 13 * 128)) / 26,
        ),  # (n/4)^2 + ((2 + n)/6)^2 = 1, times 144
        ("sines", 4.0),
    ],
)
def test_factor_with_the_preload_held_by_hand(name: str, factor: float) -> None:
    rule = criterion(name)
    got = rule.factor_fixed_preload(100 * MPa, 300 * MPa, 200 * MPa, 400 * MPa, 1000 * MPa, 600 * MPa)
    assert got == pytest.approx(factor, rel=1e-12)


@with_intercept
def test_a_preload_past_the_intercept_leaves_no_factor(rule: Criterion) -> None:
    assert rule.factor_fixed_preload(10 * MPa, 1300 * MPa, 1250 * MPa, 400 * MPa, 1200 * MPa, 800 * MPa) == 0


@each
def test_without_stress_the_factor_is_infinite(rule: Criterion) -> None:
    assert rule.safety_factor(0, 0, 400 * MPa, 1200 * MPa, 800 * MPa) == np.inf
    assert yield_factor(0, 0, 800 * MPa) == np.inf


def test_yield_factor_by_hand() -> None:
    # Langer: 600/(100 + 200) = 2.
    assert yield_factor(100 * MPa, 200 * MPa, 600 * MPa) == pytest.approx(2.0)


@with_intercept
def test_no_strength_names_the_numbers(rule: Criterion) -> None:
    with pytest.raises(CriterionError, match=rf"{rule.name}.*600 MPa.*{rule.intercept} = 500 MPa"):
        rule.reversed_strength(300 * MPa, 600 * MPa, 500 * MPa, 500 * MPa)


def test_an_unknown_criterion_lists_the_known_ones() -> None:
    with pytest.raises(InputError, match=r"'geber' is not known; did you mean 'gerber'.*asme-elliptic"):
        criterion("geber")


@each
def test_a_scalar_gives_a_float(rule: Criterion) -> None:
    stresses = (100 * MPa, 200 * MPa)
    assert isinstance(rule.equivalent(*stresses, 1200 * MPa, 800 * MPa), float)
    assert isinstance(rule.reversed_strength(*stresses, 1200 * MPa, 800 * MPa), float)
    assert isinstance(rule.allowable(200 * MPa, 400 * MPa, 1200 * MPa, 800 * MPa), float)
    assert isinstance(rule.safety_factor(*stresses, 400 * MPa, 1200 * MPa, 800 * MPa), float)
    assert isinstance(yield_factor(*stresses, 800 * MPa), float)


@each
def test_arrays_and_series_give_what_each_element_gives(rule: Criterion) -> None:
    tau_a = np.array([50.0, 100.0, 200.0]) * MPa
    tau_m = np.array([0.0, 300.0, 900.0]) * MPa
    one_by_one = [rule.equivalent(a, m, 1200 * MPa, 800 * MPa) for a, m in zip(tau_a, tau_m, strict=True)]
    assert rule.equivalent(tau_a, tau_m, 1200 * MPa, 800 * MPa).tolist() == one_by_one
    a, m = pd.Series(tau_a, index=[7, 8, 9]), pd.Series(tau_m, index=[1, 2, 3])  # taken by position
    assert rule.equivalent(a, m, 1200 * MPa, 800 * MPa).tolist() == one_by_one
    factors = rule.safety_factor(a, m, 400 * MPa, 1200 * MPa, 800 * MPa)
    assert factors.shape == (3,) and np.all(np.diff(factors) < 0)


@each
def test_options_broadcast_over_cycles(rule: Criterion) -> None:
    Ssu = np.array([[1000.0], [1200.0]]) * MPa  # one row an option
    tau_a = np.array([50.0, 100.0, 200.0]) * MPa
    got = rule.equivalent(tau_a, 300 * MPa, Ssu, 0.7 * Ssu)
    assert got.shape == (2, 3)
    assert np.all(got[0] >= got[1])
