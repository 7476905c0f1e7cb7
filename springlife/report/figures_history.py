"""A recorded event over time, with its limits and its largest cycle marked."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from springlife.report.figures_damage import judged
from springlife.report.style import ACCENT, GREY, INK, SIZE, axes_in_style, tip
from springlife.units import convert, significant

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

    from springlife.life.assess import Assessment
    from springlife.life.reading import EventReading

NEAR = 1.6  # times the record's greatest deflection: farther limits are left out of the picture


def history(result: Assessment, event: EventReading) -> Figure:
    """Draw one occurrence of a recorded event: deflection over time, its turning points, its largest cycle.

    A long record is drawn as the band between least and greatest deflection of equal stretches.

    Raises
    ------
    ValueError
        The event is a specified programme.
    """
    j, say = judged(result), result.say
    if event.envelope is None or event.summary is None:
        raise ValueError(f"{event.name!r} is a specified programme, so there is no record to draw")
    scale = convert(1.0, say.units["length"], "length")
    slope, intercept = event.line(j.spring)
    ends = [slope * edge + intercept for edge in (event.envelope.low, event.envelope.high)]
    low, high = (scale * np.fmin(*ends), scale * np.fmax(*ends))
    rate = event.summary.rate_Hz
    step = event.envelope.samples / rate if rate else float(event.envelope.samples)
    place = (np.arange(low.size) + 0.5) * step
    with axes_in_style((SIZE[0], 2.3)) as (figure, axes):
        if event.envelope.samples == 1:
            axes.plot(place, low, color=INK, linewidth=0.8)
            turns = _turns(low)
            axes.plot(place[turns], low[turns], ".", color=INK, markersize=3.5)
        else:
            axes.fill_between(place, low, high, color=GREY, linewidth=0)
        _mark_largest(axes, result, place, low, high)
        top = float(np.nanmax(high))
        for limit, words in ((0.0, "free"), (j.spring.solid_deflection, "solid")):
            if limit == 0.0 or scale * limit < NEAR * top:
                axes.axhline(scale * limit, color=GREY, linewidth=0.8, linestyle=(0, (3, 3)))
                axes.annotate(words, (1.0, scale * limit), xycoords=("axes fraction", "data"), xytext=(3, 0),
                              textcoords="offset points", va="center", color=GREY, fontsize=8)  # fmt: skip
        axes.set_xlim(0, step * low.size)
        axes.set_xlabel("time, s" if rate else "sample")
        axes.set_ylabel(f"deflection, {say.units['length']}")
    return figure


def _mark_largest(axes: Axes, result: Assessment, place: np.ndarray, low: np.ndarray, high: np.ndarray) -> None:
    """Ring the two ends of the largest cycle: the least and the greatest deflection."""
    bottom, top = int(np.nanargmin(low)), int(np.nanargmax(high))
    axes.plot(place[[bottom, top]], [low[bottom], high[top]], linestyle=(0, (2, 2)), color=ACCENT, linewidth=1.0)
    for where, value, words in ((bottom, low[bottom], "least"), (top, high[top], "greatest")):
        (ring,) = axes.plot(place[where], value, "o", markerfacecolor="none", color=ACCENT, markersize=7,
                            markeredgewidth=1.5, clip_on=False, zorder=5)  # fmt: skip
        tip(ring, f"{words} deflection {significant(float(value))} {result.say.units['length']}")


def _turns(values: np.ndarray) -> np.ndarray:
    """Return where a line of samples turns; ends count too."""
    known = np.flatnonzero(~np.isnan(values))
    steps = np.diff(values[known])
    moving = np.flatnonzero(steps)
    if not moving.size:
        return known[:1]
    signs = np.sign(steps[moving])
    turning = moving[1:][signs[1:] != signs[:-1]]
    return np.asarray(known[np.concatenate([[moving[0]], turning, [moving[-1] + 1]])])
