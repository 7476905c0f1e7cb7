"""Wire grades: names, tables with their borders, sources, and files of grades that people add."""

from __future__ import annotations

import math
from importlib.resources import files
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from springlife.errors import FileError, InputError
from springlife.spring.grade import Grade, WireRangeError, grade, grades

INCH, KPSI, MPSI = 0.0254, 6894.757293168361e3, 6894.757293168361e6
every = pytest.mark.parametrize("one", grades().values(), ids=grades())

OWN = """\
[X70]
title = "special wire"
ferrous = true
cyclic_family = "alloy"
[X70.tensile]
segments = [
    { A = "1855 MPa", at = "1 mm", m = 0.187, from = "0.5 mm", to = "4 mm" },
    { A = "147 kpsi", at = "1 in", m = 0.187, from = "4 mm", to = "12 mm" },
]
source = "maker's sheet"
[X70.moduli]
segments = [{ to = "2 mm", E = "206 GPa", G = "79 GPa" }, { E = "203 GPa", G = "78 GPa" }]
source = "maker's sheet"
[X70.static]
before = 0.5
after = [0.65, 0.75]
source = "maker's sheet"
[X70.temperature]
greatest = "250 degC"
source = "maker's sheet"
[X70.density]
value = "7.85 g/cm^3"
source = "maker's sheet"
[X70.cost]
relative = 5
source = "offer"
provenance = "certificate"
"""
TENSILE = OWN[OWN.index("[X70.tensile]") : OWN.index("[X70.moduli]")]
DIRECT = OWN.replace(
    TENSILE,
    '[X70.tensile_strength]\nvalue = "1700 MPa"\nmin = "1.62 GPa"\nmax = "1780 MPa"\nsource = "certificate 17"\n',
)


def own_file(folder: Path, text: str) -> Path:
    (folder / "mine.toml").write_text(text, encoding="utf-8")
    return folder / "mine.toml"


@pytest.mark.parametrize("name", ["A228", "a228", "ASTM A228", "astm-a228", " A 228 "])
def test_a_grade_answers_to_its_spellings(name: str) -> None:
    assert grade(name).title == "music wire"


def test_the_grades_of_the_method_are_all_there() -> None:
    assert list(grades()) == ["A228", "A229", "A227", "A232", "A401", "A313", "B159"]


def test_an_unknown_grade_names_the_nearest_and_lists_all() -> None:
    with pytest.raises(InputError, match=r"'A4011' is not known; did you mean 'A401'.*A228.*B159"):
        grade("A4011")


def test_a_grade_that_is_not_text_is_an_input_error() -> None:
    with pytest.raises(InputError, match="grade 228 is not known"):
        grade(228)  # type: ignore[arg-type]


@every
def test_every_number_of_the_package_has_source_and_provenance(one: Grade) -> None:
    groups = ("tensile", "moduli", "static", "temperature", "density", "cost")
    assert [line.split(":")[0] for line in one.sources] == list(groups)
    assert all(line.endswith(("(published)", "(memory)", "(common practice)")) for line in one.sources)


@every
def test_nothing_is_extrapolated(one: Grade) -> None:
    low, high = one.diameter_range
    assert one.tensile_strength(low) > 0 and one.tensile_strength(high) > 0
    for d in (0.999 * low, 1.001 * high):
        with pytest.raises(WireRangeError, match=rf"mm \(.* in\) is outside the table of {one.name}.*tensile_strength"):
            one.tensile_strength(d)


def test_the_refusal_says_the_range_in_both_units() -> None:
    with pytest.raises(WireRangeError, match=r"7 mm \(0.2756 in\).*0.1016 mm \(0.004 in\) to 6.5024 mm \(0.256 in\)"):
        grade("A228").tensile_strength(7e-3)


@every
def test_strength_falls_with_diameter_inside_each_segment(one: Grade) -> None:
    # Limiting case of Sut = A/d^m: equal for m = 0, falling for m > 0, and A itself at d = `at`.
    for segment in one.tensile:
        thin, thick = segment(segment.low), segment(segment.high)
        assert thick < thin if segment.m else thick == thin
        assert segment(segment.at) == segment.A


@pytest.mark.parametrize(
    ("border", "A", "m"),
    # Shigley's Mechanical Engineering Design, table 10-4 (memory): the thinner segment's constants at its border.
    [(0.10, 169, 0.146), (0.20, 128, 0.263)],
)
def test_at_a_shared_border_the_thinner_segment_holds(border: float, A: float, m: float) -> None:
    expected = A * KPSI / border**m
    # The same length as inches give it, as millimetres give it, and with a rounding error above.
    for d in (border * INCH, border * 25.4 / 1000, math.nextafter(border * INCH, 1)):
        assert grade("A313").tensile_strength(d) == pytest.approx(expected, rel=1e-12)
    assert grade("A313").tensile_strength(border * INCH * 1.0001) < 0.999 * expected


def test_moduli_step_at_their_borders() -> None:
    # Shigley's table 10-5 (seen): music wire up to 0.032 in 12.0 Mpsi, to 0.063 in 11.85 Mpsi.
    wire = grade("A228")
    assert wire.moduli(0.032 * INCH)[1] == pytest.approx(12.0 * MPSI, rel=1e-12)
    assert wire.moduli(0.0321 * INCH)[1] == pytest.approx(11.85 * MPSI, rel=1e-12)
    assert wire.moduli(1.0)[1] == pytest.approx(11.6 * MPSI, rel=1e-12)


@pytest.mark.parametrize(
    ("d", "least"),
    # Least tensile strength in kpsi of the wire standard's own table for A228 (seen).
    [(0.020, 350), (0.040, 315), (0.063, 293), (0.080, 282), (0.100, 271), (0.125, 261), (0.162, 249), (0.192, 241),
     (0.250, 230)],
)  # fmt: skip
def test_the_fit_of_music_wire_lies_one_to_seven_percent_above_the_standards_minimum(d: float, least: float) -> None:
    assert 1.01 <= grade("A228").tensile_strength(d * INCH) / (least * KPSI) <= 1.07
    assert "1 to 7 %" in grade("A228").note


@every
def test_elastic_constants_are_those_of_a_solid(one: Grade) -> None:
    # Poisson's ratio E/(2G) - 1 of a metal lies between 0.2 and 0.45.
    for moduli in one.moduli_by_size:
        assert 0.2 < moduli.E / (2 * moduli.G) - 1 < 0.45


def test_a_grades_file_in_si_and_in_inches(tmp_path: Path) -> None:
    file = own_file(tmp_path, OWN)
    wire = grade("x70", file)
    assert list(grades(file)) == [*grades(), "X70"]
    # By hand from the file's constants.
    assert wire.tensile_strength(2e-3) == pytest.approx(1855e6 / 2**0.187, rel=1e-12)
    assert wire.tensile_strength(0.3 * INCH) == pytest.approx(147 * KPSI / 0.3**0.187, rel=1e-12)
    assert wire.moduli(1e-3) == (206e9, 79e9) and wire.moduli(9e-3) == (203e9, 78e9)
    assert wire.density == pytest.approx(7850) and wire.greatest_temperature == pytest.approx(523.15)
    assert wire.relative_cost == 5 and wire.cyclic_family == "alloy" and wire.ferrous and not wire.stainless
    assert wire.sources[0] == "tensile: maker's sheet (certificate)"


def test_a_strength_given_directly_holds_for_every_diameter(tmp_path: Path) -> None:
    wire = grade("X70", own_file(tmp_path, DIRECT))
    assert [wire.tensile_strength(d) for d in (1e-4, 1e-2)] == [1700e6, 1700e6]
    assert wire.tensile_bounds == (1620e6, 1780e6)
    assert wire.diameter_range == (0, math.inf)
    assert "1620 MPa to 1780 MPa" in "\n".join(wire.describe())
    assert wire.to_dict()["tensile"][0]["to_m"] is None


@pytest.mark.parametrize(
    ("find", "put", "message"),
    [
        ("title", "titel", r"mine.toml: X70.titel is not a known key; did you mean 'title'"),
        ('title = "special wire"\n', "", r"X70.title is missing; write text"),
        ("ferrous = true", 'ferrous = "yes"', r"X70.ferrous is 'yes'; write true or false"),
        ("ferrous = true", "ferrous = true\nstainless = 1", r"X70.stainless is 1; write true or false"),
        ("m = 0.187, from = \"0.5", "m = 1.87, from = \"0.5", r"tensile.segments\[1\].m is 1.87; .*0 to 0.99"),
        ("m = 0.187, from = \"0.5", "m = nan, from = \"0.5", r"tensile.segments\[1\].m is nan"),
        ('"1855 MPa"', '"1855"', r"X70.tensile.segments\[1\].A: '1855' has no unit"),
        ('"1855 MPa"', '"1855 mm"', r"segments\[1\].A: unit 'mm' is not a stress"),
        ('"1855 MPa"', "1855", r"segments\[1\].A is 1855; write text"),
        ('"1855 MPa"', '"-1855 MPa"', r"segments\[1\].A is '-1855 MPa'; it must be above zero"),
        ('to = "4 mm"', 'to = "0.4 mm"', r"segments\[1\].to is '0.4 mm'; it must be above from '0.5 mm'"),
        ('from = "4 mm"', 'from = "5 mm"', r"segments\[2\].from is '5 mm'; it must be where the segment before ends"),
        ('G = "79 GPa"', 'G = "790 GPa"', r"moduli.segments\[1\].G is '790 GPa'; it must be below E '206 GPa'"),
        ('{ to = "2 mm", E', "{ E", r"moduli.segments\[1\].to is missing; the last segment has no 'to'"),
        ('{ E = "203', '{ to = "9 mm", E = "203', r"moduli.segments\[2\].to is '9 mm'; the last segment"),
        ("before = 0.5", "before = 50", r"X70.static.before is 50; write a number from 0.01 to 1"),
        ("after = [0.65, 0.75]", "after = [0.75, 0.65]", r"static.after is \[0.75, 0.65\]; .*from 0.5 to 1"),
        ("after = [0.65, 0.75]", "after = 0.65", r"static.after is 0.65; .*lower and upper end"),
        ("[0.65, 0.75]\nsource", "[0.65, 0.75]\nsorce", r"static.sorce is not a known key; did you mean 'source'"),
        ('"certificate"', '"hearsay"', r"cost.provenance is 'hearsay'; valid: published"),
        ("relative = 5", "relative = inf", r"cost.relative is inf"),
        ('[X70.density]\nvalue = "7.85 g/cm^3"\nsource = "maker\'s sheet"\n', "", "X70.density is missing; write it as a table"),
        (TENSILE, "", "X70: give exactly one of tensile and tensile_strength"),
        ("[X70.cost]", '[X70.tensile_strength]\nvalue = "1 GPa"\nsource = "x"\n[X70.cost]', "give exactly one of tensile and"),
        ("[X70", "[A228", "grade 'A228' is in the package already; give yours a name of its own"),
        ("[X70", "[[X70", "mine.toml: not valid TOML"),
    ],
)  # fmt: skip
def test_a_faulty_file_is_refused_with_its_place(find: str, put: str, message: str, tmp_path: Path) -> None:
    assert find in OWN
    with pytest.raises(InputError, match=message):
        grades(own_file(tmp_path, OWN.replace(find, put)))


@pytest.mark.parametrize(
    ("find", "put", "message"),
    [
        ('min = "1.62 GPa"\n', "", "X70.tensile_strength: give both min and max, or neither"),
        ('"1.62 GPa"', '"1.72 GPa"', "value is '1700 MPa'; it must lie from min '1.72 GPa' to max '1780 MPa'"),
        ("max", "maximum", "tensile_strength.maximum is not a known key; did you mean 'max'"),
    ],
)
def test_a_faulty_direct_strength_is_refused(find: str, put: str, message: str, tmp_path: Path) -> None:
    with pytest.raises(InputError, match=message):
        grades(own_file(tmp_path, DIRECT.replace(find, put)))


def test_a_file_that_is_not_there_or_not_text(tmp_path: Path) -> None:
    with pytest.raises(FileError, match=r"none.toml: cannot be read"):
        grades(tmp_path / "none.toml")
    (tmp_path / "bytes.toml").write_bytes(b"\xff\xfe")
    with pytest.raises(InputError, match="byte 0 is not UTF-8"):
        grades(tmp_path / "bytes.toml")


def test_the_manuals_grades_file_is_read(tmp_path: Path) -> None:
    manual = files("springlife").joinpath("manual/spring.md").read_text(encoding="utf-8")
    example = manual.split("```toml\n")[1].split("```")[0]
    assert grade("X70", own_file(tmp_path, example)).density == 7850


def test_a_changed_file_is_read_anew(tmp_path: Path) -> None:
    assert grade("X70", own_file(tmp_path, OWN)).relative_cost == 5
    assert grade("X70", own_file(tmp_path, OWN.replace("relative = 5", "relative = 6"))).relative_cost == 6


@given(st.text(max_size=8), st.text(max_size=8))
def test_any_text_in_a_file_is_read_or_refused_in_one_sentence(tail: str, value: str) -> None:
    from springlife.spring.grade_file import read_grades

    text = OWN.replace("special wire", value) + tail
    try:
        assert list(read_grades(text, "mine.toml"))
    except InputError as error:
        assert str(error).startswith("mine.toml: ")


@every
def test_description_and_json_hold_the_printed_facts(one: Grade) -> None:
    text = "\n".join(one.describe())
    assert one.title in text and one.standard in text and one.sources[0] in text
    data = one.to_dict()
    assert data["name"] == one.name and len(data["tensile"]) == len(one.tensile)
    assert data["moduli"][-1]["to_m"] is None  # infinity is not JSON
