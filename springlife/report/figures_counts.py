"""What was counted, before any stress: cycles by their ends, ranges exceeded, levels crossed."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from springlife.report.figures_damage import judged
from springlife.report.style import ACCENT, GREY, INK, axes_in_style
from springlife.units import convert

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    from springlife.life.assess import Assessment

CELLS = 48  # cells along each side of the matrix
LEVELS = 200


def from_to(result: Assessment) -> Figure:
    """Draw cycles a pass by their lower and upper end: a matrix, darker where there are more."""
    from matplotlib.colors import LinearSegmentedColormap, LogNorm

    j, unit = judged(result), result.say.units["length"]
    scale = convert(1.0, unit, "length")
    low, high = scale * j.cycles.low, scale * j.cycles.high
    with axes_in_style((7.2, 4.0)) as (figure, axes):
        if low.size:
            edge = 0.03 * (high.max() - low.min())
            edges = np.linspace(low.min() - edge, high.max() + edge, CELLS + 1)
            cells, _, _ = np.histogram2d(low, high, (edges, edges), weights=j.cycles.count)
            filled = cells[cells > 0]
            shade = LinearSegmentedColormap.from_list("ink", ["#d9dde1", "#8a939c", INK])
            norm = LogNorm(filled.min(), max(filled.max(), 1.01 * filled.min()))
            extent = (edges[0], edges[-1], edges[0], edges[-1])
            image = axes.imshow(np.where(cells > 0, cells, np.nan).T, origin="lower", extent=extent, cmap=shade,
                                norm=norm, interpolation="nearest")  # fmt: skip
            axes.plot(extent[:2], extent[:2], color=GREY, linewidth=0.8)
            figure.colorbar(image, ax=axes, label="cycles a pass", shrink=0.9)
        axes.set_xlabel(f"deflection at the lower end, {unit}")
        axes.set_ylabel(f"deflection at the upper end, {unit}")
    return figure


def exceedance(result: Assessment) -> Figure:
    """Draw how many cycles a pass have at least a range."""
    j, unit = judged(result), result.say.units["length"]
    ranges = convert(1.0, unit, "length") * (j.cycles.high - j.cycles.low)
    order = np.argsort(-ranges, kind="stable")
    sums = np.cumsum(j.cycles.count[order])
    with axes_in_style((7.2, 2.6)) as (figure, axes):
        if sums.size:
            # From the first cycle on, the largest range holds until its own number is reached.
            x = np.concatenate([[min(0.5, sums[0])], sums])
            axes.step(x, np.concatenate([ranges[order][:1], ranges[order]]), where="pre", color=INK, linewidth=1.4)
            axes.set_xscale("log")
        axes.set_ylim(bottom=0)
        axes.set_xlabel("cycles a pass with at least this range")
        axes.set_ylabel(f"range of deflection, {unit}")
    return figure


def crossings(result: Assessment) -> Figure:
    """Draw how often a pass rises through each level of deflection.

    Notes
    -----
    A cycle rises once through every level between its ends, so the number at a level is that of the cycles
    with low < level <= high.
    """
    j, unit = judged(result), result.say.units["length"]
    scale = convert(1.0, unit, "length")
    with axes_in_style((7.2, 2.6)) as (figure, axes):
        if j.cycles.low.size:
            levels = np.linspace(j.cycles.low.min(), j.cycles.high.max(), LEVELS)
            axes.plot(risings(j.cycles.low, j.cycles.high, j.cycles.count, levels), scale * levels, color=ACCENT)
            axes.set_xscale("log")
        axes.set_xlabel("rises through the level a pass")
        axes.set_ylabel(f"deflection, {unit}")
    return figure


def risings(low: np.ndarray, high: np.ndarray, count: np.ndarray, levels: np.ndarray) -> np.ndarray:
    """Return how many cycles hold each level: low < level <= high; shapes (n,), (n,), (n,), (m,)."""

    def below(ends: np.ndarray) -> np.ndarray:
        order = np.argsort(ends)
        sums = np.concatenate([[0.0], np.cumsum(count[order])])
        return np.asarray(sums[np.searchsorted(ends[order], levels, side="left")])

    return np.asarray(below(low) - below(high))
