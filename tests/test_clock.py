"""The time column: what counts as a gap, and the rate. Expected values follow from how each clock is made."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from springlife.duty.clock import Break, Clock


def feed(times: np.ndarray, size: int = 1 << 20) -> tuple[Clock, list[Break]]:
    """Feed times in blocks; the breaks' indices count from the start of all."""
    clock, found = Clock(), []
    for start in range(0, times.size, size):
        found += [Break(b.index + start, b.kind, b.what) for b in clock.feed(times[start : start + size])]
    return clock, found


def kinds(found: list[Break]) -> list[tuple[int, str]]:
    return [(b.index, b.kind) for b in found]


def test_an_even_clock_has_no_breaks() -> None:
    clock, found = feed(np.arange(1000) / 250.0)
    assert found == [] and clock.rate == pytest.approx(250.0) and clock.span == pytest.approx(999 / 250)


def test_jitter_under_half_an_interval_is_no_gap() -> None:
    rng = np.random.default_rng(3)
    clock, found = feed(np.arange(5000) * 0.01 + rng.uniform(-0.0024, 0.0024, 5000))
    assert found == [] and clock.rate == pytest.approx(100.0, rel=1e-3)


@given(st.sets(st.integers(2, 198), min_size=1, max_size=12))
@settings(max_examples=80, deadline=None)
def test_every_missing_row_is_found(lost: set[int]) -> None:
    kept = np.array([n for n in range(200) if n not in lost])
    _, found = feed(kept / 100.0)
    expected = [i for i in range(1, kept.size) if kept[i] - kept[i - 1] > 1]
    assert kinds(found) == [(i, "jump") for i in expected]


@pytest.mark.parametrize("size", [7, 50, 1 << 20])
def test_breaks_do_not_depend_on_the_blocks(size: int) -> None:
    times = np.concatenate([np.arange(100), np.arange(150, 260), np.arange(30, 60), [59.0], np.arange(60, 90)])
    clock, found = feed(times, size)
    assert kinds(found) == [(100, "jump"), (210, "back"), (240, "repeat")]
    assert (clock.breaks, clock.repeats) == (2, 1)
    assert clock.rate == pytest.approx(1.0)


def test_a_missing_time_is_a_break() -> None:
    times = np.arange(20.0)
    times[7] = np.nan
    clock, found = feed(times)
    # the step over the missing time is twice the usual one
    assert kinds(found) == [(7, "missing"), (8, "jump")] and clock.breaks == 2


def test_a_slower_rate_is_one_break_not_one_a_row() -> None:
    times = np.concatenate([np.arange(500) * 0.01, 5.0 + np.arange(1, 400) * 0.02])
    _, found = feed(times)
    assert kinds(found) == [(500, "rate")]
    assert "changes for good from 0.01 s at 4.99 s" in found[0].what


def test_a_faster_rate_is_one_break() -> None:
    times = np.concatenate([np.arange(500) * 0.01, 4.99 + np.arange(1, 400) * 0.005])
    _, found = feed(times)
    assert kinds(found) == [(500, "rate")]


def test_stamps_rounded_more_coarsely_than_the_rate_are_no_gaps() -> None:
    # 2 kHz stamped in whole milliseconds: every stamp occurs twice
    clock, found = feed(np.floor(np.arange(4000) / 2000 * 1000) / 1000)
    assert found == [] and clock.rounded_to == pytest.approx(0.001)
    assert clock.rate == pytest.approx(2000, rel=1e-3)


def test_stamps_rounded_near_the_rate_are_no_gaps() -> None:
    # 700 Hz in whole milliseconds: intervals of 1 and 2 ms in turn
    clock, found = feed(np.floor(np.arange(4000) / 700 * 1000) / 1000)
    assert found == [] and clock.rate == pytest.approx(700, rel=1e-3)


def test_a_gap_in_rounded_stamps_is_still_found() -> None:
    times = np.floor(np.arange(4000) / 2000 * 1000) / 1000
    _, found = feed(np.concatenate([times, 3.0 + times]), 4000)
    assert kinds(found) == [(4000, "jump")]


def test_missing_rows_are_not_taken_for_rounding() -> None:
    # 1 kHz in whole milliseconds with rows lost at random: the stamps leave the straight line
    rng = np.random.default_rng(11)
    kept = np.flatnonzero(rng.random(4000) > 0.01)
    _, found = feed(kept / 1000.0)
    assert len(found) == np.count_nonzero(np.diff(kept) > 1)


def test_equal_times_throughout_have_no_rate() -> None:
    clock, found = feed(np.zeros(5))
    assert clock.rate is None and kinds(found) == [(n, "repeat") for n in range(1, 5)]


@given(st.floats(1e-6, 1e6))
@settings(max_examples=50, deadline=None)
def test_breaks_do_not_depend_on_the_unit_of_time(factor: float) -> None:
    times = np.concatenate([np.arange(100.0), np.arange(120.0, 200.0)])
    clock, found = feed(times * factor)
    assert kinds(found) == [(100, "jump")]
    assert clock.rate == pytest.approx(1 / factor)
