"""The band says which published choice moves the life most, one changed at a time."""

from __future__ import annotations

import pytest

from springlife.life.band import BandRow, greatest_mover

CHOSEN = {"criterion": "gerber", "endurance": "zimmerli", "miner": "haibach"}


def rows(**lives: float | None) -> list[BandRow]:
    """Lives with one choice changed from the chosen ones."""
    band = [BandRow("gerber", "zimmerli", "haibach", 100.0)]
    places = {"goodman": ("goodman", "zimmerli", "haibach"), "handbook": ("gerber", "handbook", "haibach"),
              "original": ("gerber", "zimmerli", "original")}  # fmt: skip
    return band + [BandRow(*places[name], life) for name, life in lives.items()]


@pytest.mark.parametrize(
    ("lives", "choice", "words"),
    [
        ({"goodman": 120.0, "handbook": 25.0, "original": 110.0}, "endurance", "zimmerli gives 4 times the life of handbook"),
        ({"goodman": 500.0, "handbook": 90.0}, "criterion", "goodman gives 5 times the life of gerber"),
        ({"goodman": 500.0, "original": None}, "miner", "finite by haibach, unlimited by original"),
        ({"goodman": 0.0}, "criterion", "no life at all by goodman, some by gerber"),
        ({"goodman": 100.0}, "criterion", "no published choice moves the life"),
    ],
)  # fmt: skip
def test_which_choice_moves_the_life_most(lives: dict[str, float | None], choice: str, words: str) -> None:
    mover = greatest_mover(rows(**lives), **CHOSEN)
    assert mover is not None
    assert mover.choice == choice and words in mover.sentence()


def test_choices_changed_together_do_not_count() -> None:
    band = [*rows(goodman=200.0), BandRow("goodman", "handbook", "original", 1.0)]
    mover = greatest_mover(band, **CHOSEN)
    assert mover is not None and mover.factor == 2.0


def test_withheld_lives_do_not_count() -> None:
    band = [*rows(goodman=200.0), BandRow("sines", "zimmerli", "haibach", None, "no value")]
    mover = greatest_mover(band, **CHOSEN)
    assert mover is not None and mover.longest.criterion == "goodman"


def test_one_life_alone_has_no_mover() -> None:
    assert greatest_mover(rows(), **CHOSEN) is None
