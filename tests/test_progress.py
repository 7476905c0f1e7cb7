"""Progress is for people who wait at a terminal: silent when piped, silent when quick."""

from __future__ import annotations

import io

import pytest

from springlife.report import progress
from springlife.report.progress import Progress


class Terminal(io.StringIO):
    def isatty(self) -> bool:
        return True


@pytest.mark.parametrize(("terminal", "waited", "said"), [(True, 3.0, True), (True, 1.0, False), (False, 3.0, False)])
def test_when_it_speaks(terminal: bool, waited: float, said: bool, monkeypatch: pytest.MonkeyPatch) -> None:
    out = Terminal() if terminal else io.StringIO()
    clock = [100.0]
    monkeypatch.setattr(progress.sys, "stderr", out)
    monkeypatch.setattr(progress.time, "monotonic", lambda: clock[0])
    watch = Progress()
    clock[0] += waited
    watch("rough stand", 12_000_000)
    assert ("reading rough stand: 12,000,000 samples" in out.getvalue()) == said
    watch.close()
    assert not said or out.getvalue().endswith("\r\x1b[K")


def test_it_does_not_chatter(monkeypatch: pytest.MonkeyPatch) -> None:
    out, clock = Terminal(), [0.0]
    monkeypatch.setattr(progress.sys, "stderr", out)
    monkeypatch.setattr(progress.time, "monotonic", lambda: clock[0])
    watch = Progress()
    for _ in range(1000):
        clock[0] += 0.01
        watch("a", 1)
    # Ten seconds, the first two in silence, then a line every half second.
    assert 14 <= out.getvalue().count("reading a") <= 18
