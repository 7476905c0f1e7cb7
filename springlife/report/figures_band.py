"""The life under every published choice, beside the chosen one and the target."""

from __future__ import annotations

from typing import TYPE_CHECKING

from springlife.report.figures_damage import judged
from springlife.report.style import ACCENT, INK, PALE, SIZE, axes_in_style, drawable, tip
from springlife.units import significant

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    from springlife.life.assess import Assessment

MARKERS = {"goodman": "s", "gerber": "o", "asme-elliptic": "^", "sines": "D"}
BEYOND = 1e4  # targets; longer lives stand at the edge


def life_band(result: Assessment) -> Figure:
    """Draw the lives of all criteria, a row for each endurance basis and Miner reading; the chosen one ringed."""
    j = judged(result)
    number, unit = result.target
    per_pass, ours = number / result.case.duty.target_passes, result.case.judge
    rows = [row for row in j.band if row.withheld is None]
    labels = list(dict.fromkeys((row.endurance, row.miner) for row in rows))
    lives = [row.life_passes * per_pass for row in rows if row.life_passes]
    far = min(BEYOND * number, 10 * max([*lives, number]))
    near = min([*(life for life in lives if life > 0), number]) / 5
    with axes_in_style((SIZE[0], 1.3 + 0.3 * len(labels))) as (figure, axes):
        for place in range(len(labels)):
            axes.axhline(place, color=PALE, linewidth=0.7, zorder=1)
        drawn: set[str] = set()
        for row in rows:
            life = far if row.life_passes is None else max(min(row.life_passes * per_pass, far), near)
            place = labels.index((row.endurance, row.miner))
            label = None if row.criterion in drawn else row.criterion
            (mark,) = axes.plot(life, place, MARKERS[row.criterion], color=INK, markersize=5, clip_on=False, zorder=3,
                                markerfacecolor="none", label=label)  # fmt: skip
            drawn.add(row.criterion)
            words = "unlimited" if row.life_passes is None else f"{significant(row.life_passes * per_pass, 3)} {unit}"
            tip(mark, f"{row.criterion}, {row.endurance}, Miner {row.miner}: {words}")
            if (row.criterion, row.endurance, row.miner) == (ours.criterion, ours.endurance, ours.miner):
                axes.plot(life, place, "o", markerfacecolor="none", color=ACCENT, markersize=12, markeredgewidth=1.6,
                          clip_on=False, zorder=4, label="chosen")  # fmt: skip
        axes.axvline(number, color=ACCENT, linewidth=1.2, linestyle=(0, (5, 2)), label="target")
        axes.set_xscale("log")
        axes.set_xlim(near, far)
        axes.set_yticks(range(len(labels)), [f"{drawable(basis, 24)}, {miner}" for basis, miner in labels])
        axes.tick_params(axis="y", length=0)
        axes.invert_yaxis()
        axes.set_xlabel(f"life, {drawable(unit)}; at the right edge: longer or unlimited")
        axes.legend(loc="lower left", bbox_to_anchor=(-0.02, 1), ncols=6, frameon=False, fontsize=8, columnspacing=1.0,
                    handletextpad=0.3)  # fmt: skip
    return figure
