"""The record at a glance: gathered block by block, whatever the blocks. Values derived by hand."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from springlife.duty.summary import LEVELS, RecordSummary, SummaryAccumulator


def summary(samples: np.ndarray, size: int = 1 << 20) -> RecordSummary:
    gathered = SummaryAccumulator()
    for start in range(0, samples.size, size):
        gathered.feed(samples[start : start + size])
    return gathered.result()


def longest_run(samples: np.ndarray, value: float) -> int:
    best = run = 0
    for sample in samples:
        run = run + 1 if sample == value else 0
        best = max(best, run)
    return best


small = st.sampled_from([-2.0, -1.0, 0.0, 1.0, 3.0, np.nan])


@given(arrays(np.float64, st.integers(1, 60), elements=small), st.integers(1, 20))
@settings(max_examples=300, deadline=None)
def test_against_the_whole_record_at_once(samples: np.ndarray, size: int) -> None:
    known = samples[~np.isnan(samples)]
    if not known.size:
        return
    seen = summary(samples, size)
    assert seen.samples == known.size
    assert (seen.minimum, seen.maximum) == (known.min(), known.max())
    assert seen.minimum_at == np.flatnonzero(samples == known.min())[0]
    assert seen.maximum_at == np.flatnonzero(samples == known.max())[0]
    assert seen.longest_at_minimum == longest_run(samples, known.min())
    assert seen.longest_at_maximum == longest_run(samples, known.max())
    assert seen.mean == pytest.approx(known.mean())
    assert seen.levels == np.unique(known).size
    assert seen.negative_share == pytest.approx((known < 0).mean())
    steps = np.diff(np.unique(known))
    assert seen.resolution == (steps.min() if steps.size else None)


@pytest.mark.parametrize("size", [17, 64, 1000, 1 << 20])
def test_blocks_do_not_matter(size: int) -> None:
    samples = np.random.default_rng(5).normal(size=20_000).round(2) + np.linspace(0, 3, 20_000)
    whole, parts = summary(samples).to_dict(), summary(samples, size).to_dict()
    assert parts.pop("mean") == pytest.approx(whole.pop("mean"))
    assert parts.pop("resolution") > 0 and whole.pop("resolution") > 0  # of the levels seen until there were too many
    assert parts == whole


def test_a_drift_of_the_minimum_is_seen_through_the_motion() -> None:
    # a ramp of 3 mm under a motion of 20 mm: the minimum moves by 3 mm
    n = np.arange(100_000)
    samples = 0.01 * np.sin(2 * np.pi * n / 37.0) + 0.003 * n / n.size
    assert summary(samples).drift == pytest.approx(0.003, rel=0.02)


def test_no_drift_in_a_steady_motion() -> None:
    samples = 0.01 * np.sin(2 * np.pi * np.arange(100_000) / 37.0)
    assert summary(samples).drift == pytest.approx(0.0, abs=1e-5)


def test_one_deep_stroke_is_no_drift() -> None:
    samples = 0.01 * np.sin(2 * np.pi * np.arange(100_000) / 37.0)
    samples[40_000:42_000] -= 0.05
    assert summary(samples).drift == pytest.approx(0.0, abs=1e-5)


def test_counts_of_a_converter_show_their_step() -> None:
    counts = np.random.default_rng(2).integers(-20, 21, 50_000)
    seen = summary(counts * 0.25)
    assert (seen.levels, seen.resolution) == (41, 0.25)


def test_many_levels_are_not_counted() -> None:
    seen = summary(np.arange(LEVELS + 1.0))
    assert seen.levels is None and seen.resolution == 1.0
    assert ("levels", f"more than {LEVELS} distinct values") in seen.lines()


def test_lines_are_for_people() -> None:
    samples = 0.01 * np.sin(2 * np.pi * np.arange(10_000) / 37.0) + 0.001 * np.linspace(0, 1, 10_000)
    labels = [label for label, _ in summary(samples).lines()]
    assert labels == ["samples", "levels", "longest runs", "drift"]
    assert dict(summary(samples).lines())["drift"].startswith("the running minimum moves by 4.8 % of the range")
