"""Make lift.csv: an invented plunger cam with cycloidal flanks and a dwell, the same bytes at every run."""

from __future__ import annotations

from pathlib import Path

import numpy as np

LIFT, RISE, DWELL = 0.65, 80.0, 30.0  # in, degrees, degrees
HERE = Path(__file__).parent


def flank(part: np.ndarray) -> np.ndarray:
    """Cycloidal rise from 0 to 1."""
    part = np.clip(part, 0.0, 1.0)
    return part - np.sin(2 * np.pi * part) / (2 * np.pi)


def main() -> None:
    angle = np.arange(0.0, 360.0, 1.0)
    lift = LIFT * (flank((angle - 60) / RISE) - flank((angle - 60 - RISE - DWELL) / RISE))
    rows = [f"{a:.0f},{y:.5f}" for a, y in zip(angle, lift, strict=True)]
    (HERE / "lift.csv").write_text("angle [deg],lift [in]\n" + "\n".join(rows) + "\n", encoding="utf-8")


if __name__ == "__main__":
    main()
