"""The wave in the coils: how much more each coil moves than the record says."""

from __future__ import annotations

from typing import TYPE_CHECKING

from springlife.report.style import ACCENT, GREY, INK, SIZE, axes_in_style, drawable

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    from springlife.life.surge import SurgeResult

MOST = 6  # events drawn: those whose coils move most
PATTERNS = ("-", (0, (6, 2)), (0, (6, 2, 1, 2)), (0, (1, 1.6)), (0, (3, 1.5)), (0, (8, 3, 2, 3)))


def along_the_wire(study: SurgeResult) -> Figure:
    """Draw each place's range of deflection with the wave over that of the record, for every event that moves."""
    moving = [event for event in study.events if event.slow is None and event.static_high > event.static_low]
    moving = sorted(moving, key=lambda event: -event.amplification)[:MOST]
    coils = study.positions * study.static.spring.active_coils
    with axes_in_style((SIZE[0], 3.2)) as (figure, axes):
        for number, event in enumerate(moving):
            ratio = (event.high - event.low) / (event.static_high - event.static_low)
            axes.plot(coils, ratio, color=INK if number else ACCENT, linestyle=PATTERNS[number],
                      label=drawable(event.name))  # fmt: skip
        axes.axhline(1.0, color=GREY, linewidth=0.8, linestyle=(0, (3, 3)))
        axes.set_ylim(bottom=0)
        axes.set_xlabel("active coils from the fixed end")
        axes.set_ylabel("range with the wave, times static")
        if moving:
            axes.legend(frameon=False)
    return figure
