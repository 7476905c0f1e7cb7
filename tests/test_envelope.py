"""The envelope holds every extreme in order, in few columns, however it is fed."""

from __future__ import annotations

import numpy as np
import pytest

from springlife.duty.envelope import COLUMNS, EnvelopeAccumulator


@pytest.mark.parametrize("size", [1, 7, 1000, 50_000])
@pytest.mark.parametrize("length", [1, 10, 1023, 1025, 40_000])
def test_extremes_and_order_are_kept(length: int, size: int) -> None:
    y = np.cumsum(np.random.default_rng(length).standard_normal(length))
    gathered = EnvelopeAccumulator()
    for start in range(0, length, size):
        gathered.feed(y[start : start + size])
    e = gathered.result()
    assert e.low.size <= 2 * COLUMNS and (e.low <= e.high).all()
    assert e.low.min() == y.min() and e.high.max() == y.max()
    at = int(np.argmax(y)) // e.samples
    # The odd stretch put back at a halving may move an extreme to the neighbouring column.
    assert e.high[max(at - 1, 0) : at + 2].max() == y.max()


def test_few_columns_still_hold_the_extremes() -> None:
    gathered = EnvelopeAccumulator()
    y = np.sin(np.arange(5000) / 50.0)
    gathered.feed(y)
    low, high = gathered.result().columns(40)
    assert low.size == high.size == 40 and low.min() == y.min() and high.max() == y.max()


def test_gaps_do_not_hide_values() -> None:
    gathered = EnvelopeAccumulator()
    gathered.feed(np.array([1.0, np.nan, 3.0] * 2000))
    e = gathered.result()
    assert np.nanmin(e.low) == 1.0 and np.nanmax(e.high) == 3.0
