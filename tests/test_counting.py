"""Counting: equal to the standard and to an independent package; what it accepts; chunks, workers, places."""

from __future__ import annotations

import itertools
import subprocess
import sys
from collections import Counter

import numpy as np
import pytest
from histories import READINGS, STANDARD, by_the_package, classes, gapped, histories, same
from hypothesis import given, settings
from hypothesis import strategies as st

from springlife.duty import counting
from springlife.duty.algebra import pieces
from springlife.duty.counting import Count, Located, Tally, count, traced
from springlife.errors import InputError


class TestTheStandard:
    def test_a_history_that_happens_once(self):
        # ASTM E1049-85 5.4.4: range, mean, cycles; memory, recomputed
        rows = count(STANDARD).cycles("half")
        seen = {(r["range"], r["mean"]): r["count"] for _, r in rows.iterrows()}
        assert seen == {(3, -0.5): 0.5, (4, -1): 0.5, (4, 1): 1, (8, 1): 0.5, (9, 0.5): 0.5, (8, 0): 0.5, (6, 1): 0.5}

    def test_the_same_history_repeating(self):
        # ASTM E1049-85 5.4.5: one full cycle each; memory, recomputed
        rows = count(STANDARD).cycles("repeat")
        seen = {(r["range"], r["mean"]): r["count"] for _, r in rows.iterrows()}
        assert seen == {(3, -0.5): 1, (4, 1): 1, (7, 0.5): 1, (9, 0.5): 1}

    def test_dropped_leaves_what_has_closed(self):
        assert classes(count(STANDARD).table("drop")) == {(-1, 3): 1}

    def test_the_table_for_people(self):
        rows = count(STANDARD).cycles()
        assert list(rows.columns) == ["low", "high", "range", "mean", "count"]
        assert rows[["low", "high"]].apply(tuple, axis=1).is_monotonic_increasing


class TestAgainstThePackage:
    def test_all_histories_of_two_and_four_levels(self):
        short = itertools.chain.from_iterable(itertools.product(range(4), repeat=n) for n in range(2, 7))
        binary = itertools.chain.from_iterable(itertools.product((0, 1), repeat=n) for n in range(2, 11))
        for history in itertools.chain(short, binary):
            assert classes(count(history).table("half")) == by_the_package(history), history

    @pytest.mark.parametrize("levels", [3, 10, 1000, None])
    @pytest.mark.parametrize("hold", [1, 2])
    def test_random_histories(self, levels, hold):
        rng = np.random.default_rng(1049)
        for _ in range(300):
            size = int(rng.integers(3, 120))
            x = rng.normal(size=size) if levels is None else rng.integers(-levels, levels, size)
            x = np.repeat(np.cumsum(x) if rng.random() < 0.3 else x, hold)
            assert classes(count(x).table("half")) == by_the_package(x)


class TestTraced:
    @given(histories, st.sampled_from(READINGS))
    def test_the_cycles_are_those_of_the_count(self, history, residue):
        low, high, number, at_low, at_high = traced(history, residue)
        rows = Counter()
        for a, b, n in zip(low, high, number, strict=True):
            rows[a, b] += n
        assert dict(rows) == classes(count(history).table(residue))
        assert [history[i] for i in at_low] == low.tolist()
        assert [history[i] for i in at_high] == high.tolist()

    def test_where_the_standards_full_cycle_lies(self):
        low, high, number, at_low, at_high = traced(STANDARD, "drop")
        assert (low[0], high[0], number[0], at_low[0], at_high[0]) == (-1, 3, 1, 4, 5)

    def test_a_plateau_is_found_at_its_first_sample(self):
        assert [a.tolist() for a in traced([0, 0, 3, 3, 3], "half")] == [[0], [3], [0.5], [0], [2]]

    def test_another_reading_is_refused(self):
        with pytest.raises(InputError, match="residue is 'full'; valid: half, repeat, drop"):
            traced(STANDARD, "full")


class TestDoor:
    @pytest.mark.parametrize("kind", ["i1", "u1", "i2", "u2", "i4", "u4", "i8", "u8", "f2", "f4", "f8", ">i2", ">f8"])
    def test_number_types_agree(self, kind):
        x = np.array(STANDARD) + 5
        assert same(count(x.astype(kind)), count(x.tolist()))

    def test_small_integers_do_not_overflow(self):
        assert classes(count(np.array([-128, 127, -128], dtype=np.int8)).table()) == {(-128, 127): 1}

    def test_views_and_tuples_and_series(self):
        import pandas as pd

        wide = np.zeros((9, 3))
        wide[:, 1] = STANDARD
        for given_as in (wide[:, 1], tuple(STANDARD), pd.Series(STANDARD), np.array(STANDARD)[::-1][::-1]):
            assert same(count(given_as), count(STANDARD))

    @pytest.mark.parametrize("empty", [[], (), np.empty(0), np.empty(0, dtype=object)])
    def test_nothing_gives_the_empty_count(self, empty):
        assert same(count(empty), Count())
        assert classes(count(empty).table("repeat")) == {}

    @pytest.mark.parametrize("history", [[3], [3, 3, 3]])
    def test_a_constant_gives_one_point_and_no_cycle(self, history):
        found = count(history)
        assert found.residue.tolist() == [3]
        assert all(classes(found.table(r)) == {} for r in READINGS)

    @pytest.mark.parametrize(
        ("samples", "message"),
        [
            ([1, 2, float("nan")], r'sample 2 is nan, .*nan="split"'),
            ([1, float("inf"), float("nan")], r"sample 1 is inf"),
            ([[1, 2], [3, 4]], r"shape \(2, 2\)"),
            (5, r"shape \(\)"),
            (["1", "2"], r"type <U1"),
            ([True, False], r"type bool"),
            ([1j], r"type complex128"),
            ([None, 1], r"type object"),
            (np.array([1], dtype=np.longdouble), r"up to 64 bits"),
            ([[1], [2, 3]], r"not one row of numbers"),
            ([0, 2**53 + 1], r"sample 1 is 9007199254740993; .*2\*\*53"),
            ([0.5, -(2**60) - 1], r"sample 1 is -1152921504606846977"),
            (np.array([2**64 - 1], dtype=np.uint64), r"sample 0 is 18446744073709551615"),
            (np.ma.array([1, 2], mask=[0, 1]), r"masked"),
        ],
    )
    def test_what_cannot_be_counted_is_refused(self, samples, message):
        with pytest.raises(InputError, match=message):
            count(samples)

    def test_infinity_is_no_gap(self):
        with pytest.raises(InputError, match="sample 2 is -inf"):
            count([1, float("nan"), -float("inf")], nan="split")

    def test_whole_numbers_up_to_the_last_exact_one(self):
        assert count([0, 2**53]).maximum == 2**53
        assert count([0.5, 2.0**60]).maximum == 2**60  # a float is what it is

    def test_words_are_checked(self):
        with pytest.raises(InputError, match="nan is 'skip'; valid: error, split"):
            count([1], nan="skip")
        with pytest.raises(InputError, match="residue is 'halve'; did you mean 'half'"):
            count([1]).table("halve")

    def test_a_table_needs_no_pandas(self):
        code = (
            "import sys; from springlife import count; count([1, 3, 2, 5]).table(); assert 'pandas' not in sys.modules"
        )
        subprocess.run([sys.executable, "-c", code], check=True)


class TestTally:
    @settings(max_examples=50)
    @given(histories, st.data())
    def test_chunks_give_the_whole(self, history, data):
        tally, rest = Tally(), history
        while rest:
            cut = data.draw(st.integers(1, len(rest)))
            tally.feed(rest[:cut])
            rest = rest[cut:]
        assert same(tally.result(), count(history))

    def test_an_index_counts_from_the_first_chunk(self):
        tally = Tally()
        tally.feed([1, 2, 3])
        with pytest.raises(InputError, match="sample 4 is nan"):
            tally.feed([1, float("nan")])

    @given(gapped, st.integers(1, 3), st.data())
    def test_gaps_and_workers_and_segments(self, history, workers, data):
        cut = data.draw(st.integers(0, len(history)))
        with pytest.MonkeyPatch.context() as patch:
            patch.setattr(counting, "SEGMENT", 5)
            tally = Tally(nan="split", workers=workers)
            tally.feed(history[:cut])
            tally.feed(history[cut:])
        assert same(tally.result(), count(history, nan="split"))

    @given(gapped, st.data())
    def test_the_largest_closed_cycle_keeps_its_place(self, history, data):
        cut = data.draw(st.integers(0, len(history)))
        tally = Tally(nan="split", where=True)
        tally.feed(history[:cut])
        tally.feed(history[cut:])
        assert same(tally.result(), count(history, nan="split"))
        low, high, *_ = traced(history, "drop")
        found = tally.largest
        if not low.size:
            assert found is None
        else:
            assert found.high - found.low == (high - low).max()
            assert (history[found.index_low], history[found.index_high]) == (found.low, found.high)
        open_points = [history[i] for i in tally.positions]
        assert open_points == pieces(tally.result().residue)[-1].tolist()

    def test_places_of_the_standards_example(self):
        tally = Tally(where=True)
        for sample in STANDARD:
            tally.feed([sample])
        # by hand: -1 to 3 is the one closed cycle; -1 and 3 turn no open range
        assert tally.largest == Located(low=-1, high=3, index_low=4, index_high=5)
        assert tally.positions.tolist() == [0, 1, 2, 3, 6, 7, 8]

    def test_a_faulty_whole_number_is_found_behind_the_first_segment(self, monkeypatch):
        monkeypatch.setattr(counting, "SEGMENT", 4)
        samples = np.arange(10)
        samples[9] = 2**60
        with pytest.raises(InputError, match="sample 9 is 1152921504606846976"):
            count(samples)

    def test_a_read_only_map_of_small_integers_is_counted_as_it_lies(self, tmp_path):
        samples = np.random.default_rng(2).integers(-2000, 2000, 50_000).astype("<i2")
        samples.tofile(tmp_path / "record.bin")
        mapped = np.memmap(tmp_path / "record.bin", dtype="<i2", mode="r")
        assert same(count(mapped), count(samples.tolist()))

    @pytest.mark.parametrize("argument", ["workers", "most_pairs"])
    def test_sizes_are_checked(self, argument):
        with pytest.raises(InputError, match=f"{argument} is 0; give 1 or more"):
            count(STANDARD, **{argument: 0})
