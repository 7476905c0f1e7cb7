"""Waves in the coils against their closed forms: data/published/surge_waves.toml."""

from __future__ import annotations

import pytest

from springlife.published import Answer, Check, load
from springlife.spring.surge_checks import METHODS

CHECKS = [check for check in load() if check.method in METHODS]
ANSWERS = [pytest.param(check, answer, id=f"{check.id}: {answer.name}") for check in CHECKS for answer in check.answers]


@pytest.mark.parametrize(("check", "answer"), ANSWERS)
def test_answer_agrees_with_the_closed_form(check: Check, answer: Answer) -> None:
    ours = METHODS[check.method](check.inputs)[answer.name]
    assert answer.agrees(ours), f"{answer.ours(ours)} against {answer.text}, {check.source}"


def test_every_method_has_a_check() -> None:
    assert {check.method for check in CHECKS} == set(METHODS)
