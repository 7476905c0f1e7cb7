"""The compiled loops and those in NumPy and plain Python answer alike, on the forms that each finds hard."""

from __future__ import annotations

import subprocess
import sys
from collections import Counter

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from springlife.duty import counting, kernels, stack
from springlife.duty.counting import Tally, count, traced

BOTH = pytest.mark.parametrize("loops", [stack, kernels], ids=["plain", "compiled"])
TIME = np.arange(6000)
NOISE = np.random.default_rng(7).normal(size=TIME.size)
WAVE = np.sin(TIME / 3)
FORMS = {
    "noise": NOISE,
    "random walk": np.cumsum(NOISE),
    "few levels": np.round(NOISE),
    "held samples": np.repeat(NOISE[:2000], 3),
    "constant amplitude": np.tile([0.0, 1.0], 3000),
    "converging": WAVE * (1 - TIME / 1e4),
    "diverging": WAVE * (1 + TIME / 1e4),
    "there and back": np.concatenate([WAVE * (1 - TIME / 1e4), WAVE * (1 - TIME[::-1] / 1e4)]),
    "coarse wave": np.round(20 * WAVE * (1 + 0.3 * np.sin(TIME / 400))),
    "ramp": TIME.astype(float),
    "constant": np.zeros(5000),
    "one sample": np.array([3.0]),
    "one step": np.array([3.0, 3.0, 1.0]),
}
histories = st.lists(st.integers(0, 5), min_size=1, max_size=40).map(lambda x: np.array(x, dtype=float))


def answer(loops, parts):
    """Closed pairs with their number, and residue, of a history in parts."""
    residue, top, scratch = np.empty(1 + sum(part.size for part in parts)), 0, stack.Scratch()
    pairs: Counter = Counter()
    for part in parts:
        low, high, points = loops.reduce(part, scratch)
        pairs.update(zip(low.tolist(), high.tolist(), strict=True))
        low, high, top = loops.push(residue, top, points.copy())
        pairs.update(zip(low.tolist(), high.tolist(), strict=True))
    return pairs, residue[:top].tolist()


@BOTH
@pytest.mark.parametrize("form", FORMS)
def test_a_piece_counted_apart_gives_what_the_plain_stack_gives(loops, form):
    x = FORMS[form]
    residue = np.empty(x.size)
    low, high, top = stack.push(residue, 0, x)  # one sample after the other, nothing taken out before
    expected = Counter(zip(low.tolist(), high.tolist(), strict=True)), residue[:top].tolist()
    assert answer(loops, [x]) == expected
    assert answer(loops, [part for part in np.split(x, [1, 7, 2500]) if part.size]) == expected


@given(histories, histories)
def test_both_agree_on_short_histories(a, b):
    assert answer(kernels, [a, b]) == answer(stack, [a, b])


@BOTH
def test_blocks_do_not_show(loops, monkeypatch):
    monkeypatch.setattr(stack, "BLOCK", 16)
    x = FORMS["few levels"]
    assert answer(loops, [x]) == answer(kernels, [x[:3000], x[3000:]])


@BOTH
@pytest.mark.parametrize("place", [0, 1, 2, 4000, 5999])
@pytest.mark.parametrize("odd", [np.nan, np.inf, -np.inf])
def test_a_sample_that_is_not_finite_is_noticed(loops, place, odd):
    x = NOISE.copy()
    x[place] = odd
    assert loops.reduce(x, stack.Scratch()) is None
    assert loops.reduce(np.full(9, odd), stack.Scratch()) is None


@BOTH
@pytest.mark.parametrize("form", FORMS)
def test_positions_belong_to_the_values(loops, form):
    x = FORMS[form]
    low, high, rest = loops.trace(x, stack.turning(x))
    pairs = Counter(zip(x[low].tolist(), x[high].tolist(), strict=True))
    assert (pairs, x[rest].tolist()) == answer(stack, [x])


@given(histories)
def test_both_find_the_same_positions(x):
    for plain, compiled in zip(stack.trace(x, np.arange(x.size)), kernels.trace(x, np.arange(x.size)), strict=True):
        assert plain.tolist() == compiled.tolist()


pairs = st.lists(st.tuples(st.integers(0, 3), st.integers(4, 6)), min_size=1, max_size=50)


@given(st.lists(pairs, max_size=3), st.integers(1, 12))
def test_both_join_the_same_pairs(batches, most):
    for loops in (stack, kernels):
        held, expected = loops.Distinct(most), Counter()
        for batch in batches:
            low, high = (np.array(column, dtype=float) for column in zip(*batch, strict=True))
            taken = held.add(low, high)
            assert (taken == len(batch)) == (len(expected.keys() | set(batch)) <= most)
            expected.update(batch[:taken])
            if taken < len(batch):
                break
        low, high, number = held.rows()
        assert Counter(dict(zip(zip(low, high, strict=True), number.tolist(), strict=True))) == expected


@BOTH
def test_the_two_zeros_are_one_value(loops):
    held = loops.Distinct(5)
    held.add(np.array([-0.0, 0.0]), np.array([1.0, 1.0]))
    low, _, number = held.rows()
    assert (low.tolist(), number.tolist()) == ([0.0], [2]) and not np.signbit(low[0])


@given(
    st.lists(st.tuples(st.integers(-30, 10), st.integers(1, 20), st.integers(1, 2**30)), min_size=1, max_size=60),
    st.booleans(),
)
def test_both_fill_the_same_cells(rows, once):
    low, span, number = (np.array(column) for column in zip(*rows, strict=True))
    low = low / 7
    high = low + span / 3
    if once:
        number = np.broadcast_to(np.int64(1), low.size)
    answers = []
    for loops in (stack, kernels):
        cells, largest, times = np.zeros((64, 64, 3), dtype=np.int64), np.zeros(2), np.zeros(1, dtype=np.int64)
        for part in (slice(0, 20), slice(20, None)):
            if low[part].size:
                loops.fold(low[part], high[part], number[part], 0.25, -32.0, 2.0**20, cells, largest, times)
        answers.append((cells, largest, times))
    assert all(np.array_equal(a, b) for a, b in zip(*answers, strict=True))
    cells, largest, times = answers[0]
    assert cells[:, :, 0].sum() == number.sum()
    widest = max(zip(high - low, low, high, strict=True))
    assert largest.tolist() == list(widest[1:])
    assert times[0] == number[(low == widest[1]) & (high == widest[2])].sum()


@pytest.fixture
def new_process(monkeypatch):
    """As if nothing had been counted and nothing loaded."""
    monkeypatch.setattr(stack, "_counted", 0)
    monkeypatch.setattr(stack, "_missing", False)
    monkeypatch.delitem(sys.modules, "springlife.duty.kernels")


class TestChoice:
    def test_compiled_loops_once_loaded_are_used(self):
        assert stack.loops() is kernels

    @pytest.mark.usefixtures("new_process")
    def test_they_are_loaded_when_enough_has_been_counted(self, monkeypatch):
        loaded = []

        def load(name):
            loaded.append(name)
            sys.modules[name] = kernels

        monkeypatch.setattr(stack, "import_module", load)
        assert stack.expect(stack.WORTH_LOADING - 5000) is stack and not loaded
        assert stack.expect(5000) is kernels and loaded == ["springlife.duty.kernels"]
        stack.expect(stack.WORTH_LOADING)
        assert len(loaded) == 1

    @pytest.mark.usefixtures("new_process")
    def test_without_a_compiler_numpy_counts(self, monkeypatch):
        asked = []

        def refuse(name):
            asked.append(name)
            raise ImportError("no compiler here")

        monkeypatch.setattr(stack, "import_module", refuse)
        assert stack.expect(stack.WORTH_LOADING) is stack
        assert stack.expect(stack.WORTH_LOADING) is stack
        assert len(asked) == 1

    def test_a_short_record_does_not_load_it(self):
        code = (
            "import sys; from springlife import count; import numpy as np; count(np.arange(1e6) % 7);"
            "assert 'numba' not in sys.modules"
        )
        subprocess.run([sys.executable, "-c", code], check=True)


@pytest.mark.parametrize("form", FORMS)
def test_a_count_does_not_depend_on_its_loops_or_its_workers(form, monkeypatch):
    monkeypatch.setattr(counting, "SEGMENT", 700)
    x = FORMS[form]
    wanted = count(x)
    places = traced(x, "half")
    located = Tally(where=True)
    located.feed(x)
    assert count(x, workers=2) == count(x, workers=5) == located.result() == wanted
    monkeypatch.setattr(counting, "expect", lambda samples: stack)
    assert count(x) == count(x, workers=2) == wanted
    assert all(np.array_equal(a, b) for a, b in zip(traced(x, "half"), places, strict=True))
