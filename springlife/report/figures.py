"""Figures of a judged case, all from one style; each returns a matplotlib figure and touches no global state.

Readable in grey and by colour-blind people: meaning is carried by line pattern, marker and label, colour only
repeats it. Units stand on every axis.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from typing import TYPE_CHECKING, Any

import numpy as np

from springlife.errors import CriterionError
from springlife.life.assess import model_of
from springlife.life.damage import Floats
from springlife.strength import endurance
from springlife.strength.criteria import CRITERIA
from springlife.units import convert, significant

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

    from springlife.life.assess import Assessment, Judgement

# Ink, one accent, greys: dark enough to print, apart in lightness as well as in hue.
INK, ACCENT, GREY, PALE = "#1d2733", "#a8401c", "#66707a", "#c9ced3"
PATTERNS = {"goodman": (0, (6, 2)), "gerber": "-", "asme-elliptic": (0, (6, 2, 1, 2)), "sines": (0, (1, 1.6))}
SIZE = (7.2, 4.6)  # inches: the width of a text column on A4 and letter

STYLE = {
    "font.family": "DejaVu Sans",
    "font.size": 9.0,
    "axes.edgecolor": GREY,
    "axes.labelcolor": INK,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "text.color": INK,
    "xtick.color": INK,
    "ytick.color": INK,
    "figure.dpi": 130,
    "svg.hashsalt": "springlife",
    "svg.fonttype": "path",
}


@contextmanager
def axes_in_style(size: tuple[float, float] = SIZE) -> Iterator[tuple[Figure, Axes]]:
    """Make a figure in the house style without pyplot."""
    import matplotlib
    from matplotlib.backends.backend_agg import FigureCanvasAgg
    from matplotlib.figure import Figure

    with matplotlib.rc_context(STYLE):  # type: ignore[arg-type]  # its keys are plain strings here
        figure = Figure(figsize=size, layout="constrained")
        FigureCanvasAgg(figure)
        yield figure, figure.add_subplot()


def haigh(result: Assessment) -> Figure:
    """Draw the duty's cycles among the criteria: alternating over mean shear stress.

    Each dot is a class of cycles, its area the share of the damage; the lines are the criteria at the knee of
    the life curve, the broken edge is yield, the cross the endurance data's own point.

    Raises
    ------
    ValueError
        When nothing was judged.
    """
    if result.judgement is None:
        raise ValueError("the case was not judged, so there is nothing to draw")
    j, unit = result.judgement, result.say.units["stress"]

    scale = convert(1.0, unit, "stress")

    def to(values: Any) -> Floats:
        return np.asarray(values, dtype=np.float64) * scale

    with axes_in_style() as (figure, axes):
        tau_a, tau_m = j.model.stress.cycles(j.cycles.low, j.cycles.high)
        total = j.cycle_damage.sum()
        share = j.cycle_damage / total if 0 < total < np.inf else np.zeros_like(j.cycle_damage)
        # All cycles as fine dots; those that matter again with their share as area.
        axes.scatter(to(tau_m), to(tau_a), s=4, color=PALE, linewidths=0, zorder=2)
        seen = share > 1e-4
        area = 8 + 900 * share[seen]
        axes.scatter(to(tau_m[seen]), to(tau_a[seen]), s=area, color=ACCENT, alpha=0.55, linewidths=0, zorder=3)
        top = _criteria_lines(axes, result, j, to)
        pair = endurance.zimmerli(j.spring.shot_peened)
        if result.case.judge.endurance == "zimmerli":
            axes.plot(to(pair.Ssm), to(pair.Ssa), "+", color=INK, markersize=11, markeredgewidth=1.8, zorder=5)
            axes.annotate(
                "Zimmerli, " + ("peened" if j.spring.shot_peened else "unpeened"),
                (float(to(pair.Ssm)), float(to(pair.Ssa))),
                xytext=(9, 7),
                textcoords="offset points",
            )
        limit = float(to(j.spring.static_limit))
        axes.plot([0, limit], [limit, 0], color=GREY, linewidth=1.0, linestyle=(0, (3, 3)), zorder=1)
        axes.set_xlim(0, 1.08 * max(limit, float(to(j.spring.Ssu))))
        axes.set_ylim(0, 1.25 * max(top, float(to(tau_a.max(initial=0.0)))))
        height = axes.get_ylim()[1]
        if limit > 0.62 * height:
            place = (limit - 0.62 * height, 0.62 * height)
            axes.annotate("yield", place, xytext=(5, 3), textcoords="offset points", color=GREY)
        axes.set_xlabel(f"mean shear stress, {unit}")
        axes.set_ylabel(f"alternating shear stress, {unit}")
        axes.legend(loc="upper right", frameon=False)
    return figure


def _criteria_lines(axes: Axes, result: Assessment, j: Judgement, to: Callable[[Any], Floats]) -> float:
    """Draw each criterion's line at the knee; the chosen one heavier. Return the largest Sse drawn."""
    top = 0.0
    means = np.linspace(0.0, j.spring.Ssu, 200)
    for name, rule in CRITERIA.items():
        try:
            Sse = model_of(result.case, j.spring, j.model.stress, by=name).curve.strength_at_knee
        except CriterionError:
            continue
        chosen = name == result.case.judge.criterion
        axes.plot(
            to(means),
            to(rule.allowable(means, Sse, j.spring.Ssu, j.spring.Ssy)),
            color=INK if chosen else GREY,
            linewidth=1.8 if chosen else 1.0,
            linestyle=PATTERNS[name],
            label=f"{name}, Sse {significant(float(to(Sse)), 3)}" + (" (chosen)" if chosen else ""),
            zorder=4 if chosen else 2,
        )
        top = max(top, float(to(Sse))) if chosen else top
    return top
