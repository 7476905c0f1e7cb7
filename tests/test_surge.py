"""Surge by the transfer function: limits, resonances, blocks, starts and ends, and the rate that a record needs."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from springlife.errors import InputError
from springlife.spring.grade import grade
from springlife.spring.helical import HelicalSpring
from springlife.spring.stress import stress_map, wahl
from springlife.spring.surge import (
    Wave,
    impact_stress,
    local_deflection,
    needed_rate,
    peak_factor,
    periodic,
    response,
    transfer,
    wave_of,
)
from springlife.spring.surge_filter import upsampled

SPRING = HelicalSpring(grade=grade("A228"), wire_diameter=2e-3, mean_diameter=16e-3, total_coils=12, free_length=60e-3)
T = 0.01
WAVE = Wave(T, 0.01)
PLACES = np.array([0.0, 0.25, 0.5, 0.9, 1.0])


def local(y: NDArray[np.float64], rate: float, wave: Wave = WAVE, places: Any = PLACES, **how: Any) -> Any:
    return np.concatenate(list(local_deflection([y], rate, wave, places, **how)), axis=1)


def noise(n: int, rate: float, below: float, seed: int = 1) -> NDArray[np.float64]:
    """Random motion about 20 mm, 2 mm rms, without content much above ``below`` Hz, that begins gently."""
    rng = np.random.default_rng(seed)
    f = np.fft.rfftfreq(n, 1 / rate)
    z = np.fft.irfft((rng.normal(size=f.size) + 1j * rng.normal(size=f.size)) * np.exp(-((2 * f / below) ** 2)), n)
    return np.asarray(0.02 + 0.002 * z / z.std() * rise(np.arange(n) / (rate * 20 * T)))


def rise(x: NDArray[np.float64]) -> NDArray[np.float64]:
    """From 0 at 0 to 1 at 1 with all derivatives, so that nothing of it lies above any band."""
    x = np.clip(x, 1e-9, 1 - 1e-9)
    return np.asarray(1 / (1 + np.exp(np.clip(1 / x - 1 / (1 - x), -700, 700))))


# --- the transfer function --------------------------------------------------------------------------------


def test_the_first_natural_frequency_is_that_of_the_spring() -> None:
    # SMED eq. 10-25: f1 = (1/2) sqrt(k/m).
    assert wave_of(SPRING, 0.01).first_frequency == pytest.approx(SPRING.surge_frequency, rel=1e-12)


def test_at_rest_every_coil_has_the_deflection_of_the_spring() -> None:
    assert transfer(0.0, PLACES, WAVE).tolist() == [1.0] * PLACES.size
    assert transfer(0.0, 0.3, Wave(T, 0.0)) == 1.0


@pytest.mark.parametrize("zeta", [0.0, 0.01, 0.05])
def test_slow_motion_is_nearly_static_everywhere(zeta: float) -> None:
    # Limiting case, a period of 200 travel times. By hand, b^2/3 with b^2 = (w T)^2 - 2 i zeta pi w T:
    # the in-phase part differs from 1 by (w T)^2/3 = 0.00033 at most.
    H = transfer(1 / (200 * T), PLACES, Wave(T, zeta))
    assert np.abs(np.abs(H) - 1).max() < 1e-3


@pytest.mark.parametrize("mode", [1, 2, 3, 7])
def test_it_resonates_at_multiples_of_the_first_frequency(mode: int) -> None:
    # Natural frequencies of a rod between seats: n f1 (SMED eq. 10-25, memory).
    wave = Wave(T, 0.002)
    f = np.linspace(mode - 0.3, mode + 0.3, 60_001) * wave.first_frequency
    H = np.abs(transfer(f, 0.0, wave))
    assert f[H.argmax()] == pytest.approx(mode * wave.first_frequency, rel=1e-3)
    # By hand: sin(n pi - i zeta pi) has the size zeta pi, b the size n pi.
    assert H.max() == pytest.approx(mode / wave.zeta, rel=1e-3)


def test_half_power_width_is_that_of_the_damping_ratio() -> None:
    # Definition of the damping ratio: width at 1/sqrt(2) over the frequency is 2 zeta.
    f = np.linspace(0.9, 1.1, 200_001) * WAVE.first_frequency
    H = np.abs(transfer(f, 0.0, WAVE))
    wide = f[np.sqrt(2) * H > H.max()]
    assert np.ptp(wide) / WAVE.first_frequency == pytest.approx(2 * WAVE.zeta, rel=0.01)


def test_both_ends_moving_alike_excite_even_modes_only() -> None:
    # Symmetry: the middle coil stays, so the response is even about it and the first mode is not excited.
    f = np.array([WAVE.first_frequency, 2 * WAVE.first_frequency])
    both = np.abs(response(f, PLACES, WAVE, "both"))
    one = np.abs(response(f, PLACES, WAVE))
    assert np.allclose(both[0], both[-1])
    assert both[0, 0] < 0.02 * one[0, 0]
    assert both[0, 1] == pytest.approx(one[0, 1], rel=0.01)


# --- histories --------------------------------------------------------------------------------------------


def test_a_spring_held_still_stays_as_it_is() -> None:
    assert local(np.full(500, 0.02), 2000.0) == pytest.approx(0.02, abs=1e-15)


def test_slow_motion_follows_the_record() -> None:
    # Static limit: a period of 200 travel times, within 0.1 % of the amplitude once the start has died away.
    rate, amplitude = 1000.0, 5e-3
    t = np.arange(12_000) / rate
    y = 0.02 + amplitude * (1 - np.cos(2 * np.pi * t / (200 * T)))
    late = local(y, rate)[:, 6000:] - 0.02 - amplitude
    reached = [np.hypot(*np.linalg.lstsq(_sine(t[6000:], 1 / (200 * T)), row, rcond=None)[0]) for row in late]
    assert reached == pytest.approx([amplitude] * PLACES.size, rel=1e-3)


def _sine(t: NDArray[np.float64], f: float) -> NDArray[np.float64]:
    return np.column_stack([np.cos(2 * np.pi * f * t), np.sin(2 * np.pi * f * t)])


def test_an_end_brought_to_speed_adds_the_impact_stress_and_twice_that_at_the_fixed_end() -> None:
    # Classical wave result: K v sqrt(2 rho G); the wave doubles at the fixed end and comes back at 2T.
    wave = wave_of(SPRING, 2e-3)
    speed, steps = 0.5, 100  # m/s, samples a travel time
    t = np.arange(6 * steps) / steps
    v = speed * rise(t / 0.4)  # to speed in 0.4 T; the distance travelled by summing
    y = 0.01 + np.concatenate([[0.0], np.cumsum((v[1:] + v[:-1]) / 2)]) * wave.travel_time / steps
    stress = stress_map(SPRING, "wahl").alternating * (local(y, steps / wave.travel_time, wave, [0.0, 1.0]) - 0.01)
    at = {n: int((n + 0.7) * steps) for n in (0, 1, 2)}
    K = wahl(SPRING.index)
    impact = impact_stress(speed, SPRING.G, SPRING.grade.density, K)
    assert impact == pytest.approx(K * speed * np.sqrt(2 * SPRING.grade.density * SPRING.G), rel=1e-12)
    assert stress[1, at[0]] == pytest.approx(impact, rel=0.01)
    assert stress[0, at[0]] == pytest.approx(0.0, abs=0.01 * impact)
    assert stress[0, at[1]] == pytest.approx(2 * impact, rel=0.01)
    assert stress[1, at[2]] == pytest.approx(3 * impact, rel=0.01)


@settings(deadline=None, max_examples=20)
@given(cuts=st.lists(st.integers(0, 6000), max_size=8), start=st.sampled_from(["rest", "moving"]))
def test_a_history_in_blocks_is_the_history(cuts: list[int], start: Any) -> None:
    y = noise(6000, 1000.0, 150.0)
    wave = Wave(T, 0.1)
    whole = local(y, 1000.0, wave, start=start, upsample=2)
    parts = np.split(y, sorted(cuts))
    blocks = np.concatenate(list(local_deflection(parts, 1000.0, wave, PLACES, start=start, upsample=2)), axis=1)
    assert blocks.shape == whole.shape == (PLACES.size, 11_999)
    assert np.array_equal(blocks, whole)


def test_long_histories_come_in_many_blocks_equal_to_one_transform() -> None:
    # Independent: the whole history, from rest to rest, in one zero-padded transform.
    rate, wave = 1000.0, Wave(T, 0.1)
    y = noise(20_000, rate, 150.0)
    y = 0.02 + (y - 0.02) * rise((19_800 - np.arange(y.size)) / 400)  # comes to rest
    n = 1 << 16
    f = np.fft.rfftfreq(n, 1 / rate)
    whole = 0.02 + np.fft.irfft(np.fft.rfft(y - 0.02, n) * response(f, PLACES, wave), n)[:, : y.size]
    blocks = list(local_deflection([y], rate, wave, PLACES))
    assert len(blocks) > 3
    assert np.abs(np.concatenate(blocks, axis=1) - whole).max() < 1e-6 * np.std(y)


def test_nothing_wraps_around() -> None:
    # Causality: what happens at the end of a record cannot be felt before, but for the truncation: 1e-6 of each of
    # the 1/(pi zeta) = 32 waves remembered.
    y = noise(8000, 2000.0, 150.0)
    other = y.copy()
    other[7000:] += 1e-3 * (np.arange(1000) / 2000) ** 2
    apart = np.abs(local(y, 2000.0) - local(other, 2000.0))
    assert apart[:, :6800].max() < 1e-4 * apart[:, 7100:].max()


def test_a_motion_under_way_is_a_strike_only_when_it_starts_from_rest() -> None:
    # Steady state of a sine that goes on for ever: |H| at each place.
    f, amplitude = 8.0, 1e-3
    t = np.arange(4000) / 1000.0
    y = 0.02 + amplitude * np.sin(2 * np.pi * f * t)
    steady = np.abs(transfer(f, PLACES, WAVE)) * amplitude
    strike = 2 * np.pi * f * amplitude * T  # its impact in deflection: v T, doubled at the fixed end
    early = slice(150, 400)
    rest, moving = (np.abs(local(y, 1000.0, start=start) - 0.02)[:, early].max(axis=1) for start in ("rest", "moving"))
    assert np.abs(moving - steady).max() < 0.05 * strike
    assert (rest - steady)[0] > 0.5 * strike


def test_what_is_above_the_band_is_left_out() -> None:
    rate = 2000.0
    t = np.arange(8000) / rate
    y = 0.02 + 1e-3 * (1 - np.cos(2 * np.pi * 10 * t))
    hum = 1e-5 * np.sin(2 * np.pi * 400 * t) * rise(t)
    clean, dirty = local(y, rate, up_to=100.0), local(y + hum, rate, up_to=100.0)
    assert np.abs(dirty - clean)[:, :-1200].max() < 1e-9
    # 8 f1 is a natural frequency; by hand |H| = n/zeta = 800, so that 10 um would read as 8 mm.
    assert np.abs(local(y + hum, rate) - clean)[:, -2000:-1200].max() > 6e-3


def test_a_motion_that_repeats_for_ever_is_the_steady_state_of_one_that_goes_on() -> None:
    # Independent: march the history until its start has died away.
    def turn(n: int) -> NDArray[np.float64]:
        angle = 2 * np.pi * np.arange(n) / n
        return np.asarray(0.02 + 1e-3 * np.cos(angle) + 4e-4 * np.sin(3 * angle))

    steady = periodic(turn(200), 20.0, WAVE, PLACES, up_to=70.0)
    assert steady.shape == (PLACES.size, 200)
    late = local(np.tile(turn(200), 140), 4000.0)[:, 130 * 200 : 131 * 200]
    assert np.abs(steady - late).max() < 1e-7
    # Static limit: a very slow turn moves every coil alike.
    assert periodic(turn(200), 1e-4, WAVE, PLACES) == pytest.approx(np.tile(turn(990), (5, 1)), abs=1e-8)


def test_harmonics_above_the_band_are_left_out_and_peaks_are_sampled() -> None:
    # By hand: the third harmonic of 20 Hz is above 50 Hz, the second is kept: ten samples of it a cycle make 20.
    turn = np.cos(2 * np.pi * np.arange(8) / 8) + np.cos(6 * np.pi * np.arange(8) / 8)
    steady = periodic(turn, 20.0, Wave(1e-9, 0.01), [0.5], up_to=50.0)
    assert steady[0] == pytest.approx(np.cos(2 * np.pi * np.arange(20) / 20), abs=1e-8)


def test_a_short_history_is_served() -> None:
    assert local(np.array([0.01]), 1000.0).shape == (PLACES.size, 1)
    assert local(np.array([0.01, 0.011]), 1000.0, upsample=3).shape == (PLACES.size, 4)
    assert list(local_deflection([], 1000.0, WAVE, PLACES)) == []
    assert list(local_deflection([[], []], 1000.0, WAVE, PLACES)) == []


# --- rates ------------------------------------------------------------------------------------------------


def test_the_rate_that_a_record_needs() -> None:
    # By hand: T = 10 ms gives f1 = 50 Hz; three modes at 2.56 samples a cycle: 384 Hz.
    assert needed_rate(WAVE) == pytest.approx(384.0)
    assert needed_rate(Wave(2 * T, 0.01)) == pytest.approx(192.0)


@pytest.mark.parametrize(("up_to", "factor"), [(100.0, 1), (101.0, 2), (400.0, 4), (1.0, 1)])
def test_peaks_get_ten_samples_a_cycle(up_to: float, factor: int) -> None:
    # By hand: 10 x up_to / 1000 Hz, rounded up.
    assert peak_factor(up_to, 1000.0) == factor


def test_upsampling_is_exact_within_the_band() -> None:
    # A sine is its own interpolation, cut off or not at whole periods.
    t = np.arange(1001) / 1000.0
    fine = np.arange(4001) / 4000.0
    y = 0.02 + 1e-3 * np.sin(2 * np.pi * 100 * t)
    up = upsampled(y, 4)
    assert up.shape == fine.shape
    assert np.abs(up - 0.02 - 1e-3 * np.sin(2 * np.pi * 100 * fine)).max() < 1e-10
    assert np.abs(up[::4] - y).max() < 1e-10


def test_peaks_between_samples_are_seen() -> None:
    # At 2.5 samples a cycle a sine's samples reach only cos(pi/10) = 0.951 of its peak; derived.
    rate, f = 250.0, 100.0
    t = np.arange(2001) / rate
    y = np.sin(2 * np.pi * f * t) * rise(t)
    samples = local(y, rate, Wave(1e-4, 0.1), [0.5], upsample=peak_factor(f, rate))[0]
    assert samples[4000:-200].max() == pytest.approx(1.0, rel=0.05)
    assert np.abs(y[1000:1010]).max() < 0.952


# --- refusals ---------------------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("how", "says"),
    [
        ({"wave": Wave(T, 0.0)}, "damping ratio is 0"),
        ({"places": [0.0, 1.2]}, r"positions are \[0.0, 1.2\]"),
        ({"places": []}, "positions are"),
        ({"rate": 0.0}, "sample rate is 0 Hz"),
        ({"up_to": 450.0}, "up_to is 450 Hz; it must be above 0 and at most 400 Hz"),
        ({"up_to": 0.0}, "up_to is 0 Hz"),
        ({"upsample": 0}, "upsample is 0"),
        ({"rate": 1e6}, "resample the record to about 3800 Hz"),
    ],
)
def test_refusals(how: dict[str, Any], says: str) -> None:
    how = {"rate": 1000.0, **how}
    with pytest.raises(InputError, match=says):
        local(np.linspace(0.01, 0.02, 50), **how)


@pytest.mark.parametrize("bad", [np.nan, np.inf])
def test_a_gap_is_refused(bad: float) -> None:
    with pytest.raises(InputError, match="gap or an infinite value"):
        local(np.array([0.01, bad, 0.02]), 1000.0)


@pytest.mark.parametrize(
    ("T", "zeta", "says"),
    [(0.0, 0.01, "travel_time is 0"), (0.01, 1.0, "damping ratio is 1"), (0.01, -0.1, "-0.1"), (np.nan, 0.0, "nan")],
)
def test_a_wave_that_cannot_be_is_refused(T: float, zeta: float, says: str) -> None:
    with pytest.raises(InputError, match=says):
        Wave(T, zeta)
