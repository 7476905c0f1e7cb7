"""Make the records of this case: an invented seat suspension, the same bytes at every run.

Writes smooth.csv, rough.csv and hits.csv beside this file, as a logger with a European locale would:
semicolons, decimal commas, a units row under the header.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np

RATE = 250.0  # Hz
HERE = Path(__file__).parent


def random_motion(rng: np.random.Generator, seconds: float, rms: float) -> np.ndarray:
    """Band-limited random travel in mm: a seat on its spring, loudest near 1.6 Hz, still by 8 Hz."""
    n = int(seconds * RATE)
    frequency = np.fft.rfftfreq(n, 1 / RATE)
    resonance = 1 / np.sqrt((1 - (frequency / 1.6) ** 2) ** 2 + (0.5 * frequency / 1.6) ** 2)
    shape = np.where((frequency > 0.3) & (frequency < 8.0), resonance, 0.0)
    phase = rng.uniform(0, 2 * np.pi, frequency.size)
    motion = np.fft.irfft(shape * rng.rayleigh(size=frequency.size) * np.exp(1j * phase), n)
    return motion * rms / motion.std()


def hits(rng: np.random.Generator, seconds: float, heights: list[float]) -> np.ndarray:
    """A quiet ride with stump strikes: a fast push of the given height in mm that rings down."""
    motion = random_motion(rng, seconds, 2.5)
    t = np.arange(motion.size) / RATE
    for number, height in enumerate(heights):
        after = np.clip(t - (2.0 + number * (seconds - 3.0) / len(heights)), 0.0, None)
        motion += height * np.exp(-3.2 * after) * np.sin(2 * np.pi * 1.7 * after) * (after > 0)
    return motion


def write(name: str, travel: np.ndarray) -> None:
    lines = ["time;seat travel;seat temperature", "s;mm;degC"]
    for number, value in enumerate(travel):
        row = f"{number / RATE:.3f};{value:.2f};{31.5 + 0.4 * number / travel.size:.1f}"
        lines.append(row.replace(".", ","))
    (HERE / name).write_text("\r\n".join(lines) + "\r\n", encoding="utf-8-sig", newline="")


def main() -> None:
    rng = np.random.default_rng(20260417)
    write("smooth.csv", random_motion(rng, 60.0, 4.0))
    write("rough.csv", random_motion(rng, 60.0, 8.6))
    write("hits.csv", hits(rng, 20.0, [32.0, 50.0, 40.0]))


if __name__ == "__main__":
    main()
