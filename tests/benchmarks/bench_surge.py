"""Surge of a minute at 1 kHz judged at 50 positions, against the minute itself and against one long transform.

    python tests/benchmarks/bench_surge.py [seconds]

"judged" is the local deflection at every position, with peaks sampled finely enough, and its rainflow count.
Memory is the growth of the process's greatest resident size; it must not grow with the length of the record.
"""

from __future__ import annotations

import resource
import sys
import time

import numpy as np

from springlife.duty.counting import Tally
from springlife.spring.surge import Wave, local_deflection, peak_factor, response

RATE, POSITIONS, UP_TO = 1000.0, np.linspace(0, 1, 50), 250.0
WAVE = Wave(0.01, 0.01)


def blocks(seconds: float) -> list[np.ndarray]:
    """Return a random walk through a low pass, a second a block."""
    rng = np.random.default_rng(1)
    y = 0.0
    found = []
    for _ in range(round(seconds)):
        found.append(0.02 + y + np.convolve(rng.normal(size=int(RATE)), np.hanning(20), "same") * 1e-4)
    return found


def judged(parts: list[np.ndarray]) -> float:
    """Return the cycles of all positions."""
    counters = [Tally() for _ in POSITIONS]
    finer = peak_factor(UP_TO, RATE)
    for block in local_deflection(parts, RATE, WAVE, POSITIONS, up_to=UP_TO, upsample=finer):
        for counter, row in zip(counters, block, strict=True):
            counter.feed(row)
    return sum(float(counter.result().table("half").count.sum()) for counter in counters)


def one_transform(parts: list[np.ndarray]) -> float:
    """Transform the whole record at once, once a position, and count nothing."""
    y = np.concatenate(parts)
    n = 2 * y.size
    spectrum = np.fft.rfft(y - y[0], n)
    f = np.fft.rfftfreq(n, 1 / RATE)
    return sum(float(np.fft.irfft(spectrum * response(f, np.array([x]), WAVE)[0], n)[0]) for x in POSITIONS)


def megabytes() -> float:
    """Return the greatest resident size so far."""
    return resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024


def main() -> None:
    """Print figures of one run."""
    seconds = float(sys.argv[1]) if len(sys.argv) > 1 else 60.0
    judged(blocks(10))  # compile
    for length in (seconds, 4 * seconds):
        parts = blocks(length)
        before, start = megabytes(), time.perf_counter()
        cycles = judged(parts)
        taken = time.perf_counter() - start
        print(
            f"{length:.0f} s at {POSITIONS.size} positions: {taken:.2f} s, {length / taken:.0f} times real time, "
            f"{cycles:.0f} cycles, {megabytes() - before:.0f} MB more"
        )
    parts = blocks(seconds)
    start = time.perf_counter()
    one_transform(parts)
    whole = time.perf_counter() - start
    start = time.perf_counter()
    judged(parts)
    print(f"judging a block at a time takes {(time.perf_counter() - start) / whole:.2f} times one plain long transform")


if __name__ == "__main__":
    main()
