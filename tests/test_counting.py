"""Counting: equal to the standard and to an independent package, and an algebra that splits and repeats exactly."""

from __future__ import annotations

import itertools
import json
import subprocess
import sys
from collections import Counter

import numpy as np
import pytest
import rainflow
from hypothesis import given, settings
from hypothesis import strategies as st

from springlife.duty import counting
from springlife.duty.algebra import pieces
from springlife.duty.counting import Count, CycleTable, Located, Tally, count, traced
from springlife.errors import InputError

Classes = dict[tuple[float, float], float]
READINGS = ("half", "repeat", "drop")
# The history of ASTM E1049-85 5.4.4, figure 6 (identity seen; digits from memory, recomputed).
STANDARD = [-2, 1, -3, 5, -1, 3, -4, 4, -2]

levels = st.lists(st.integers(0, 5), max_size=30)
floats = st.lists(st.floats(-1e6, 1e6, width=32), max_size=30)
histories = levels | floats


def classes(table: CycleTable) -> Classes:
    """Rows of a table by pair; each pair stands once."""
    rows = {(float(a), float(b)): float(n) for a, b, n in zip(table.low, table.high, table.count, strict=True)}
    assert len(rows) == table.low.size
    return rows


def by_the_package(history) -> Classes:
    """The package's cycles; it gives none for two samples and one of no range for a constant series."""
    series = [float(x) for x in history]
    rows: Classes = Counter()
    if len(series) == 2 and series[0] != series[1]:
        return {(min(series), max(series)): 0.5}
    for span, _, number, i, j in rainflow.extract_cycles(series):
        if span:
            rows[min(series[i], series[j]), max(series[i], series[j])] += number
    return dict(rows)


def by_hand(history) -> tuple[Classes, list[float]]:
    """Closed cycles and residue by the rule on all points at once: drop what does not turn, close the first pair
    that both neighbours span, start again."""
    points = [float(x) for x in history]
    closed: Classes = Counter()
    while True:
        for i in range(len(points) - 1):
            if points[i] == points[i + 1] or (i and sorted(points[i - 1 : i + 2])[1] == points[i]):
                del points[i]
                break
            if 0 < i < len(points) - 2:
                inner, outer = sorted(points[i : i + 2]), sorted(points[i - 1 : i + 3 : 3])
                if outer[0] <= inner[0] and inner[1] <= outer[1]:
                    closed[tuple(inner)] += 1
                    del points[i : i + 2]
                    break
        else:
            return dict(closed), points


def same(a: Count, b: Count) -> bool:
    """Equal in everything that can be asked for."""
    return (
        a == b
        and all(classes(a.table(r)) == classes(b.table(r)) for r in READINGS)
        and np.array_equal([a.minimum, a.maximum], [b.minimum, b.maximum], equal_nan=True)
        and a.samples == b.samples
    )


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


class TestAlgebra:
    @given(histories)
    def test_closed_cycles_and_residue_follow_the_rule(self, history):
        found, (closed, residue) = count(history), by_hand(history)
        assert classes(found.table("drop")) == closed
        assert found.residue.tolist() == residue

    @given(histories, st.data())
    def test_pieces_add_up_in_any_grouping(self, history, data):
        cuts = sorted(data.draw(st.lists(st.integers(0, len(history)), max_size=5)))
        parts = [count(history[a:b]) for a, b in zip([0, *cuts], [*cuts, len(history)], strict=True)]
        while len(parts) > 1:
            i = data.draw(st.integers(0, len(parts) - 2))
            parts[i : i + 2] = [parts[i] + parts[i + 1]]
        assert same(parts[0], count(history))

    @given(histories, st.integers(0, 6))
    def test_a_repeated_count_is_that_of_the_history_written_out(self, history, n):
        written = count(history * n)
        assert same(n * count(history), written)
        assert same(count(history) * n, written)

    @given(histories, histories, st.integers(1, 4))
    def test_a_pass_of_two_events(self, a, b, n):
        assert same(n * (3 * count(a) + count(b)), count((a * 3 + b) * n))

    @given(histories)
    def test_one_more_pass_adds_the_repeating_count(self, history):
        once, twice = classes((2 * count(history)).table("drop")), classes((3 * count(history)).table("drop"))
        added = Counter(twice)
        added.subtract(once)
        assert {k: v for k, v in added.items() if v} == classes(count(history).table("repeat"))

    @given(histories)
    def test_the_empty_count_changes_nothing(self, history):
        found = count(history)
        assert same(Count() + found, found) and same(found + Count(), found)
        assert same(sum([found, found]), found + found)
        assert same(0 * found, Count())

    def test_constant_amplitude_keeps_a_short_residue(self):
        found = count([0, 1] * 5000)
        assert found.residue.tolist() == [0, 1] and found.number.tolist() == [4999]
        assert classes(found.table("half")) == {(0, 1): 4999.5}

    def test_a_milliard_repeats_are_exact(self):
        # by hand: the standard's example has one closed cycle and closes three more at each of n - 1 joints
        found = 1_000_000_000 * count(STANDARD)
        expected = {(-1, 3): 10**9, (-2, 1): 10**9 - 1, (-3, 4): 10**9 - 1, (-4, 5): 10**9 - 1}
        assert classes(found.table("drop")) == expected
        assert found.number.dtype == np.int64 and found.samples == 9 * 10**9

    def test_no_number_overflows(self):
        most = (2**63 - 1) * count([0, 2, 1, 2, 0])  # by hand: 1 to 2 closes once a pass, 0 to 2 at every joint
        assert most.number.tolist() == [2**63 - 2, 2**63 - 1]
        with pytest.raises(InputError, match=r"18446744073709551614 cycles of one pair; at most 2\*\*63 - 1"):
            2 * most
        with pytest.raises(InputError, match=r"at most 2\*\*63 - 1"):
            (most + count([0, 2, 1, 2, 0])).number  # noqa: B018 - the access is the test

    def test_a_negative_repeat_is_refused(self):
        with pytest.raises(InputError, match="-1 times"):
            -1 * count(STANDARD)

    def test_only_counts_are_added(self):
        with pytest.raises(TypeError):
            count(STANDARD) + 1
        with pytest.raises(TypeError):
            1.5 * count(STANDARD)

    def test_nothing_can_be_written_into_a_count(self):
        found = count(STANDARD)
        for array in (found.low, found.high, found.number, found.residue):
            with pytest.raises(ValueError, match="read-only"):
                array[0] = 0
        with pytest.raises(AttributeError):
            found.gate = 1.0


class TestMapped:
    @given(levels, st.sampled_from([-8.0, -1.0, -0.5, 0.25, 3.0]), st.integers(-4, 4))
    def test_equals_the_count_of_the_mapped_history(self, history, scale, offset):
        mapped = count(history).mapped(scale, offset)
        assert same(mapped, count([scale * x + offset for x in history]))

    @given(floats, st.floats(-1e3, 1e3), st.floats(-1e9, 1e9))
    def test_also_where_rounding_makes_values_equal(self, history, scale, offset):
        assert same(count(history).mapped(scale, offset), count([scale * x + offset for x in history]))

    def test_the_gate_is_scaled(self):
        assert count(STANDARD, gate=4).mapped(-2).gate == 8

    def test_a_scale_that_is_not_finite_is_refused(self):
        with pytest.raises(InputError, match=r"scale nan and offset 0\.0 must be finite"):
            count(STANDARD).mapped(float("nan"))


class TestGaps:
    gapped = st.lists(st.integers(0, 5) | st.just(float("nan")), max_size=30)

    @staticmethod
    def split(history):
        out = [[]]
        for x in history:
            if x == x:
                out[-1].append(x)
            else:
                out.append([])
        return out

    @given(gapped)
    def test_pieces_are_counted_apart(self, history):
        expected = Counter()
        for piece in self.split(history):
            expected.update(classes(count(piece).table("half")))
        found = count(history, nan="split")
        assert classes(found.table("half")) == dict(expected)
        assert found.samples == sum(x == x for x in history)
        assert found.residue.size == 0 or np.isnan(found.residue).sum() <= 1

    @given(gapped)
    def test_in_a_pass_that_recurs_the_last_piece_goes_on_into_the_first(self, history):
        first, *middle, last = parts if len(parts := self.split(history)) > 1 else [[], *parts]
        expected = Counter()
        for piece in (*middle, last + first):
            expected.update(classes(count(piece).table("repeat")))
        assert classes(count(history, nan="split").table("repeat")) == dict(expected)

    @given(gapped, st.data())
    def test_chunks_add_up_and_repeat(self, history, data):
        cut = data.draw(st.integers(0, len(history)))
        a, b = (count(part, nan="split") for part in (history[:cut], history[cut:]))
        assert same(a + b, count(history, nan="split"))
        assert same(3 * (a + b), count(history * 3, nan="split"))

    @given(gapped, st.sampled_from(READINGS))
    def test_settled_and_open_cycles_make_the_table(self, history, residue):
        found = count(history, nan="split")
        rows = Counter(classes(found.settled(residue)))
        low, high, number, _, _ = traced(found.residue, residue)
        for a, b, n in zip(low, high, number, strict=True):
            rows[a, b] += n
        assert classes(found.table(residue)) == dict(rows)

    def test_extremes_of_every_piece_are_kept(self):
        found = count([0, 1, np.nan, 9, np.nan, 1, 2], nan="split")
        assert (found.minimum, found.maximum) == (0, 9)


class TestGate:
    @given(histories, st.floats(0, 4), st.sampled_from(READINGS))
    def test_drops_the_cycles_up_to_it_and_nothing_else(self, history, gate, residue):
        rows = classes(count(history).table(residue))
        expected = {(a, b): n for (a, b), n in rows.items() if b - a > gate}
        assert classes(count(history, gate=gate).table(residue)) == expected

    @given(histories, histories, st.floats(0, 4))
    def test_keeps_pieces_adding_up(self, a, b, gate):
        assert same(count(a, gate=gate) + count(b, gate=gate), count(a + b, gate=gate))
        assert same(3 * count(a, gate=gate), count(a * 3, gate=gate))

    @given(histories, histories)
    def test_a_sum_takes_the_larger(self, a, b):
        assert same(count(a, gate=2) + count(b), count(a + b, gate=2))

    @pytest.mark.parametrize("gate", [-1, float("nan"), float("inf")])
    def test_must_be_a_range(self, gate):
        with pytest.raises(InputError, match=r"gate is .*; give a range of 0 or more"):
            count(STANDARD, gate=gate)


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


class TestDict:
    @given(histories, st.sampled_from([0.0, 1.5]))
    def test_goes_through_json_and_back(self, history, gate):
        found = count(history, gate=gate)
        assert same(Count.from_dict(json.loads(json.dumps(found.to_dict(), allow_nan=False))), found)

    @given(TestGaps.gapped)
    def test_with_gaps_too(self, history):
        found = count(history, nan="split")
        assert same(Count.from_dict(json.loads(json.dumps(found.to_dict(), allow_nan=False))), found)

    @pytest.mark.parametrize(
        ("key", "value"),
        [("residue", "x"), ("closed", {"low": [2], "high": [1], "number": [1]}), ("samples", 1.5), ("closed", None)],
    )
    def test_what_no_count_gave_is_refused(self, key, value):
        with pytest.raises(InputError, match="give what to_dict returned"):
            Count.from_dict(count(STANDARD).to_dict() | {key: value})

    def test_a_missing_key_is_named(self):
        with pytest.raises(InputError, match="key 'closed' is missing"):
            Count.from_dict({})


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

    @given(TestGaps.gapped, st.integers(1, 3), st.data())
    def test_gaps_and_workers_and_segments(self, history, workers, data):
        cut = data.draw(st.integers(0, len(history)))
        with pytest.MonkeyPatch.context() as patch:
            patch.setattr(counting, "SEGMENT", 5)
            tally = Tally(nan="split", workers=workers)
            tally.feed(history[:cut])
            tally.feed(history[cut:])
        assert same(tally.result(), count(history, nan="split"))

    @given(TestGaps.gapped, st.data())
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


class TestDeepResidues:
    """A residue as long as the history, reached back into from its end."""

    depth = 3000
    converging = [(-1) ** i * (3000 - i) for i in range(3000)]

    def test_a_wide_swing_closes_everything(self):
        # by hand: from the third point on, each pair closes; the first two points stay
        found = count([*self.converging, self.depth + 1, 0])
        assert found.residue.tolist() == [self.depth, 1 - self.depth, self.depth + 1, 0]
        assert found.low.size == found.number.sum() == self.depth // 2 - 1

    @settings(max_examples=20)
    @given(st.integers(0, 3000))
    def test_joined_at_any_depth(self, level):
        later = [level, -level, level // 2]
        assert same(count(self.converging) + count(later), count(self.converging + later))

    def test_repeats(self):
        assert same(3 * count(self.converging), count(self.converging * 3))
