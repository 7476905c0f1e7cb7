"""Figures: what they show is what was computed, they carry values on hover, and any text can stand in them."""

from __future__ import annotations

import warnings
from pathlib import Path
from xml.etree import ElementTree

import numpy as np
import pytest
from casefile import write_case
from hypothesis import given
from hypothesis import strategies as st
from test_findings import QUIET

from springlife.life.assess import assess
from springlife.report import drawing, figures, figures_band, figures_counts, figures_damage, figures_history
from springlife.report.output import svg_of
from springlife.report.style import MISSING, drawable
from springlife.spring.helical import ENDS, HelicalSpring

SEAT = Path(__file__).parent.parent / "loadcases" / "forwarder-seat" / "case.toml"
DRAWN = {
    "haigh": figures.haigh,
    "life curve": figures_damage.life_curve,
    "by event": figures_damage.by_event,
    "by range": figures_damage.by_range,
    "from to": figures_counts.from_to,
    "exceedance": figures_counts.exceedance,
    "crossings": figures_counts.crossings,
    "band": figures_band.life_band,
    "drawing": drawing.spring_drawing,
}


@pytest.fixture(scope="module")
def seat():
    return assess(SEAT)


@pytest.mark.parametrize("name", DRAWN)
def test_every_figure_is_the_same_small_well_formed_file_twice(name: str, seat) -> None:
    once, again = svg_of(DRAWN[name](seat)), svg_of(DRAWN[name](seat))
    assert once == again
    ElementTree.fromstring(once)
    assert len(once) < 200_000


def test_axes_name_their_units(seat) -> None:
    for name, draw in DRAWN.items():
        for axes in draw(seat).axes:
            if name != "drawing" and axes.get_label() != "<colorbar>" and axes.get_xlabel():
                words = f"{axes.get_xlabel()} {axes.get_ylabel()}"
                assert any(unit in words for unit in ("mm", "MPa", " h", "%", "cycles")), (name, words)


def test_hover_tells_the_share_that_was_computed(seat) -> None:
    largest = max(seat.judgement.events, key=lambda event: event.share)
    assert f"{largest.name}: {100 * largest.share:.1f} % of the damage" in svg_of(figures_damage.by_event(seat))


@given(
    ends=st.lists(st.tuples(st.integers(0, 9), st.integers(1, 9), st.integers(1, 5)), min_size=1, max_size=12),
    levels=st.lists(st.integers(-1, 20), min_size=1, max_size=8),
)
def test_risings_are_counted_one_by_one(ends: list[tuple[int, int, int]], levels: list[int]) -> None:
    """Against the definition, cycle by cycle."""
    low = np.array([float(a) for a, _, _ in ends])
    high = low + np.array([float(b) for _, b, _ in ends])
    count = np.array([float(n) for _, _, n in ends])
    expected = [sum(n for a, b, n in zip(low, high, count, strict=True) if a < level <= b) for level in levels]
    assert figures_counts.risings(low, high, count, np.array(levels, float)).tolist() == expected


def test_classes_of_range_hold_everything_once(seat) -> None:
    j = seat.judgement
    rows = figures_damage.range_classes(j)
    assert sum(row[2] for row in rows) == pytest.approx(float(j.cycles.count.sum()), rel=1e-12)
    assert sum(row[3] for row in rows) == pytest.approx(j.damage_per_pass, rel=1e-12)


def test_a_history_shows_the_record_in_deflection(seat) -> None:
    """The greatest deflection drawn is the one that the duty reports; the programme has no history."""
    event = max(seat.duty.events, key=lambda one: one.count.maximum)
    axes = figures_history.history(seat, event).axes[0]
    highest = max(line.get_ydata()[0] for line in axes.lines if line.get_marker() == "o")
    assert highest == pytest.approx(1e3 * seat.duty.extremes(seat.judgement.spring)[1])


def test_a_programme_has_no_history(tmp_path: Path) -> None:
    result = assess(write_case(tmp_path, QUIET, None))
    with pytest.raises(ValueError, match="specified programme"):
        figures_history.history(result, result.duty.events[0])


@pytest.mark.parametrize("ends", ENDS)
def test_drawn_coils_lie_on_one_another_at_the_solid_length(ends: str) -> None:
    """At solid the centre of the wire rises by one wire diameter a turn, whatever the ends: wires touch."""
    spring = HelicalSpring(
        grade="A228", wire_diameter=2e-3, mean_diameter=16e-3, total_coils=9, free_length=60e-3, ends=ends
    )
    turns = np.arange(0.0, 9.5)
    z = drawing.heights(spring, turns, spring.solid_length, 2e-3)
    assert np.diff(z) == pytest.approx(np.full(9, 2e-3), rel=1e-9)
    free = drawing.heights(spring, turns, spring.free_length, 2e-3)
    assert np.diff(free).min() > 2e-3 * (1 - 1e-9)


NAMES = ["$x^2$", "_hidden", "<script>alert(1)</script>", "衝撃", "שלום", "a" * 300, r"\frac{1", "#import", "a & b"]


@pytest.mark.parametrize("name", NAMES)
def test_any_name_can_stand_in_a_figure(name: str, tmp_path: Path) -> None:
    text = QUIET.replace('"work"', "'" + name + "'")
    result = assess(write_case(tmp_path, text, None))
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        svg = svg_of(figures_damage.by_event(result))
    ElementTree.fromstring(svg)
    assert "<script" not in svg


def test_a_character_without_a_shape_is_replaced() -> None:
    assert drawable("a衝b") == f"a{MISSING}b"
    assert drawable("x" * 50, 10) == "x" * 9 + "…"
