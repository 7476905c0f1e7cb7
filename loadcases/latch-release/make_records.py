"""Make the record of this case: an invented latch, the same bytes at every run.

One cycle of the plunger: cocked, released in a few milliseconds against a damped stop, and slowly cocked again.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np

RATE = 20_000.0  # Hz
COCKED, HOME = 20.0, 8.0  # mm of deflection
RELEASE = 3.6e-3  # s from cocked to home
HERE = Path(__file__).parent


def cycle() -> np.ndarray:
    """Deflection in mm over 0.16 s."""
    t = np.arange(int(0.16 * RATE)) / RATE
    since = t - 0.010
    fall = np.clip(since / RELEASE, 0.0, 1.0)
    y = COCKED - (COCKED - HOME) * (1 - np.cos(np.pi * fall)) / 2
    ringing = np.clip(since - RELEASE, 0.0, None)
    y += 0.5 * np.exp(-ringing / 0.006) * np.sin(2 * np.pi * 90 * ringing)
    cocking = np.clip((t - 0.070) / 0.080, 0.0, 1.0)
    return y + (COCKED - y) * (1 - np.cos(np.pi * cocking)) / 2


def main() -> None:
    rng = np.random.default_rng(20260611)
    y = cycle() + rng.normal(0, 0.002, cycle().size)
    rows = [f"{number / RATE:.5f},{value:.3f}" for number, value in enumerate(y)]
    text = "# plunger, laser at the spring's seat\ntime [s],deflection [mm]\n" + "\n".join(rows) + "\n"
    (HERE / "release.csv").write_text(text, encoding="utf-8")


if __name__ == "__main__":
    main()
