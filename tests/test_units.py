"""Quantities enter with a unit and leave with one; everything between is SI."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from springlife import units
from springlife.errors import InputError


@pytest.mark.parametrize(
    ("text", "kind", "si"),
    [
        # Exact by definition: international inch and pound (1959), standard gravity (CGPM 1901).
        ("1 in", "length", 0.0254),
        ("7/16 in", "length", 7 / 16 * 0.0254),
        ("4.5 mm", "length", 4.5e-3),
        ("1 lbf", "force", 0.45359237 * 9.80665),
        ("1 psi", "stress", 0.45359237 * 9.80665 / 0.0254**2),
        ("1 kpsi", "stress", 1e3 * 0.45359237 * 9.80665 / 0.0254**2),
        ("1 Mpsi", "stress", 1e6 * 0.45359237 * 9.80665 / 0.0254**2),
        ("1 lbf/in", "rate", 0.45359237 * 9.80665 / 0.0254),
        ("8.4 N/mm", "rate", 8400.0),
        ("20 degC", "temperature", 293.15),
        ("20 °C", "temperature", 293.15),
        ("68 degF", "temperature", 293.15),
        ("2.5 h", "time", 9000.0),
        ("600 rpm", "frequency", 10.0),
        ("7850 kg/m^3", "density", 7850.0),
        ("1e-3 m", "length", 1e-3),
        ("1.5", "number", 1.5),
    ],
)
def test_text_to_si(text: str, kind: str, si: float) -> None:
    assert units.parse(text, kind) == pytest.approx(si, rel=1e-12)


@pytest.mark.parametrize(
    ("text", "kind", "words"),
    [
        ("4.5", "length", "no unit"),
        ("4,5 mm", "length", "decimal comma"),
        ("4.5 N", "length", "not a length"),
        ("4.5 foo", "length", "not known"),
        ("nan mm", "length", "not a number with a unit"),
        ("1e999 mm", "length", "not finite"),
        ("1/0 in", "length", "divides by zero"),
        ("2 mm**9999", "length", "not a unit"),
        ("2 __import__('os')", "length", "not a unit"),
        ("1.5 mm", "number", "plain number"),
        (4.5, "length", "no unit"),
    ],
)
def test_what_is_refused_and_why(text: str, kind: str, words: str) -> None:
    with pytest.raises(InputError, match=words.replace("(", r"\(")):
        units.parse(text, kind)


@given(st.floats(1e-6, 1e6), st.sampled_from(["mm", "in", "m", "µm"]))
def test_there_and_back(number: float, unit: str) -> None:
    assert units.convert(units.parse(f"{number!r} {unit}", "length"), unit, "length") == pytest.approx(number)


@pytest.mark.parametrize(
    ("amount", "per", "passes"),
    [
        ("8000 h", "2.5 h", 3200.0),
        ("20000 rounds", "1 round", 20000.0),
        ("300000 km", "12 km", 25000.0),
        ("1 d", "1 h", 24.0),
        ("7 launches", "1 launch", 7.0),
        ("3 passes", "1 pass", 3.0),
    ],
)
def test_how_many_passes(amount: str, per: str, passes: float) -> None:
    assert units.ratio(amount, per) == pytest.approx(passes)


@pytest.mark.parametrize(
    ("amount", "per"), [("8000 h", "1 km"), ("10 starts", "1 stop"), ("1 h", "0 h"), ("5 km", "1 start")]
)
def test_amounts_that_do_not_compare(amount: str, per: str) -> None:
    with pytest.raises(InputError):
        units.ratio(amount, per)


@given(st.floats(1e-12, 1e12), st.integers(2, 8))
def test_significant_digits(number: float, digits: int) -> None:
    assert float(units.significant(number, digits)) == float(f"{number:.{digits}g}")


def test_rounding_up_to_the_next_power_of_ten() -> None:
    assert units.significant(99999.9) == "100000"
    assert units.significant(0.0) == "0"
    assert units.significant(math.inf) == "inf"


def test_the_drawing_decides_the_units_of_the_answer() -> None:
    assert units.system_of("0.105 in") is units.INCH
    assert units.system_of("2 mm") is units.METRIC
    assert units.INCH(0.0254, "length") == "1 in"
    assert units.METRIC(None, "length") == "unlimited"
