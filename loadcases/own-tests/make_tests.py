"""Make tests.csv: invented fatigue tests of 40 springs, peened and not, the same bytes at every run."""

from __future__ import annotations

from pathlib import Path

import numpy as np

HERE = Path(__file__).parent
RUN_OUT = 1e7  # cycles at which a spring still whole is taken off
# group: cycles at 300 MPa fully reversed, slope, standard deviation of log10 life
GROUPS = {"unpeened": (3.0e6, 8.5, 0.20), "peened": (4.0e7, 11.0, 0.24)}
LEVELS = {"unpeened": (310, 270, 235, 205), "peened": (400, 350, 305, 265)}  # MPa, stress amplitude
MEAN = 420.0  # MPa
SSU = 985.0  # MPa, of the wire these springs stand for


def main() -> None:
    rng = np.random.default_rng(20260502)
    rows = ["stress_amplitude [MPa],stress_mean [MPa],cycles,outcome,group"]
    for group, (base, slope, scatter) in GROUPS.items():
        for level in LEVELS[group]:
            for _ in range(5):
                reversed_amplitude = level / (1 - (MEAN / SSU) ** 2)
                life = base * (300.0 / reversed_amplitude) ** slope * 10 ** rng.normal(0, scatter)
                stopped = life > RUN_OUT
                cycles = int(RUN_OUT if stopped else life)
                rows.append(f"{level},{MEAN:g},{cycles},{'run-out' if stopped else 'failed'},{group}")
    (HERE / "tests.csv").write_text("\n".join(rows) + "\n", encoding="utf-8")


if __name__ == "__main__":
    main()
