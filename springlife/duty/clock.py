"""The time column of a record: its rate, and where it breaks.

A break is a missing time, a time that goes back, a repeated time, an interval longer than 1.5 times the
usual one (a missing row doubles it), or a lasting change of rate.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import Literal

import numpy as np

from springlife.duty.formats.table import Floats
from springlife.units import significant

LONGER = 1.5  # an interval this many times the usual one is a gap: half way to one missing row
WINDOW = 16  # intervals that must agree before a new rate is believed
EVENLY = 5  # irregular intervals from which rounded time stamps can be told from missing rows

Kind = Literal["missing", "back", "repeat", "jump", "rate"]


@dataclass(frozen=True)
class Break:
    """The clock breaks before sample ``index`` of the block just fed; ``what`` says how, with both times."""

    index: int
    kind: Kind
    what: str


@dataclass
class Clock:
    """Follows the times of a record, in s, block by block."""

    last: float | None = None
    interval: float | None = None  # the usual one
    longest: float = np.inf  # an interval longer than this is a gap
    rounded_to: float | None = None  # the stamps' resolution, when they are rounded more coarsely than the rate
    repeats: int = 0
    breaks: int = 0
    start: float | None = None
    _regular_time: float = field(default=0.0, repr=False)
    _regular_count: int = field(default=0, repr=False)

    def feed(self, times: Floats) -> list[Break]:
        """Take the next times (s); return the breaks among them in order."""
        missing = np.flatnonzero(np.isnan(times))
        if missing.size:
            # Nothing is known about the order around a missing time: break there and go on with the rest.
            found = [Break(int(i), "missing", "the time is missing") for i in missing]
            kept = np.flatnonzero(~np.isnan(times))
            self.breaks += missing.size
            found += [Break(int(kept[b.index]), b.kind, b.what) for b in self.feed(times[kept])]
            return sorted(found, key=lambda b: b.index)
        if not times.size:
            return []
        before = times[0] if self.last is None else self.last
        if self.start is None:
            self.start = float(times[0])
        series = np.concatenate([[before], times])
        steps = np.diff(series)
        if self.last is None:
            steps[0] = np.nan  # no interval before the first row
        if self.interval is None:
            self._settle(steps[1:] if self.last is None else steps)
        found = self._search(series, steps)
        self.last = float(times[-1])
        return found

    @property
    def rate(self) -> float | None:
        """Samples a second over all regular intervals, Hz."""
        return self._regular_count / self._regular_time if self._regular_time > 0 else None

    @property
    def span(self) -> float | None:
        """Time from the first row to the last, s."""
        return None if self.start is None or self.last is None else self.last - self.start

    def _settle(self, steps: Floats) -> None:
        """Learn the usual interval from the first block."""
        forward = steps[steps > 0]
        if not forward.size:
            return
        self.interval = float(np.median(forward))
        self.longest = LONGER * self.interval
        irregular = (steps > self.longest) | (steps == 0)
        if np.count_nonzero(irregular) < EVENLY or (steps < 0).any():
            return
        # Stamps rounded more coarsely than the rate repeat or skip evenly, within one step of a straight line.
        elapsed = np.concatenate([[0.0], np.cumsum(steps)])
        index = np.arange(elapsed.size) - (elapsed.size - 1) / 2
        slope = float(index @ elapsed / (index @ index))
        quantum = float(forward.min())
        if np.ptp(elapsed - slope * index) <= 1.05 * quantum:
            self.interval, self.longest, self.rounded_to = slope, slope + 1.05 * quantum, quantum

    def _search(self, series: Floats, steps: Floats) -> list[Break]:
        found: list[Break] = []
        at = 0
        for i, kind, usual in self._events(steps):
            self._add_regular(steps[at:i])
            at = i + 1
            found.append(Break(i, kind, _sentence(kind, float(series[i]), float(series[i + 1]), usual)))
            if kind == "repeat":
                self.repeats += 1
            else:
                self.breaks += 1
        self._add_regular(steps[at:])
        return found

    def _add_regular(self, steps: Floats) -> None:
        known = steps[1:] if steps.size and np.isnan(steps[0]) else steps
        self._regular_time += float(known.sum())
        self._regular_count += known.size

    def _events(self, steps: Floats) -> Iterator[tuple[int, Kind, float]]:
        """Yield index, kind and usual interval of each break; a lasting new rate becomes the usual one."""
        at: int | None = 0
        while at is not None:
            rest = steps[at:]
            bad = (rest < 0) | (rest > self.longest)
            if self.rounded_to is None:
                bad |= rest == 0
            faster = self._faster(rest)
            restart = None
            for i in np.flatnonzero(bad):
                if faster is not None and faster < i:
                    break
                usual, ahead = self.interval or np.nan, rest[i : i + WINDOW]
                if rest[i] <= 0:
                    yield at + int(i), "back" if rest[i] < 0 else "repeat", usual
                elif ahead.size >= WINDOW // 4 and np.median(ahead) > self.longest:
                    yield at + int(i), "rate", usual
                    restart = int(i)
                    break
                else:
                    yield at + int(i), "jump", usual
            if restart is None and faster is not None:
                yield at + faster, "rate", self.interval or np.nan
                restart = faster
            if restart is not None:
                self.interval = float(np.median(rest[restart : restart + WINDOW]))
                self.longest, self.rounded_to = LONGER * self.interval, None
            at = None if restart is None else at + restart + 1

    def _faster(self, steps: Floats) -> int | None:
        """Find where most of the next intervals become shorter than the usual one for good."""
        if self.interval is None or self.rounded_to is not None:
            return None
        short = (steps > 0) & (steps < self.interval / LONGER)
        if np.count_nonzero(short) < WINDOW:
            return None
        sums = np.concatenate([[0], np.cumsum(short)])
        lasting = sums[WINDOW:] - sums[:-WINDOW] > 3 * WINDOW // 4
        starts = np.flatnonzero(lasting & short[: lasting.size])
        return int(starts[0]) if starts.size else None


def _sentence(kind: Kind, before: float, after: float, usual: float) -> str:
    """Say what breaks, with both times."""
    a, b = f"{before:.15g} s", f"{after:.15g} s"  # seconds since 1970 have ten digits before the point
    if kind == "back":
        return f"the time goes back from {a} to {b}"
    if kind == "repeat":
        return f"the time {b} occurs twice"
    if kind == "rate":
        return f"the interval changes for good from {significant(usual)} s at {a}"
    return f"the time jumps from {a} to {b}, where {significant(usual)} s is usual"
