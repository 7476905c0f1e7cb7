"""All options of a comparison in one Haigh diagram."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from springlife.report.style import ACCENT, GREY, INK, axes_in_style, drawable
from springlife.units import convert

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    from springlife.life.compare import Comparison, Option

MOST = 6  # options drawn; of more, the longest-lived ones
MARKERS = ("o", "s", "^", "D", "v", "P")
PATTERNS = ("-", (0, (6, 2)), (0, (6, 2, 1, 2)), (0, (1, 1.6)), (0, (3, 1.5)), (0, (8, 3, 2, 3)))


def options_haigh(result: Comparison) -> Figure:
    """Draw each option's line by the chosen criterion and its governing cycle: alternating over mean stress.

    A line and a marker of one shape belong together; options of one strength share a line.

    Raises
    ------
    ValueError
        When no option could be judged.
    """
    judged = [option for option in result.options if option.assessment.judgement is not None]
    if not judged:
        raise ValueError("no option was judged, so there is nothing to draw")
    shown = judged[:1] + sorted(judged[1:], key=lambda option: option.life, reverse=True)[: MOST - 1]
    say = shown[0].assessment.say
    scale = convert(1.0, say.units["stress"], "stress")
    drawn: set[tuple[float, float]] = set()
    with axes_in_style() as (figure, axes):
        right = top = 0.0
        for number, option in enumerate(shown):
            colour = INK if number == 0 else ACCENT if number == 1 else GREY
            tau_m, tau_a = (scale * stress for stress in _governing(option))
            j = option.assessment.judgement
            assert j is not None
            line = (j.model.curve.strength_at_knee, j.spring.Ssu)
            means = np.linspace(0.0, j.spring.Ssu, 200)
            amplitudes = j.model.criterion.allowable(means, line[0], j.spring.Ssu, j.spring.Ssy)
            if line not in drawn:
                axes.plot(scale * means, scale * amplitudes, color=colour, linestyle=PATTERNS[number], linewidth=1.4)
                drawn.add(line)
            # Sizes fall, so that options with one and the same cycle all stay visible.
            axes.plot(tau_m, tau_a, MARKERS[number], markerfacecolor="none", color=colour, markeredgewidth=1.6,
                      markersize=15 - 2 * number, linestyle=PATTERNS[number], label=_label(option))  # fmt: skip
            right, top = max(right, scale * j.spring.Ssu), max(top, scale * line[0], tau_a)
        axes.set_xlim(0, 1.05 * right)
        axes.set_ylim(0, 1.3 * top)
        axes.set_xlabel(f"mean shear stress, {say.units['stress']}")
        axes.set_ylabel(f"alternating shear stress, {say.units['stress']}")
        title = f"line: {result.case.judge.criterion} at the knee; marker: governing cycle; held: {result.hold}"
        axes.legend(loc="upper right", frameon=False, title=title, title_fontsize=8, alignment="left", labelspacing=1.3)
    return figure


def _governing(option: Option) -> tuple[float, float]:
    """Mean and amplitude (Pa) of the option's worst cycle; zero without cycles."""
    j = option.assessment.judgement
    assert j is not None
    return (j.worst.tau_m, j.worst.tau_a) if j.worst else (0.0, 0.0)


def _label(option: Option) -> str:
    return drawable(option.name)
