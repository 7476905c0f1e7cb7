"""Where the damage comes from: the life curve with the duty's cycles, by event, by range."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from springlife.report.style import ACCENT, GREY, INK, PALE, SIZE, axes_in_style, drawable, figure_in_style, tip
from springlife.units import convert, significant

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    from springlife.life.assess import Assessment, Judgement

MOST_EVENTS = 16  # bars drawn; the rest together
CLASSES = 16  # classes of range


def judged(result: Assessment) -> Judgement:
    """Return the judgement.

    Raises
    ------
    ValueError
        When nothing was judged.
    """
    if result.judgement is None:
        raise ValueError("the case was not judged, so there is nothing to draw")
    return result.judgement


def life_curve(result: Assessment) -> Figure:
    """Draw the life curve, the duty's cycles to the target, and the damage by decade of cycles to failure.

    Above: fully reversed amplitude over cycles; the step is the number of cycles to the target at or above an
    amplitude. Below: the share of the damage done by cycles whose life lies in each decade.
    """
    j, unit = judged(result), result.say.units["stress"]
    scale = convert(1.0, unit, "stress")
    tau_a, tau_m = j.model.stress.cycles(j.cycles.low, j.cycles.high)
    amplitude = j.model.criterion.equivalent(tau_a, tau_m, j.model.Ssu, j.model.Ssy)
    seen = np.isfinite(amplitude) & (amplitude > 0)
    with figure_in_style((SIZE[0], 4.5)) as figure:
        top, bottom = figure.subplots(2, 1, height_ratios=(3, 1), sharex=True)
        order = np.argsort(-amplitude[seen], kind="stable")
        steps = amplitude[seen][order]
        sums = np.cumsum(j.cycles.count[seen][order]) * result.case.duty.target_passes
        least, highest = 0.25 * j.model.curve.strength_at_knee, 1.1 * max(
            j.model.curve.points[0][1], float(steps.max(initial=0.0))
        )  # fmt: skip
        S = np.geomspace(least, highest, 300)
        N = j.model.curve.cycles(S, j.model.miner)
        far = 10 * max(j.model.curve.knee, float(sums.max(initial=0.0)))
        shown = (far * 1e3 >= N) & np.isfinite(N)
        top.plot(N[shown], scale * S[shown], color=INK, linewidth=1.6, label="life curve")
        for life, strength in j.model.curve.points:
            (dot,) = top.plot(life, scale * strength, "o", color=INK, markersize=4.5)
            tip(dot, f"{result.say(strength, 'stress')} at {significant(life)} cycles")
        above = steps >= least
        top.step(sums[above], scale * steps[above], where="pre", color=ACCENT, linewidth=1.4, linestyle=(0, (5, 1.5)),
                 label="cycles to the target, at or above")  # fmt: skip
        top.set_xscale("log")
        top.set_ylim(0, scale * highest)
        top.set_xlim(min(100.0, max(1.0, float(sums.min(initial=100.0)) / 2)), far)
        top.set_ylabel(f"fully reversed amplitude, {unit}")
        top.legend(frameon=False, loc="upper right")
        _by_decade(bottom, j, far)
    return figure


def _by_decade(axes: Any, j: Judgement, far: float) -> None:
    """Bars of damage by decade of cycles to failure; what lies past the axis stands in its last decade."""
    lives = j.model.cycles_to_failure(j.cycles.low, j.cycles.high)
    total = j.cycle_damage.sum()
    if 0 < total < np.inf:
        decade = np.floor(np.log10(np.clip(lives, 1.0, 0.99 * far)))
        for start in np.unique(decade[j.cycle_damage > 0]):
            share = 100 * float(j.cycle_damage[decade == start].sum() / total)
            (bar,) = axes.bar(10**start, share, width=9 * 10**start, align="edge", color=PALE, edgecolor=GREY)
            tip(bar, f"lives from 1e{start:.0f} to 1e{start + 1:.0f}: {significant(share, 3)} % of the damage")
    axes.set_ylim(0, 100)
    axes.set_ylabel("damage, %")
    axes.set_xlabel("cycles; bars: cycles to failure of the cycles that do the damage")


def by_event(result: Assessment) -> Figure:
    """Draw each event's share of the damage and of the cycles; of many events the rest together."""
    j = judged(result)
    ranked = sorted(j.events, key=lambda event: -event.share)
    shown, rest = ranked[:MOST_EVENTS], ranked[MOST_EVENTS:]
    cycles = sum(event.cycles for event in ranked) or 1.0
    rows = [(drawable(event.name, 30), 100 * event.share, 100 * event.cycles / cycles) for event in shown]
    if rest:
        others = 100 * sum(event.cycles for event in rest) / cycles
        rows.append((f"{len(rest)} others", 100 * sum(event.share for event in rest), others))
    with axes_in_style((SIZE[0], 1.2 + 0.34 * len(rows))) as (figure, axes):
        for place, (name, share, part) in enumerate(rows):
            (bar,) = axes.barh(place - 0.17, share, height=0.34, color=ACCENT, label="damage" if place == 0 else None)
            tip(bar, f"{name}: {significant(share, 3)} % of the damage")
            (bar,) = axes.barh(place + 0.17, part, height=0.3, color=PALE, edgecolor=GREY, linewidth=0.7,
                               label="cycles" if place == 0 else None)  # fmt: skip
            tip(bar, f"{name}: {significant(part, 3)} % of the cycles")
            axes.annotate(f"{share:.1f} %", (share, place - 0.17), xytext=(4, 0), textcoords="offset points",
                          va="center", fontsize=8)  # fmt: skip
        axes.set_yticks(range(len(rows)), [row[0] for row in rows])
        axes.tick_params(axis="y", length=0)
        axes.invert_yaxis()
        axes.set_xlim(0, 109)
        axes.set_xticks(range(0, 101, 20))
        axes.set_xlabel("share of one pass, %")
        axes.legend(loc="lower left", bbox_to_anchor=(0, 1), ncols=2, frameon=False)
    return figure


def range_classes(j: Judgement) -> list[tuple[float, float, float, float]]:
    """Return classes of range as rows (from m, to m, cycles a pass, damage a pass), empty ones left out."""
    ranges = j.cycles.high - j.cycles.low
    if not ranges.size:
        return []
    edges = np.linspace(0.0, float(ranges.max()), CLASSES + 1)
    place = np.clip(np.searchsorted(edges, ranges, side="left") - 1, 0, CLASSES - 1)
    count = np.bincount(place, j.cycles.count, CLASSES).astype(np.float64)
    damage = np.bincount(place, j.cycle_damage, CLASSES).astype(np.float64)
    return [
        (float(edges[i]), float(edges[i + 1]), float(count[i]), float(damage[i])) for i in range(CLASSES) if count[i]
    ]


def by_range(result: Assessment) -> Figure:
    """Draw cycles a pass (above, logarithmic) and share of the damage (below) by range of deflection."""
    j, unit = judged(result), result.say.units["length"]
    scale = convert(1.0, unit, "length")
    rows = range_classes(j)
    total = sum(row[3] for row in rows)
    with figure_in_style((SIZE[0], 3.6)) as figure:
        top, bottom = figure.subplots(2, 1, sharex=True)
        for low, high, count, damage in rows:
            place = {"x": scale * low, "width": scale * (high - low), "align": "edge", "edgecolor": GREY}
            share = 100 * damage / total if 0 < total < np.inf else 0.0
            words = f"range {result.say(low, 'length', 3)} to {result.say(high, 'length', 3)}"
            (bar,) = top.bar(height=count, color=PALE, **place)
            tip(bar, f"{words}: {significant(count)} cycles a pass")
            (bar,) = bottom.bar(height=share, color=ACCENT, **place)
            tip(bar, f"{words}: {significant(share, 3)} % of the damage")
        top.set_yscale("log")
        if rows:
            counts = [row[2] for row in rows]
            top.set_ylim(min(0.5, 0.5 * min(counts)), 3 * max(counts))
        top.set_ylabel("cycles a pass")
        bottom.set_ylabel("damage, %")
        bottom.set_xlabel(f"range of deflection, {unit}")
        bottom.set_xlim(left=0)
    return figure
