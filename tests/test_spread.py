"""Distributions of the scatter study: every printed row of the tolerance tables, and how a tolerance is read.

Rows: wire standards ASTM A228, A227/A229, A232/A401, A313 as a wire table prints them (diameters of A232
and A401 from memory); coil diameter and free length: Standard Handbook of Machine Design (memory).
"""

from __future__ import annotations

from importlib.resources import files
from pathlib import Path

import numpy as np
import pytest
from casefile import CASE, write_case

from springlife.errors import InputError
from springlife.life.case import load_case
from springlife.life.spread import (
    Spread,
    coil_half_range,
    defaults,
    length_half_range,
    spreads_of,
    tensile_share,
    wire_half_range,
)

INCH = 0.0254
WIRE = {
    "A228": [(0.003, None), (0.004, 2e-4), (0.010, 2e-4), (0.0101, 3e-4), (0.028, 3e-4), (0.029, 4e-4),
             (0.063, 4e-4), (0.064, 5e-4), (0.080, 5e-4), (0.081, 1e-3), (0.250, 1e-3), (0.256, None)],
    "A227": [(0.019, None), (0.020, 8e-4), (0.028, 8e-4), (0.029, 1e-3), (0.075, 1e-3), (0.076, 2e-3),
             (0.375, 2e-3), (0.376, 3e-3), (0.625, 3e-3), (0.63, None)],
    "A232": [(0.031, None), (0.032, 1e-3), (0.072, 1e-3), (0.073, 2e-3), (0.375, 2e-3), (0.376, None)],
    "A313": [(0.1, None)],
}  # fmt: skip
WIRE |= {"A229": WIRE["A227"], "A401": WIRE["A232"]}
INDEX = [4, 6, 8, 10, 12, 14, 16]
COIL = {
    0.035: ".002 .004 .006 .007 .009 .011 .013",
    0.051: ".003 .005 .007 .010 .012 .015 .017",
    0.076: ".004 .007 .010 .013 .016 .019 .022",
    0.114: ".006 .009 .013 .018 .021 .025 .029",
    0.171: ".008 .012 .017 .023 .028 .033 .038",
    0.250: ".011 .015 .021 .028 .035 .042 .049",
    0.375: ".016 .020 .026 .037 .046 .054 .064",
}
FREE_LENGTH = {
    1: ".011 .013 .015 .016 .017 .018 .019",
    4: ".016 .018 .021 .023 .024 .026 .027",
    8: ".019 .022 .024 .026 .028 .030 .032",
    16: ".022 .026 .029 .032 .034 .036 .038",
}
TENSILE_INCH = {
    "A228": "0.020: 350/387; 0.040: 315/349; 0.063: 293/324; 0.080: 282/312; 0.100: 271/300; 0.125: 261/288; "
            "0.162: 249/275; 0.192: 241/267; 0.250: 230/255",
    "A227": "0.080: 227/261; 0.135: 206/237; 0.250: 182/210",
    "A229": "0.080: 235/265; 0.135: 215/240; 0.250: 185/210",
    "A313": "0.020: 300/330; 0.041: 275/304; 0.063: 258/285; 0.075: 250/278",
}  # fmt: skip
TENSILE_MM = {
    "A232": "1: 1940/2100; 2: 1780/1930; 3: 1660/1800; 4: 1580/1720; 5: 1520/1640; 6: 1460/1600; "
            "8: 1400/1540; 10: 1360/1500; 12: 1320/1460"
}  # fmt: skip


@pytest.mark.parametrize(("grade", "inches", "half"), [(grade, *row) for grade, rows in WIRE.items() for row in rows])
def test_wire_diameter_rows(grade: str, inches: float, half: float | None) -> None:
    found, table = wire_half_range(grade, inches * INCH)
    assert found == (None if half is None else pytest.approx(half * INCH))
    assert (table == {}) == (half is None)


@pytest.mark.parametrize("wire", COIL)
def test_coil_diameter_rows(wire: float) -> None:
    printed = [float(value) * INCH for value in COIL[wire].split()]
    assert [coil_half_range(wire * INCH, C)[0] for C in INDEX] == pytest.approx(printed)


@pytest.mark.parametrize("pitch", FREE_LENGTH)
def test_free_length_rows(pitch: int) -> None:
    printed = [float(value) * 3 * INCH for value in FREE_LENGTH[pitch].split()]
    assert [length_half_range(3 * INCH, 3 * pitch, C)[0] for C in INDEX] == pytest.approx(printed)


@pytest.mark.parametrize(("unit", "rows"), [(INCH, TENSILE_INCH), (1e-3, TENSILE_MM)])
def test_tensile_rows(unit: float, rows: dict[str, str]) -> None:
    for grade, text in rows.items():
        for row in text.split("; "):
            d, low, high = (float(part) for part in row.replace(": ", "/").split("/"))
            share, table = tensile_share(grade, d * unit)
            assert share == pytest.approx((high - low) / (high + low)), (grade, d)
            assert grade in table["source"]


def test_between_rows_tables_are_read_on_straight_lines() -> None:
    """By hand: halfway between wires 0.035 and 0.051 and indices 4 and 6: mean of .002 .004 .003 .005."""
    assert coil_half_range(0.043 * INCH, 5)[0] == pytest.approx(0.0035 * INCH)
    assert length_half_range(INCH, 2.5, 5)[0] == pytest.approx((0.011 + 0.013 + 0.016 + 0.018) / 4 * INCH)


@pytest.mark.parametrize("place", [(0.03, 8), (0.4, 8), (0.1, 3.5), (0.1, 17)])
def test_outside_the_coil_table_there_is_no_value(place: tuple[float, float]) -> None:
    assert coil_half_range(place[0] * INCH, place[1])[0] is None


def test_every_default_names_source_and_provenance() -> None:
    def entries(node: object) -> list[dict[str, object]]:
        if isinstance(node, list):
            return [found for one in node for found in entries(one)] if node and isinstance(node[0], dict) else []
        if not isinstance(node, dict):
            return []
        inner = [found for one in node.values() for found in entries(one)]
        return inner or [node]

    for entry in entries(defaults()):
        assert entry["source"] and entry["provenance"] in {"published", "memory", "common practice"}


def test_a_tolerance_is_a_normal_cut_off_at_the_half_range() -> None:
    """Three sigmas: a third of the half-range at Phi(1); ends exactly at the half-range (normal tables)."""
    spread = Spread("d", "length", 2.0, "", "", half_range=0.3, sigmas=3.0)
    inside = 0.9973002039367398  # Phi(3) - Phi(-3)
    u = (0.8413447460685429 - 0.0013498980316301) / inside
    assert spread.values(np.array([0.0, 0.5, u, 1.0])) == pytest.approx([1.7, 2.0, 2.1, 2.3])


def test_a_factor_is_lognormal_about_its_median() -> None:
    """sd(ln) = sqrt(ln(1 + v^2)) for coefficient of variation v; Wirsching's 5 % value is 0.617."""
    spread = Spread("D", "number", 1.0, "", "", log_sd=float(np.sqrt(np.log(1.09))))
    assert spread.values(np.array([0.5]))[0] == 1.0
    assert spread.values(np.array([0.05, 0.01])) == pytest.approx([0.617, 0.505], abs=5e-4)


@pytest.mark.parametrize(
    ("table", "message"),
    [
        ('wire_diamter = { half_range = "0.02 mm" }', "wire_diamter: key 'wire_diamter' is not known; did"),
        ('wire_diameter = { half_range = "2 N" }', "wire_diameter.half_range: unit 'N' is not a length"),
        ('wire_diameter = { half_range = "0.02" }', "scatter.wire_diameter.half_range: '0.02' has no unit"),
        ("wire_diameter = { half_range = 0.02 }", "scatter.wire_diameter.half_range"),
        ('wire_diameter = { half_range = "0 mm" }', "scatter.wire_diameter.half_range"),
        ('wire_diameter = { half_range = "1 mm", share = 0.1 }', "exactly one of half_range and share"),
        ("free_length = { sigmas = 2 }", "scatter.free_length: give exactly one of half_range and share"),
        ("shear_modulus = { share = 0.7 }", "scatter.shear_modulus.share: 0.7 cannot be used"),
        ("life = { cov = 0.2 }", "scatter.life.cov: key 'cov' is not known"),
        ("life = { log10_sd = -1 }", "scatter.life.log10_sd: -1 cannot be used"),
        ("duty = { cov = nan }", "scatter.duty.cov"),
        ('off = ["alowed_damage"]', "off names 'alowed_damage', which is not known; did you mean 'allow"),
        ('off = ["life"]\nlife = { log10_sd = 0.1 }', "life is switched off and given a distribution"),
        ("samples = 1000", "samples is 1000; give a power of two from 1024 to 1048576"),
        ("samples = 512", "samples is 512; give a power of two"),
        ("seed = -1", "scatter: seed is -1; give a whole number from 0 up"),
        ('strengths_are = "B50"', "scatter.strengths_are: 'B50' is not known"),
    ],
)  # fmt: skip
def test_bad_overrides_are_refused_by_key_and_value(table: str, message: str, tmp_path: Path) -> None:
    with pytest.raises(InputError) as error:
        load_case(write_case(tmp_path, CASE + "[scatter]\n" + table + "\n", None))
    assert message in str(error.value) and "case.toml" in str(error.value)


def test_switching_everything_off_is_refused(tmp_path: Path) -> None:
    from springlife.life.scatter_input import VARIABLES

    text = CASE + f"[scatter]\noff = {list(VARIABLES)}\n"
    with pytest.raises(InputError, match="nothing scatters"):
        load_case(write_case(tmp_path, text, None))


def spread_of(folder: Path, name: str, *changes: tuple[str, str], table: str = "") -> Spread:
    text = CASE
    for find, put in changes:
        assert find in text
        text = text.replace(find, put)
    case = load_case(write_case(folder, text + table, None))
    return next(one for one in spreads_of(case, case.build_spring()) if one.name == name)


def test_a_case_takes_its_tables(tmp_path: Path) -> None:
    """A228 of 2 mm = 0.0787 in: +- 0.0005 in; index 8, coil table between 0.076 (.010) and 0.114 (.013)."""
    wire = spread_of(tmp_path, "wire_diameter")
    assert (wire.centre, wire.half_range) == pytest.approx((2e-3, 5e-4 * INCH))
    assert wire.sigmas == 3 and wire.provenance == "published" and "A228" in wire.source
    coil = spread_of(tmp_path, "coil_diameter")
    part = (2 / 25.4 - 0.076) / (0.114 - 0.076)
    assert (coil.centre, coil.half_range) == pytest.approx((16e-3, (0.010 + part * 0.003) * INCH))
    outer = spread_of(tmp_path, "coil_diameter", ('mean_diameter = "16 mm"', 'outer_diameter = "18 mm"'))
    assert outer.centre == pytest.approx(18e-3) and outer.half_range == pytest.approx(coil.half_range)


def test_wire_without_a_table_takes_a_share_and_says_so(tmp_path: Path) -> None:
    wire = spread_of(tmp_path, "wire_diameter", ('"A228"', '"A313"'))
    assert wire.half_range == pytest.approx(0.01 * 2e-3)
    assert wire.provenance == "common practice" and "no source" in wire.source


def test_the_damage_sum_scatters_about_what_the_case_allows(tmp_path: Path) -> None:
    """Wirsching: lognormal, median 1, coefficient of variation 0.3."""
    spread = spread_of(tmp_path, "allowed_damage", ("[judge]", "[judge]\nallowed_damage = 0.5"))
    assert spread.centre == 0.5 and spread.log_sd == pytest.approx(np.sqrt(np.log(1.09)))


def test_the_manuals_table_is_read(tmp_path: Path) -> None:
    manual = files("springlife").joinpath("manual/scatter.md").read_text(encoding="utf-8")
    table = manual.split("```toml\n")[1].split("```")[0]
    given = load_case(write_case(tmp_path, CASE + table, None)).input.scatter
    assert given.off == ["allowed_damage"] and given.strengths_are == "B10"
    tensile = spread_of(tmp_path, "tensile_strength", table=table)
    assert tensile.half_range == pytest.approx(70e6) and tensile.source == "the case file"
