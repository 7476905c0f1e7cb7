"""Every published check agrees within half its last printed digit; the command says so and can fail."""

from __future__ import annotations

import json
from dataclasses import replace

import pytest

from springlife import published
from springlife.cli import main
from springlife.life.verify import METHODS, verify, verify_check
from springlife.published import Answer


@pytest.mark.parametrize("check", published.load(), ids=lambda check: check.id)
def test_published_check(check: published.Check) -> None:
    for row in verify_check(check):
        assert row.agrees, f"{row.answer.name}: printed {row.answer.text}, ours {row.ours}"


def test_every_method_is_used() -> None:
    assert {check.method for check in published.load()} == set(METHODS)


def test_a_wrong_answer_is_noticed() -> None:
    check = next(check for check in published.load() if check.id.startswith("ASTM E1049-85 5.4.4"))
    wrong = replace(check, answers=(Answer("range_3", "0.6", 0.05),))
    assert not verify_check(wrong)[0].agrees


def test_command(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["verify"]) == 0
    assert "agree" in capsys.readouterr().out
    assert main(["verify", "--json"]) == 0
    data = json.loads(capsys.readouterr().out)
    assert data["passed"] and data["recounts_agree"] == data["recounted_histories"] == 200


def test_recount_agrees_on_seeded_histories() -> None:
    result = verify()
    assert result.recounts_agree == result.recounted
