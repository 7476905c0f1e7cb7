"""The spring drawn from the side to scale: free, installed, at its greatest deflection and solid.

The wire follows its true helix: end coils of squared ends lie wire on wire, the others share the rest of the
length; ground ends are cut flat.
"""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any

import numpy as np

from springlife.report.figures_damage import judged
from springlife.report.style import ACCENT, GREY, INK, PALE, figure_in_style
from springlife.spring.helical import ENDS
from springlife.units import convert

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

    from springlife.life.assess import Assessment
    from springlife.life.damage import Floats
    from springlife.spring.helical import HelicalSpring

POINTS = 10  # a half turn
WIDTH = 7.2  # inches
TALLEST, LOWEST = 4.4, 1.9  # inches of the springs themselves


def states(result: Assessment) -> list[tuple[str, float]]:
    """Return the four lengths shown as words and deflection (m).

    Installed is the deflection that the case gives for travel, or else the least of the duty.
    """
    j = judged(result)
    assert result.duty is not None  # what was judged has a duty
    low, high = result.duty.extremes(j.spring)
    given = sorted({event.installed for event in result.duty.events if event.measures == "travel"})
    installed = [("installed", given[0])] if len(given) == 1 else [("least deflection", low)]
    return [("free", 0.0), *installed, ("greatest deflection", high), ("solid", j.spring.solid_deflection)]


def spring_drawing(result: Assessment) -> Figure:
    """Draw the spring to scale at its four lengths, with dimensions and forces."""
    j, say = judged(result), result.say
    spring, unit = j.spring, say.units["length"]
    scale = convert(1.0, unit, "length")
    D, L0 = scale * spring.outer_diameter, scale * spring.free_length
    shown = states(result)
    gap = max(0.75 * D, 0.28 * L0)
    across = len(shown) * (D + gap)
    tall = 1.38 * L0
    height = min(max(WIDTH * tall / across, LOWEST), TALLEST) + 0.3
    with figure_in_style((WIDTH, height)) as figure:
        axes = figure.add_subplot()
        axes.set_aspect("equal")
        axes.axis("off")
        for number, (words, y) in enumerate(shown):
            left = number * (D + gap)
            length = scale * (spring.free_length - min(max(y, 0.0), spring.solid_deflection))
            _spring(axes, spring, left + D / 2, length, scale)
            _upright(axes, left + D + 0.14 * gap, length, say(spring.free_length - y, "length"), L0)
            force = say(float(spring.force(y)), "force")
            axes.annotate(f"{words}\n{say(y, 'length')} deflection\n{force}", (left + D / 2, 0), xytext=(0, -7),
                          textcoords="offset points", ha="center", va="top", fontsize=8, linespacing=1.35)  # fmt: skip
        _across(axes, (0, D), L0 + 0.09 * L0, L0, f"Ø {say(spring.outer_diameter, 'length')} outside")
        axes.annotate(f"wire Ø {say(spring.wire_diameter, 'length')}, {spring.total_coils:g} coils, {spring.ends}",
                      (D + gap, 1.13 * L0), fontsize=8, va="bottom")  # fmt: skip
        axes.set_xlim(-0.05 * across, across)
        axes.set_ylim(-0.2 * L0, 1.21 * L0)
        axes.plot([-0.03 * across, across - gap + 0.1 * gap], [0, 0], color=GREY, linewidth=0.6, zorder=0)
    return figure


def _spring(axes: Axes, spring: HelicalSpring, centre: float, length: float, scale: float) -> None:
    """Draw the wire between z = 0 and the length: back halves pale, front halves white, both outlined."""
    from matplotlib.patches import Polygon, Rectangle

    d, R = scale * spring.wire_diameter, scale * spring.mean_diameter / 2
    window = Rectangle((centre - R - d, 0), 2 * R + 2 * d, length, transform=axes.transData)
    ground = "ground" in spring.ends
    turns = np.linspace(0, spring.total_coils, max(2, round(2 * spring.total_coils)) * POINTS + 1)
    z = heights(spring, turns, length, d)
    x = centre + R * np.cos(2 * math.pi * turns)
    front = np.sin(2 * math.pi * turns) >= 0
    for halves, face, order in ((~front, PALE, 1), (front, "white", 3)):
        for part in _runs(halves):
            outline = Polygon(_strip(x[part], z[part], d), closed=True, facecolor=face, edgecolor=INK, linewidth=0.6,
                              zorder=order)  # fmt: skip
            axes.add_patch(outline)
            if ground:
                outline.set_clip_path(window)
    if ground:
        for face_at in (0.0, length):
            axes.plot([centre - R - d / 2, centre + R + d / 2], [face_at, face_at], color=INK, linewidth=0.9, zorder=4)


def heights(spring: HelicalSpring, turns: Floats, length: float, wire: float) -> Floats:
    """Return the height of the wire's centre at numbers of turns, in the unit of ``length``.

    Notes
    -----
    Closed end coils rise by one wire a turn and the active coils share the rest, so that at the solid length
    every coil lies on the next.
    """
    closed = ENDS[spring.ends]["inactive"] / 2 if "squared" in spring.ends else 0.0
    start = 0.0 if "ground" in spring.ends else wire / 2
    rise = length - 2 * start
    knots = [0.0, closed, spring.total_coils - closed, spring.total_coils]
    return np.interp(turns, knots, start + np.array([0.0, closed * wire, rise - closed * wire, rise]))


def _runs(chosen: np.ndarray) -> list[slice]:
    """Return the stretches where ``chosen`` is true, each with the point after it, so that halves meet."""
    edges = np.flatnonzero(np.diff(np.concatenate([[False], chosen, [False]]).astype(int)))
    return [
        slice(int(a), min(int(b) + 1, chosen.size)) for a, b in zip(edges[::2], edges[1::2], strict=True) if b > a + 1
    ]


def _strip(x: Floats, z: Floats, width: float) -> Floats:
    """Return the outline of a wire along its projected centre line, round at both ends."""
    dx = np.gradient(x)
    # Where the wire turns round the side it is seen end on: its outline there is the round cap, not a steep band.
    steady = np.sign(dx.sum()) * np.maximum(np.abs(dx), 0.35 * np.abs(dx).max())
    heading = np.arctan2(np.gradient(z), steady)
    normal = np.array([-np.sin(heading), np.cos(heading)]) * width / 2
    line = np.array([x, z])
    turn = np.linspace(0, math.pi, 6)[1:-1]

    def cap(at: int, angle: float) -> Floats:
        return line[:, [at]] + width / 2 * np.array([np.cos(angle - turn), np.sin(angle - turn)])

    end = cap(-1, float(heading[-1]) + math.pi / 2)
    begin = cap(0, float(heading[0]) - math.pi / 2)
    return np.concatenate([line + normal, end, (line - normal)[:, ::-1], begin], axis=1).T


def _upright(axes: Axes, x: float, length: float, words: str, L0: float) -> None:
    """Draw a dimension of a length beside the spring."""
    _arrow(axes, (x, 0), (x, length))
    axes.annotate(words, (x, length / 2), xytext=(3, 0), textcoords="offset points", rotation=90, ha="left",
                  va="center", fontsize=8)  # fmt: skip


def _across(axes: Axes, ends: tuple[float, float], y: float, top: float, words: str) -> None:
    """Draw a dimension of the diameter above the first spring."""
    for x in ends:
        axes.plot([x, x], [top, y], color=GREY, linewidth=0.6)
    _arrow(axes, (ends[0], y), (ends[1], y))
    axes.annotate(words, (ends[0], y), xytext=(0, 3), textcoords="offset points", ha="left", va="bottom", fontsize=8)


def _arrow(axes: Any, start: tuple[float, float], end: tuple[float, float]) -> None:
    style = {
        "arrowstyle": "<|-|>,head_length=0.35,head_width=0.14",
        "color": ACCENT,
        "lw": 0.8,
        "shrinkA": 0,
        "shrinkB": 0,
    }
    axes.annotate("", end, start, arrowprops=style)
