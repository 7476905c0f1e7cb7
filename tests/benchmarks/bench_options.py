"""A thousand variants of a spring judged from one counted set of 1e5 distinct cycles; the record is not touched again.

python tests/benchmarks/bench_options.py
"""

from __future__ import annotations

import time
from dataclasses import replace
from itertools import product

import numpy as np

from springlife.duty.counting import count
from springlife.life.damage import DamageModel
from springlife.spring.helical import HelicalSpring
from springlife.spring.stress import stress_map
from springlife.strength.criteria import criterion
from springlife.strength.curve import endurance_curve

ASKED = 10.0  # seconds for a thousand
CYCLES = 100_000


def damage(spring: HelicalSpring, low: np.ndarray, high: np.ndarray, number: np.ndarray) -> float:
    """Return Miner's sum of one variant, stress map, criterion and curve made anew."""
    rule = criterion("goodman")
    curve = endurance_curve(
        "zimmerli",
        rule,
        shot_peened=spring.shot_peened,
        family=spring.grade.cyclic_family,
        Sut=spring.Sut,
        Ssu=spring.Ssu,
        Ssy=spring.Ssy,
    )
    model = DamageModel(stress_map(spring), rule, curve, spring.Ssu, spring.Ssy, "haibach")
    return float(model.damage(low, high, number).sum())


def main() -> None:
    """Count once, then judge."""
    base = HelicalSpring(
        grade="A401", wire_diameter=4.5e-3, mean_diameter=29e-3, total_coils=24, free_length=0.26, shot_peened=True
    )  # fmt: skip
    record = 0.05 + 0.012 * np.random.default_rng(1).normal(size=4 * CYCLES)  # deflection, m
    table = count(record).table()
    rows = np.linspace(0, table.low.size - 1, CYCLES).astype(int)
    low, high, number = table.low[rows], table.high[rows], table.count[rows]
    assert low.size == CYCLES
    wires, coils = np.linspace(4.2e-3, 4.8e-3, 25), np.linspace(20, 26, 40)
    start = time.perf_counter()
    sums = [
        damage(replace(base, wire_diameter=float(d), total_coils=float(n)), low, high, number)
        for d, n in product(wires, coils)
    ]
    took = time.perf_counter() - start
    assert np.isfinite(sums).all() and len(set(sums)) > 900  # the variants do differ
    print(
        f"{len(sums)} variants on {CYCLES} cycles: {took:.2f} s, {len(sums) / took:.0f} a second (asked: {ASKED:g} s)"
    )


if __name__ == "__main__":
    main()
