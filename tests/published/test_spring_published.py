"""Springs against worked examples and tables of the literature: data/published/spring_*.toml."""

from __future__ import annotations

import pytest

from springlife.published import Answer, Check, load, tolerance
from springlife.spring.checks import METHODS

CHECKS = [check for check in load() if check.method in METHODS]
ANSWERS = [pytest.param(check, answer, id=f"{check.id}: {answer.name}") for check in CHECKS for answer in check.answers]


@pytest.mark.parametrize(("check", "answer"), ANSWERS)
def test_answer_agrees_with_the_printed_one(check: Check, answer: Answer) -> None:
    ours = METHODS[check.method](check.inputs)[answer.name]
    assert answer.agrees(ours), f"{answer.ours(ours)} against {answer.text}, {check.source}"


def test_every_method_has_a_published_check() -> None:
    assert {check.method for check in CHECKS} == set(METHODS)


@pytest.mark.parametrize("check", CHECKS, ids=lambda check: check.id)
def test_a_wider_tolerance_stays_within_what_the_books_round(check: Check) -> None:
    # The widest is the 0.2 % between the printed SI constants and the inch ones.
    for answer in check.answers:
        assert answer.tolerance <= max(tolerance(answer.text), 0.00205 * abs(answer.value))
