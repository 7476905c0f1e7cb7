"""Short histories for the tests of counting, and what is right for them."""

from __future__ import annotations

from collections import Counter

import numpy as np
import rainflow
from hypothesis import strategies as st

from springlife.duty.counting import Count, CycleTable

Classes = dict[tuple[float, float], float]
READINGS = ("half", "repeat", "drop")
# The history of ASTM E1049-85 5.4.4, figure 6 (identity seen; digits from memory, recomputed).
STANDARD = [-2, 1, -3, 5, -1, 3, -4, 4, -2]

levels = st.lists(st.integers(0, 5), max_size=30)
floats = st.lists(st.floats(-1e6, 1e6, width=32), max_size=30)
histories = levels | floats
gapped = st.lists(st.integers(0, 5) | st.just(float("nan")), max_size=30)


def classes(table: CycleTable) -> Classes:
    """Rows of a table by pair; each pair stands once."""
    rows = {(float(a), float(b)): float(n) for a, b, n in zip(table.low, table.high, table.count, strict=True)}
    assert len(rows) == table.low.size
    return rows


def by_the_package(history) -> Classes:
    """The package's cycles; it gives none for two samples and one of no range for a constant series."""
    series = [float(x) for x in history]
    rows: Classes = Counter()
    if len(series) == 2 and series[0] != series[1]:
        return {(min(series), max(series)): 0.5}
    for span, _, number, i, j in rainflow.extract_cycles(series):
        if span:
            rows[min(series[i], series[j]), max(series[i], series[j])] += number
    return dict(rows)


def by_hand(history) -> tuple[Classes, list[float]]:
    """Closed cycles and residue by the rule on all points at once: drop what does not turn, close the first pair
    that both neighbours span, start again."""
    points = [float(x) for x in history]
    closed: Classes = Counter()
    while True:
        for i in range(len(points) - 1):
            if points[i] == points[i + 1] or (i and sorted(points[i - 1 : i + 2])[1] == points[i]):
                del points[i]
                break
            if 0 < i < len(points) - 2:
                inner, outer = sorted(points[i : i + 2]), sorted(points[i - 1 : i + 3 : 3])
                if outer[0] <= inner[0] and inner[1] <= outer[1]:
                    closed[tuple(inner)] += 1
                    del points[i : i + 2]
                    break
        else:
            return dict(closed), points


def same(a: Count, b: Count) -> bool:
    """Equal in everything that can be asked for."""
    return (
        a == b
        and all(classes(a.table(r)) == classes(b.table(r)) for r in READINGS)
        and np.array_equal([a.minimum, a.maximum], [b.minimum, b.maximum], equal_nan=True)
        and a.samples == b.samples
    )
