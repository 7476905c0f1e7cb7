"""Surge by characteristics: energy, contact, and agreement with the transfer function."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from springlife.errors import InputError
from springlife.spring.surge import Wave, local_deflection
from springlife.spring.surge_wave import WaveMotion, march, struck

T = 0.01
FREE = Wave(T, 0.0)
PLACES = [0.0, 0.3, 0.75, 1.0]


def walk(n: int, seed: int = 3) -> NDArray[np.float64]:
    return np.asarray(0.005 + 1e-4 * np.random.default_rng(seed).normal(size=n).cumsum())


def balance(motion: WaveMotion, start: float) -> float:
    """Greatest error of the energy balance over the greatest energy; at rest a wire stores y^2/2 (over the rate)."""
    error = motion.stored + motion.lost - motion.work - start**2 / 2
    return float(np.abs(error).max() / motion.stored.max())


@pytest.mark.parametrize("attached", [True, False])
@pytest.mark.parametrize("zeta", [0.0, 0.02])
def test_energy_is_kept_account_of(attached: bool, zeta: float) -> None:
    # First law; the scheme moves waves without loss, so only rounding is left.
    y = walk(4000)
    motion = march(y, Wave(T, zeta), 25, attached=attached)
    assert balance(motion, y[0]) < 1e-12
    assert (motion.lost[-1] > 0) == (zeta > 0)


def test_without_damping_a_released_end_at_rest_keeps_its_energy() -> None:
    # First law: seats that stand still do no work on an attached wire.
    y = np.concatenate([np.linspace(0, 0.01, 30), np.full(5000, 0.01)])
    motion = march(y, FREE, 20, attached=True)
    assert np.ptp(motion.stored[40:]) < 1e-6 * motion.stored[-1]


def test_slow_motion_is_static_everywhere() -> None:
    # Static limit, a period of 200 travel times: within 0.1 %. By hand (w T)^2/3 = 0.00033 and damping's 0.00066.
    cells, amplitude = 20, 5e-3
    t = (np.arange(600 * cells + 1)) / cells
    y = 0.01 + amplitude * (1 - np.cos(2 * np.pi * t / 200))
    motion = march(y, Wave(T, 0.01), cells, PLACES)
    middle = (y[1:] + y[:-1]) / 2
    assert np.abs(motion.local - middle[:, None]).max() < 1e-3 * amplitude


@pytest.mark.parametrize("place", range(4))
def test_it_agrees_with_the_transfer_function_on_random_motion(place: int) -> None:
    # Two ways of solving one equation; content up to 6 f1 on 60 cells.
    cells, zeta = 60, 0.02
    rate = cells / T
    n = 1 << 14
    f = np.fft.rfftfreq(n, 1 / rate)
    rng = np.random.default_rng(4)
    z = np.fft.irfft((rng.normal(size=f.size) + 1j * rng.normal(size=f.size)) * np.exp(-((f / 150) ** 2)), n)
    y = 0.02 + 0.002 * z / z.std() * np.clip(np.arange(n) / 2000, 0, 1) ** 3
    wave = Wave(T, zeta)
    marched = march(y, wave, cells, PLACES, attached=True).local[:, place]
    found = np.concatenate(list(local_deflection([y], rate, wave, PLACES[place], upsample=2)), axis=1)[0, 1::2]
    assert np.abs(marched - found).max() < 0.01 * np.abs(found - y[0]).max()


@settings(deadline=None, max_examples=25)
@given(
    steps=st.lists(st.floats(-2e-3, 2e-3), min_size=2, max_size=120),
    zeta=st.sampled_from([0.0, 0.05]),
    cells=st.integers(1, 9),
)
def test_a_seat_that_cannot_pull_never_does(steps: list[float], zeta: float, cells: int) -> None:
    y = np.cumsum(steps)
    motion = march(y, Wave(T, zeta), cells)
    tiny = 1e-12 + 1e-9 * np.abs(y).max()
    assert motion.fixed_end.min() >= -tiny
    assert motion.moving_end.min() >= -tiny
    assert (motion.end_motion >= y[1:] - tiny).all()  # the wire never passes its seat
    apart = motion.end_motion > y[1:] + tiny
    assert np.abs(motion.moving_end[apart]).max(initial=0.0) <= tiny  # no force across a gap


def test_a_wire_let_go_flies_off_at_its_deflection_over_the_travel_time() -> None:
    # By hand: an unloading wave of speed y/T runs through; after T all is motion, nothing is stress.
    cells, rest = 50, 0.01
    y = np.concatenate([[rest], np.full(6 * cells, -1.0)])
    motion = march(y, FREE, cells, [0.0, 0.5, 1.0])
    assert motion.moving_end == pytest.approx(0.0, abs=1e-15)
    assert motion.fixed_end[: cells - 1] == pytest.approx(rest)
    assert motion.local[cells + 1 :] == pytest.approx(0.0, abs=1e-15)
    assert np.diff(motion.end_motion) == pytest.approx(-rest / cells)
    assert motion.work == pytest.approx(0.0, abs=1e-18)
    assert motion.lifted.all()


def test_a_held_wire_presses_as_it_was() -> None:
    motion = march(np.full(300, 0.01), FREE, 20, PLACES)
    assert motion.local == pytest.approx(0.01)
    assert not motion.lifted.any()
    assert march(np.full(300, -0.01), FREE, 20, PLACES).local == pytest.approx(0.0, abs=0.0)


def test_a_wire_that_comes_back_meets_its_seat() -> None:
    # The seat jumps back and waits: the wire must lift, strike, and at last rest on it with damping.
    cells = 20
    y = np.concatenate([np.full(10, 0.01), np.full(400 * cells, 0.002)])
    motion = march(y, Wave(T, 0.1), cells)
    assert motion.lifted[:400].any()
    assert motion.moving_end.max() > 0.004
    assert motion.moving_end[-1] == pytest.approx(0.002, rel=1e-3)


@pytest.mark.parametrize("ratio", [0.2, 0.5, 3.0])
def test_a_striking_mass_gives_its_energy_to_the_wire_and_takes_some_back(ratio: float) -> None:
    # First law: M v^2/2 over k is T^2 v^2/(2 m/M); the wire cannot hold more, nor keep less than nothing.
    motion = struck(ratio, 2.0, 2000, FREE, 100)
    given = T**2 * 4.0 / (2 * ratio)
    assert np.abs(motion.stored - motion.work).max() < 1e-12 * given
    assert motion.stored.max() < given
    assert motion.moving_end.min() >= 0


def test_the_march_is_of_second_order_with_damping() -> None:
    # A third of the step must divide the difference by about nine; the middle of step n is that of step 3n + 1.
    wave = Wave(T, 0.1)

    def force(cells: int, n: int) -> float:
        t = np.arange(8 * cells + 1) / cells
        return float(march(0.01 * np.sin(t / 2) ** 4, wave, cells, attached=True).fixed_end[n])

    n = 60
    first, second, third = force(9, n), force(27, 3 * n + 1), force(81, 9 * n + 4)
    assert (first - second) / (second - third) == pytest.approx(9.0, rel=0.15)


@pytest.mark.parametrize("attached", [True, False])
def test_compiled_and_plain_are_one(attached: bool) -> None:
    y = walk(500)
    for wave in (FREE, Wave(T, 0.02)):
        one, two = (march(y, wave, 20, PLACES, attached=attached, compiled=how) for how in (True, False))
        for name in ("local", "fixed_end", "moving_end", "end_motion", "stored", "work", "lost"):
            assert np.allclose(getattr(one, name), getattr(two, name), rtol=1e-12, atol=1e-18), name
    one, two = (struck(0.5, 1.0, 400, FREE, 50, compiled=how) for how in (True, False))
    assert np.allclose(one.fixed_end, two.fixed_end, rtol=1e-12, atol=1e-18)


def test_rows_stand_in_the_middle_of_steps_and_at_cell_borders() -> None:
    motion = march(walk(11), FREE, 4, [0.1, 0.3, 1.0])
    assert motion.times == pytest.approx((np.arange(10) + 0.5) * T / 4)
    assert motion.positions.tolist() == [0.0, 0.25, 1.0]


@pytest.mark.parametrize(
    ("y", "cells", "places", "says"),
    [
        ([0.01], 4, [0.0], "at least two finite numbers"),
        ([0.01, np.nan], 4, [0.0], "at least two finite numbers"),
        ([0.01, 0.02], 0, [0.0], "cells is 0"),
        ([0.01, 0.02], 4, [1.5], r"positions are \[1.5\]"),
    ],
)
def test_refusals(y: list[float], cells: int, places: list[float], says: str) -> None:
    with pytest.raises(InputError, match=says):
        march(y, FREE, cells, places)
    with pytest.raises(InputError, match="mass ratio 0"):
        struck(0.0, 1.0, 10, FREE, 4)
