"""Counts are an algebra: pieces add up, repeats are exact, gaps stay gaps, and all of it goes through JSON."""

from __future__ import annotations

import json
from collections import Counter

import numpy as np
import pytest
from histories import READINGS, STANDARD, by_hand, classes, floats, gapped, histories, levels, same
from hypothesis import given, settings
from hypothesis import strategies as st

from springlife.duty.counting import Count, count, traced
from springlife.errors import InputError


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

    @given(st.lists(st.tuples(gapped, st.integers(1, 3)), min_size=1, max_size=3), st.sampled_from(READINGS))
    def test_settled_and_open_cycles_make_the_table_of_a_pass(self, events, residue):
        parts = [n * count(history, nan="split") for history, n in events]
        rows = Counter()
        for part in parts:
            rows.update(classes(part.settled(residue)))
        low, high, number, _, _ = traced(np.concatenate([part.residue for part in parts]), residue)
        for a, b, n in zip(low, high, number, strict=True):
            rows[a, b] += n
        assert classes(sum(parts, Count()).table(residue)) == dict(rows)

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


class TestDict:
    @given(histories, st.sampled_from([0.0, 1.5]))
    def test_goes_through_json_and_back(self, history, gate):
        found = count(history, gate=gate)
        assert same(Count.from_dict(json.loads(json.dumps(found.to_dict(), allow_nan=False))), found)

    @given(gapped)
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
