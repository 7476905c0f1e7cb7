"""The reader of published checks: rounding, units, and refusals."""

from __future__ import annotations

from pathlib import Path

import pytest

from springlife.errors import InputError
from springlife.published import Answer, load, tolerance

GOOD = """\
method = "sum"
source = "a book"
provenance = "memory"
[[check]]
id = "one"
inputs = { a = "1 in" }
printed = { length = "25.4 mm" }
"""


@pytest.mark.parametrize(
    ("printed", "half_of_last_digit"),
    [
        ("5.11", 0.005),
        ("281 Hz", 0.5),
        ("0.0586 lb", 5e-5),
        ("-0.50", 0.005),
        ("8.80e7", 5e4),
        ("324 kpsi", 0.5),
    ],
)
def test_tolerance_is_half_of_the_last_printed_digit(printed: str, half_of_last_digit: float) -> None:
    assert tolerance(printed) == half_of_last_digit


@pytest.mark.parametrize(
    ("si", "agrees"),
    # An inch is 25.4 mm exactly (ISO 31); printed "1.00 in" covers 0.995 to 1.005 in.
    [
        (0.0254, True),
        (0.995 * 0.0254, True),
        (1.005 * 0.0254, True),
        (0.9949 * 0.0254, False),
        (float("nan"), False),
    ],
)
def test_an_answer_agrees_within_its_rounding_in_its_own_unit(si: float, agrees: bool) -> None:
    assert Answer("length", "1.00 in", tolerance("1.00 in")).agrees(si) is agrees


def test_a_file_gives_its_method_and_source_to_its_checks(tmp_path: Path) -> None:
    (tmp_path / "good.toml").write_text(GOOD)
    (check,) = load(tmp_path)
    assert (check.id, check.method, check.source, check.provenance) == ("one", "sum", "a book", "memory")
    assert check.answers == (Answer("length", "25.4 mm", 0.05),)


def test_a_wider_tolerance_is_kept_with_its_reason(tmp_path: Path) -> None:
    wider = 'tolerance = { length = 0.2 }\ntolerance_reason = "the book rounds the inch"\n'
    (tmp_path / "good.toml").write_text(GOOD + wider)
    (check,) = load(tmp_path)
    assert check.answers[0].tolerance == 0.2 and check.tolerance_reason == "the book rounds the inch"


@pytest.mark.parametrize(
    ("find", "put", "message"),
    [
        ("inputs = ", "input = ", r"bad.toml: check\[1\].input is not known; did you mean 'inputs'"),
        ('id = "one"\n', "", r"check\[1\].id is missing"),
        ("[[check]]", 'sorce = "x"\n[[check]]', "'sorce' is not known; did you mean 'source'"),
        ('"memory"', '"hearsay"', "provenance 'hearsay'.*published"),
        ('"25.4 mm"', '"much"', "'much' is not a number"),
        ('"25.4 mm"', '"7/16 in"', "hides its last digit"),
        ('"25.4 mm" }', '"25.4 mm" }\ntolerance = { length = 1 }', "needs a tolerance_reason"),
        (
            '"25.4 mm" }',
            '"25.4 mm" }\ntolerance = { lenth = 1 }\ntolerance_reason = "r"',
            "belongs to no answer; did you mean 'length'",
        ),
    ],
)
def test_a_faulty_file_is_refused(find: str, put: str, message: str, tmp_path: Path) -> None:
    assert find in GOOD
    (tmp_path / "bad.toml").write_text(GOOD.replace(find, put))
    with pytest.raises(InputError, match=message):
        load(tmp_path)


def test_an_id_is_used_once(tmp_path: Path) -> None:
    for name in ("a.toml", "b.toml"):
        (tmp_path / name).write_text(GOOD)
    with pytest.raises(InputError, match="id 'one' is used twice"):
        load(tmp_path)


def test_an_answer_in_a_unit_that_measures_nothing_here_is_refused() -> None:
    with pytest.raises(InputError, match="'m\\^4' measures none of"):
        Answer("area", "1 m^4", 0.5).agrees(1.0)
