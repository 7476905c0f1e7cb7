"""The figure of own fatigue tests, in the style of the other figures."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from springlife.report.style import ACCENT, INK, axes_in_style
from springlife.strength.criteria import criterion
from springlife.units import convert

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    from springlife.life.fitting import OwnFit

# A group is told by marker and line pattern before colour.
MARKERS = ("o", "s", "^", "D", "v")
COLOURS = (INK, ACCENT)


def own_tests(result: OwnFit, unit: str = "MPa") -> Figure:
    """Draw tests, median lines and design curves: fully reversed amplitude over cycles; run-outs as arrows."""
    scale = convert(1.0, unit, "stress")
    tests, fit = result.tests, result.fit
    amplitudes = criterion(fit.criterion).equivalent(tests.amplitude, tests.mean, result.Ssu, result.Ssy) * scale
    groups = np.array(tests.group or [fit.lines[0].group] * len(tests.cycles))
    with axes_in_style() as (figure, axes):
        for number, line in enumerate(fit.lines):
            colour, marker = COLOURS[number % 2], MARKERS[number % len(MARKERS)]
            mine = groups == line.group
            failed, stopped = mine & tests.failed, mine & ~tests.failed
            axes.plot(tests.cycles[failed], amplitudes[failed], marker, color=colour, markersize=5, alpha=0.75,
                      markeredgewidth=0, label=f"{line.group}, failed")  # fmt: skip
            axes.plot(tests.cycles[stopped], amplitudes[stopped], marker, markerfacecolor="none", color=colour,
                      markersize=5)  # fmt: skip
            for N, S in zip(tests.cycles[stopped], amplitudes[stopped], strict=True):
                axes.annotate("", (1.6 * N, S), (N, S), arrowprops={"arrowstyle": "->", "color": colour, "lw": 1.0})
            S = np.geomspace(*line.amplitudes, 30)
            axes.plot(line.life(S), S * scale, "-", color=colour, linewidth=1.6, label=f"{line.group}, median")
            N_design, S_design = np.array(result.design_points(line.group)).T
            design = f"{line.group}, {100 * result.reliability:g} % at {100 * result.confidence:g} % confidence"
            axes.plot(N_design, S_design * scale, "--", color=colour, linewidth=1.2, label=design)
        axes.set_xscale("log")
        axes.set_yscale("log")
        low, high = amplitudes.min(), amplitudes.max()
        axes.set_ylim(low / 1.15, high * 1.25)
        ticks = [
            tick
            for tick in (100, 150, 200, 250, 300, 400, 500, 600, 800, 1000, 20, 30, 40, 50, 60, 80)
            if low / 1.1 < tick < high * 1.2
        ]
        axes.set_yticks(ticks, [str(tick) for tick in ticks])
        axes.minorticks_off()
        axes.set_xlabel("cycles to failure; arrows: not failed when stopped")
        axes.set_ylabel(f"fully reversed shear stress amplitude, {unit}")
        axes.legend(frameon=False, fontsize=8, ncols=len(fit.lines))
    return figure
