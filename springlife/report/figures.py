"""Figures of a judged case, all from one style; each returns a matplotlib figure and touches no global state.

Readable in grey and by colour-blind people: meaning is carried by line pattern, marker and label, colour only
repeats it. Units stand on every axis.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

import numpy as np

from springlife.errors import CriterionError
from springlife.life.assess import model_of
from springlife.life.damage import Floats
from springlife.report.style import ACCENT, GREY, INK, PALE, PATTERNS, SIZE, axes_in_style, tip
from springlife.strength import endurance
from springlife.strength.criteria import CRITERIA
from springlife.units import convert, significant

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

    from springlife.life.assess import Assessment, Judgement

TIPPED = 40  # cycle classes that tell their values on hover: those that matter most
MANY = 1500  # more dots than this become pixels, so that a page stays small


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

    with axes_in_style((SIZE[0], 4.0)) as (figure, axes):
        tau_a, tau_m = j.model.stress.cycles(j.cycles.low, j.cycles.high)
        total = j.cycle_damage.sum()
        share = j.cycle_damage / total if 0 < total < np.inf else np.zeros_like(j.cycle_damage)
        # All cycles as fine dots; those that matter again with their share as area.
        axes.scatter(to(tau_m), to(tau_a), s=4, color=PALE, linewidths=0, zorder=2, rasterized=tau_m.size > MANY)
        weighty = np.argsort(-share, kind="stable")[: int((share > 1e-4).sum())]
        rest = weighty[TIPPED:]
        axes.scatter(to(tau_m[rest]), to(tau_a[rest]), s=8 + 900 * share[rest], color=ACCENT, alpha=0.55, linewidths=0,
                     zorder=3, rasterized=rest.size > MANY)  # fmt: skip
        for i in weighty[:TIPPED]:
            dot = axes.scatter(to(tau_m[i]), to(tau_a[i]), s=8 + 900 * share[i], color=ACCENT, alpha=0.55, linewidths=0,
                               zorder=3)  # fmt: skip
            stresses = f"{result.say(float(tau_a[i]), 'stress')} about {result.say(float(tau_m[i]), 'stress')}"
            tip(dot, f"{stresses}: {significant(100 * float(share[i]), 3)} % of the damage")
        top = _criteria_lines(axes, result, j, to)
        pair = endurance.zimmerli(j.spring.shot_peened)
        if result.case.judge.endurance == "zimmerli":
            axes.plot(to(pair.Ssm), to(pair.Ssa), "+", color=INK, markersize=11, markeredgewidth=1.8, zorder=5)
            axes.annotate(
                "Zimmerli, " + ("peened" if j.spring.shot_peened else "unpeened"),
                (float(to(pair.Ssm)), float(to(pair.Ssa))),
                xytext=(9, 7),
                textcoords="offset points",
                bbox={"facecolor": "white", "alpha": 0.8, "linewidth": 0, "pad": 1.0},
                zorder=6,
            )
        limit = float(to(j.spring.static_limit))
        axes.plot([0, limit], [limit, 0], color=GREY, linewidth=1.0, linestyle=(0, (3, 3)), zorder=1)
        axes.set_xlim(0, 1.08 * max(limit, float(to(j.spring.Ssu))))
        axes.set_ylim(0, 1.25 * max(top, float(to(tau_a.max(initial=0.0)))))
        height = axes.get_ylim()[1]
        if limit > 0.05 * height:
            place = (limit - 0.05 * height, 0.05 * height)
            axes.annotate("yield", place, xytext=(-5, 0), textcoords="offset points", color=GREY, ha="right",
                          bbox={"facecolor": "white", "alpha": 0.8, "linewidth": 0, "pad": 1.0})  # fmt: skip
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
