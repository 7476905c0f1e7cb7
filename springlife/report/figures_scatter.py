"""Figures of a scatter study, in the style of the other figures."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from springlife.report.style import ACCENT, GREY, INK, PALE, SIZE, axes_in_style
from springlife.units import significant

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    from springlife.life.scatter import ScatterResult


def tornado(result: ScatterResult) -> Figure:
    """Draw what matters most for life: total Sobol indices as bars with their intervals, first-order as dots.

    Raises
    ------
    ValueError
        When the study has no indices.
    """
    if result.no_sensitivities:
        raise ValueError(f"there are no indices to draw: {result.no_sensitivities}")
    ranked = result.sensitivities
    rows = np.arange(len(ranked))
    totals = np.array([one.total.value for one in ranked]) * 100
    alone = np.array([one.first.value for one in ranked]) * 100
    reach = np.array([one.total.high - one.total.value for one in ranked]) * 100
    with axes_in_style((SIZE[0], 1.2 + 0.32 * len(ranked))) as (figure, axes):
        axes.barh(rows, totals, height=0.62, color=PALE, edgecolor=GREY, linewidth=0.8, label="with interactions")
        axes.errorbar(totals, rows, xerr=reach, fmt="none", ecolor=INK, elinewidth=1.0, capsize=2.5)
        axes.plot(np.maximum(alone, 0), rows, "o", color=ACCENT, markersize=4.5, label="alone", clip_on=False, zorder=4)
        edge = float((totals + reach).max())
        for row, total in zip(rows, totals, strict=True):
            text = f"{significant(total, 2)} %" if total >= 0.1 else "under 0.1 %"
            axes.annotate(
                text,
                (max(total + reach[row], alone[row], 0), row),
                xytext=(7, 0),
                textcoords="offset points",
                va="center",
            )
        axes.set_yticks(rows, [one.variable.replace("_", " ") for one in ranked])
        axes.tick_params(axis="y", length=0)
        axes.invert_yaxis()
        axes.set_xlim(0, 1.18 * edge)
        axes.set_xlabel("share of the variance of log life, %")
        axes.legend(loc="lower left", bbox_to_anchor=(0, 1), ncols=2, frameon=False)
    return figure
