"""Published examples and tables of strength, each within half of its last printed digit."""

from __future__ import annotations

import pytest

from springlife.errors import CriterionError
from springlife.published import Answer, Check, load
from springlife.strength.checks import METHODS
from springlife.strength.criteria import criterion
from springlife.strength.curve import endurance_curve

ANSWERS = [
    pytest.param(check, answer, id=f"{check.id}: {answer.name}")
    for check in load()
    if check.method in METHODS
    for answer in check.answers
]


def test_the_table_is_read() -> None:
    # 2 x 6 conversions by two criteria, six of them by the ellipse, and the examples.
    assert len(ANSWERS) > 60


@pytest.mark.parametrize(("check", "answer"), ANSWERS)
def test_a_published_answer(check: Check, answer: Answer) -> None:
    ours = METHODS[check.method](check.inputs)[answer.name]
    assert answer.agrees(ours), f"{answer.ours(ours):.6g} against printed {answer.text} ({check.source})"


def test_a_wrong_answer_is_seen() -> None:
    check, answer = ANSWERS[0].values
    ours = METHODS[check.method](check.inputs)[answer.name]
    assert not answer.agrees(1.02 * ours)


@pytest.mark.parametrize("Sut", [150.0, 172.0])
def test_the_ellipse_has_no_value_for_peened_wire_up_to_172_kpsi(Sut: float) -> None:
    # Derived: 0.45 x 172 = 77.4 kpsi, under Zimmerli's peened mean of 77.5.
    kpsi = 6894757.293168361
    with pytest.raises(CriterionError, match="asme-elliptic has no fully reversed strength"):
        endurance_curve(
            "zimmerli", criterion("asme-elliptic"), shot_peened=True, family=None,
            Sut=Sut * kpsi, Ssu=0.67 * Sut * kpsi, Ssy=0.45 * Sut * kpsi,
        )  # fmt: skip


def test_above_the_pairs_ratio_goodman_is_kinder_than_gerber_and_below_it_harsher() -> None:
    # Derived: both lines pass through Zimmerli's point, Goodman straight and Gerber bowed.
    load_line = METHODS["fatigue factor on the load line"]
    steep, flat = (
        load_line({"tau_a": a, "tau_m": m, "Ssu": "190 kpsi", "shot_peened": False})
        for a, m in (("45 kpsi", "55 kpsi"), ("25 kpsi", "55 kpsi"))
    )
    assert steep["goodman_nf"] > steep["gerber_nf"]
    assert flat["goodman_nf"] < flat["gerber_nf"]
