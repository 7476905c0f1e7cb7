"""One pass of the duty: events in order with their repeats, counted exactly, transitions included.

Closed cycles and residues form a monoid, so a pass, and a whole service life of passes, is counted
without ever being written out. Cycles that span events are shared half and half between the events in
which their two ends lie, so the events' shares add up to the whole.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Literal

import numpy as np
from numpy.typing import NDArray

from springlife.duty.counting import Count, traced

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]
Residue = Literal["half", "repeat", "drop"]


@dataclass(frozen=True)
class Event:
    """One event of a pass: the count of one occurrence, in deflection (m), and how often it happens."""

    name: str
    count: Count
    repeats: int = 1

    @cached_property
    def repeated(self) -> Count:
        """The count of all occurrences in one pass."""
        return self.repeats * self.count


@dataclass(frozen=True)
class EventCycles:
    """Cycles with the events that hold their two ends.

    ``low``, ``high`` (m), ``count`` and the event numbers ``event_low``, ``event_high``, all of shape (n,).
    """

    low: Floats
    high: Floats
    count: Floats
    event_low: Ints
    event_high: Ints


@dataclass(frozen=True)
class Pass:
    """One pass of the duty: its events in order."""

    events: tuple[Event, ...]

    @cached_property
    def total(self) -> Count:
        """The count of one pass."""
        return sum((event.repeated for event in self.events), Count())

    def cycles(self, residue: Residue = "repeat") -> EventCycles:
        """Return the cycles of one pass with the events of their ends.

        ``"repeat"`` gives what one more pass adds once the pass recurs.
        """
        joined = np.concatenate([event.repeated.residue for event in self.events])
        owner = np.repeat(np.arange(len(self.events)), [event.repeated.residue.size for event in self.events])
        low, high, count, at_low, at_high = traced(joined, residue)
        closed = [event.repeated.settled(residue) for event in self.events]  # pieces between gaps included
        inside = np.repeat(np.arange(len(closed)), [part.low.size for part in closed])
        return EventCycles(
            low=np.concatenate([*(part.low for part in closed), low]),
            high=np.concatenate([*(part.high for part in closed), high]),
            count=np.concatenate([*(part.count for part in closed), count]).astype(np.float64),
            event_low=np.concatenate([inside, owner[at_low]]),
            event_high=np.concatenate([inside, owner[at_high]]),
        )

    def life(self, passes: float, residue: Residue) -> tuple[Floats, Floats, Floats]:
        """Return low, high and count of the cycles of ``passes`` passes in sequence.

        Whole passes are counted exactly; a part of a pass adds that part of the steady state.
        """
        steady = self.total.table("repeat")
        if residue == "repeat":  # the n-fold pass repeated is n times the steady state, exactly
            return steady.low, steady.high, steady.count * passes
        whole = max(1, int(passes))
        table = (whole * self.total).table(residue)
        scale = min(1.0, passes)  # less than one pass: that part of the first
        rest = max(0.0, passes - whole)
        return (
            np.concatenate([table.low, steady.low]),
            np.concatenate([table.high, steady.high]),
            np.concatenate([table.count * scale, steady.count * rest]),
        )
