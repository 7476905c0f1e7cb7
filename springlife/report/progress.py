"""Progress on stderr, on a terminal only, and only for work of more than two seconds."""

from __future__ import annotations

import sys
import time

PATIENCE = 2.0  # s before anything is said
EVERY = 0.5  # s between two lines


class Progress:
    """Call it with what is being read and how many samples are done; ``close`` wipes the line."""

    def __init__(self) -> None:
        """Start the clock."""
        self._said = time.monotonic() + PATIENCE - EVERY
        self._shown = False

    def __call__(self, what: str, samples: int) -> None:
        """Say how far the work is, on one line that is written over."""
        self.doing(f"reading {what}: {samples:,} samples")

    def doing(self, what: str) -> None:
        """Say what is being done now."""
        now = time.monotonic()
        if sys.stderr.isatty() and now >= self._said + EVERY:
            self._said, self._shown = now, True
            sys.stderr.write(f"\r\x1b[K{what}")
            sys.stderr.flush()

    def close(self) -> None:
        """Wipe the line."""
        if self._shown:
            sys.stderr.write("\r\x1b[K")
            sys.stderr.flush()
