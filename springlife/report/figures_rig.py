"""The figure of a rig test, in the style of the other figures."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from springlife.errors import CriterionError
from springlife.life.assess import model_of
from springlife.report.style import ACCENT, GREY, INK, PATTERNS, axes_in_style
from springlife.strength.criteria import CRITERIA
from springlife.units import convert

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    from springlife.life.rig import RigTest


def rig_cycles(test: RigTest) -> Figure:
    """Draw the cycles of equal damage over the greatest deflection of the test, by each criterion."""
    result, j = test.assessment, test.judgement
    assert result.duty is not None
    case, say = result.case, result.say
    scale = convert(1.0, say.units["length"], "length")
    table = result.duty.one_pass(j.spring).life(case.duty.target_passes, case.judge.residue)
    far = max(test.high, min(j.spring.solid_deflection, 1.3 * test.high))
    highs = np.linspace(test.low + 0.5 * (test.high - test.low), far, 120)
    with axes_in_style() as (figure, axes):
        for name in CRITERIA:
            try:
                model = model_of(case, j.spring, j.model.stress, by=name)
            except CriterionError:
                continue
            cycles = float(model.damage(*table).sum()) * model.cycles_to_failure(np.full_like(highs, test.low), highs)
            shown = np.isfinite(cycles) & (cycles > 0)
            chosen = name == case.judge.criterion
            axes.plot(scale * highs[shown], cycles[shown], linestyle=PATTERNS[name], color=INK if chosen else GREY,
                      linewidth=1.8 if chosen else 1.0, label=name + (" (chosen)" if chosen else ""))  # fmt: skip
        axes.plot(
            scale * test.high, test.exact_cycles, "o", color=ACCENT, markersize=7, zorder=5, label="proposed test"
        )
        axes.set_yscale("log")
        axes.set_xlabel(f"greatest deflection of the test, {say.units['length']} (least: {say(test.low, 'length')})")
        axes.set_ylabel("cycles with the duty's damage")
        axes.legend(frameon=False)
    return figure
