"""Flat memory: few pairs are kept exactly, many in cells that lose next to nothing of the damage."""

from __future__ import annotations

import json
import tracemalloc
from collections import Counter

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from springlife.duty import counting, kernels, stack
from springlife.duty.counting import Count, Tally, count
from springlife.duty.cycles import SIDE, Cycles, folded, pairs, width
from springlife.duty.grid import Grid, Kept

RNG = np.random.default_rng(5)
NOISE = RNG.normal(size=60_000)
WALK = np.cumsum(NOISE)
WAVE = np.sin(np.arange(60_000) / 3) * (1 + 0.3 * np.sin(np.arange(60_000) / 211)) + 0.02 * NOISE
SIGNALS = {"noise": NOISE, "walk": WALK, "wave": WAVE}
signals = pytest.mark.parametrize("signal", SIGNALS)


def damage(table, slope):
    """Sum of n r^slope, ranges relative to the largest."""
    span = table.high - table.low
    return float((table.count * (span / span.max()) ** slope).sum())


def same_rows(a: Cycles, b: Cycles) -> bool:
    return all(np.array_equal(getattr(a, name), getattr(b, name)) for name in ("low", "high", "number"))


def numbers_by_cell(found: Count) -> Counter:
    numbers: Counter = Counter()
    for low, high, n in zip(found.low // found.cell, found.high // found.cell, found.number, strict=True):
        numbers[low, high] += n
    return numbers


class TestWhichIsUsed:
    def test_exact_up_to_the_number_of_distinct_pairs(self):
        pairs_closed = count(NOISE).low.size
        assert count(NOISE, most_pairs=pairs_closed).exact
        found = count(NOISE, most_pairs=pairs_closed - 1)
        assert not found.exact and found.cell > 0

    def test_many_cycles_of_few_pairs_stay_exact(self):
        levels = np.round(NOISE)
        found = count(levels, most_pairs=200)
        assert found.exact and found == count(levels)
        assert found.number.sum() > 50 * found.number.size

    @signals
    @settings(max_examples=15)
    @given(st.lists(st.integers(1, 59_999), max_size=4))
    def test_it_does_not_depend_on_the_chunks(self, signal, cuts):
        tally = Tally(most_pairs=2000)
        for part in np.split(SIGNALS[signal], sorted(cuts)):
            tally.feed(part)
        found, whole = tally.result(), count(SIGNALS[signal], most_pairs=2000)
        assert found.cell == whole.cell
        assert numbers_by_cell(found) == numbers_by_cell(whole)

    def test_a_result_can_be_taken_while_counting_goes_on(self):
        tally = Tally()
        tally.feed(NOISE[:30_000])
        half = tally.result()
        before = half.low.copy()
        tally.feed(NOISE[30_000:])
        assert tally.result() == count(NOISE)
        assert np.array_equal(half.low, before) and half == count(NOISE[:30_000])


class TestWhatCellsKeep:
    @signals
    def test_every_cycle_is_counted(self, signal):
        exact, cells = count(SIGNALS[signal]), count(SIGNALS[signal], most_pairs=1)
        assert cells.number.sum() == exact.number.sum()
        assert cells.number.size < SIDE**2

    @signals
    def test_residue_extremes_and_largest_cycle_are_exact(self, signal):
        exact, cells = count(SIGNALS[signal]), count(SIGNALS[signal], most_pairs=1)
        assert np.array_equal(cells.residue, exact.residue)
        assert (cells.minimum, cells.maximum) == (SIGNALS[signal].min(), SIGNALS[signal].max())
        k, j = np.argmax(exact.high - exact.low), np.argmax(cells.high - cells.low)
        assert (cells.low[j], cells.high[j], cells.number[j]) == (exact.low[k], exact.high[k], exact.number[k])

    @signals
    def test_means_are_those_of_the_cells(self, signal):
        exact, cells = count(SIGNALS[signal]), count(SIGNALS[signal], most_pairs=1)
        largest = np.argmax(exact.high - exact.low)
        rest = np.arange(exact.low.size) != largest
        at = list(zip(np.floor(exact.low / cells.cell), np.floor(exact.high / cells.cell), strict=True))
        sums: dict = {}
        for place, low, high, n in zip(
            *(np.array(x)[rest] for x in (at, exact.low, exact.high, exact.number)), strict=True
        ):
            total = sums.setdefault(tuple(place), np.zeros(3))
            total += n, n * low, n * high
        kept = np.argmax(cells.high - cells.low)
        for k in range(cells.low.size):
            if k == kept:
                continue
            n, low, high = sums[np.floor(cells.low[k] / cells.cell), np.floor(cells.high[k] / cells.cell)]
            assert cells.number[k] == n
            # means are kept in steps of a millionth of a cell
            assert cells.low[k] == pytest.approx(low / n, abs=cells.cell * 2e-6)
            assert cells.high[k] == pytest.approx(high / n, abs=cells.cell * 2e-6)

    @signals
    @pytest.mark.parametrize(("slope", "bound"), [(5, 1e-3), (10, 1e-3), (25, 1e-3)])
    def test_damage_sums_keep_within_a_thousandth(self, signal, slope, bound):
        exact, cells = count(SIGNALS[signal]).table(), count(SIGNALS[signal], most_pairs=1).table()
        assert damage(cells, slope) == pytest.approx(damage(exact, slope), rel=bound)

    def test_a_cell_takes_nothing_away_from_tiny_ranges(self):
        grid = Grid(0, 1000)
        grid.add(pairs(np.array([0.0]), np.array([1000.0])))
        grid.add(pairs(np.array([5.0]), np.nextafter(np.array([5.0]), 6)))
        found = grid.cycles()
        assert (found.high > found.low).all() and found.number.sum() == 2

    @signals
    def test_loops_and_workers_give_the_same_bytes(self, signal, monkeypatch):
        monkeypatch.setattr(counting, "SEGMENT", 5000)
        found = []
        for loops in (stack, kernels):
            monkeypatch.setattr("springlife.duty.counting.expect", lambda samples, loops=loops: loops)
            monkeypatch.setattr("springlife.duty.grid.loops", lambda loops=loops: loops)
            found += [count(SIGNALS[signal], most_pairs=500, workers=workers).closed for workers in (1, 2, 3)]
        assert found[0].cell > 0 and all(same_rows(found[0], other) for other in found[1:])


class TestGrowth:
    def test_a_range_that_grows_joins_cells(self):
        small, wide = NOISE[:20_000], 40 * NOISE[20_000:22_000]
        tally = Tally(most_pairs=100)
        tally.feed(small)
        narrow = tally.result().cell
        tally.feed(wide)
        found, whole = tally.result(), count(np.concatenate([small, wide]), most_pairs=100)
        assert found.cell == whole.cell > 8 * narrow
        assert found.number.tolist() == whole.number.tolist()
        assert found.low == pytest.approx(whole.low, abs=1e-5 * whole.cell)
        assert found.high == pytest.approx(whole.high, abs=1e-5 * whole.cell)

    @pytest.mark.parametrize("factor", [1e3, 1e9])
    def test_however_much(self, factor):
        kept = Kept(10, 0.0)
        low = RNG.normal(size=1000)
        kept.add(low, low + 1)
        kept.add(factor * low, factor * (low + 1))
        found = kept.result()
        assert found.number.sum() == 2000
        mean = (found.low * found.number).sum() / 2000
        assert mean == pytest.approx((low + factor * low).sum() / 2000, abs=1e-5 * found.cell)

    @given(st.floats(-1e6, 1e6), st.floats(1e-3, 1e6), st.sampled_from([4, 512]))
    def test_a_width_is_the_least_power_of_two_that_covers_the_range(self, low, span, side):
        high = low + span
        found = width(low, high, side)
        assert np.log2(found) % 1 == 0
        assert np.floor(high / found) - np.floor(low / found) < side
        assert np.floor(high / (found / 2)) - np.floor(low / (found / 2)) >= side


class TestAlgebra:
    parts = (NOISE[:25_000], NOISE[25_000:])

    @pytest.mark.parametrize("limits", [(1, 1), (1, 10**6), (10**6, 1)])
    def test_counts_in_cells_add_up(self, limits):
        a, b = (count(part, most_pairs=most) for part, most in zip(self.parts, limits, strict=True))
        total, exact = a + b, count(NOISE)
        assert not total.exact
        assert total.number.sum() == exact.number.sum()
        assert np.array_equal(total.residue, exact.residue)
        largest = (exact.high - exact.low).max()
        assert (total.high - total.low).max() == largest
        for slope in (5, 10, 25):
            assert damage(total.table(), slope) == pytest.approx(damage(exact.table(), slope), rel=1e-3)

    def test_a_sum_of_exact_counts_goes_to_cells_when_it_must(self):
        a, b = (count(part, most_pairs=10_000) for part in self.parts)
        assert a.exact and not (a + b).exact
        assert (Count() + a).exact and (a + Count()) == a

    def test_repeats(self):
        cells = count(NOISE, most_pairs=1)
        assert (10**9 * cells).number.sum() == (10**9 * count(NOISE)).number.sum()
        assert damage((7 * cells).table(), 5) == pytest.approx(damage(count(np.tile(NOISE, 7)).table(), 5), rel=1e-3)

    def test_mapped(self):
        found = count(NOISE, most_pairs=1)
        turned = found.mapped(-3.0, 1.0)
        assert turned.cell == 3 * found.cell
        assert damage(turned.table(), 10) == pytest.approx(damage(found.table(), 10), rel=1e-9)

    def test_folding_again_changes_nothing(self):
        bag = count(NOISE, most_pairs=1).closed
        assert same_rows(folded(folded(bag)), folded(bag))
        assert folded(bag).cell == bag.cell

    def test_the_gate(self):
        cells, exact = count(NOISE, most_pairs=1, gate=1.0), count(NOISE, gate=1.0)
        assert cells.number.sum() == exact.number.sum()

    def test_through_json_and_back(self):
        found = count(NOISE, most_pairs=1)
        back = Count.from_dict(json.loads(json.dumps(found.to_dict(), allow_nan=False)))
        assert back == found and back.cell == found.cell and back.most_pairs == 1


def test_a_stream_takes_flat_memory():
    rng = np.random.default_rng(11)
    tally = Tally(most_pairs=20_000)
    tally.feed(rng.normal(size=200_000))
    tracemalloc.start()
    try:
        for _ in range(20):
            tally.feed(rng.normal(size=200_000))
            tally.result()
        _, peak = tracemalloc.get_traced_memory()
    finally:
        tracemalloc.stop()
    # by hand: a chunk of 1.6 MB, its intermediates, and the cells' 6.3 MB twice for the result; 20 chunks are 32 MB
    assert peak < 24e6
    assert tally.result().samples == 4_200_000
