"""Many springs of one drawing at once, and their lives under one counted duty.

Everything that scatters is an array of shape (n, 1) against the duty's distinct cycles of shape (m,), and the
laws are those of the rooms below: the stress map, the criteria and the life curve take arrays as they are.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, cast

import numpy as np
from numpy.typing import NDArray

from springlife.errors import InputError
from springlife.life.reading import Duty, EventReading
from springlife.life.scatter_input import VARIABLES
from springlife.life.spread import Spread, drawn_diameter
from springlife.spring.helical import HelicalSpring
from springlife.spring.stress import stress_map
from springlife.strength.curve import cycles_to_failure
from springlife.strength.endurance import zimmerli

if TYPE_CHECKING:
    from springlife.life.assess import Judgement
    from springlife.life.case import Case

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]
Bools = NDArray[np.bool_]
# Sizes of the calculation, not of the spring: cycles kept one by one, cells a side for the rest, and the
# number of array elements worked on at a time.
KEPT, SIDE, AT_ONCE = 256, 40, 200_000
MEASURES = ("deflection", "length", "force")  # what an end of a cycle was recorded as; travel is deflection
_MEAN_OVER_DRAWN = {"mean_diameter": 0, "outer_diameter": -1, "inner_diameter": 1}  # in wire diameters


@dataclass(frozen=True)
class Springs:
    """The numbers of many springs that stress and deflection need: arrays of shape (n, 1), SI."""

    wire_diameter: Floats
    mean_diameter: Floats
    free_length: Floats
    rate: Floats
    solid_deflection: Floats
    tensile_ratio: Floats  # tensile strength over that of the drawing
    set_removed: bool

    @classmethod
    def of(cls, drawn: HelicalSpring, mean_diameter: Floats, values: dict[str, Floats]) -> Springs:
        """Work rate and solid deflection out, each as a ratio to the drawn spring's.

        Notes
        -----
        k ~ d^4 G/(D^3 Na), so that a measured rate stays the centre; Ls/d grows by the change of the coils.
        """
        d, Na = values["wire_diameter"], values["active_coils"]
        wire = d / drawn.wire_diameter
        coil = mean_diameter / drawn.mean_diameter
        stiffness = wire**4 * (values["shear_modulus"] / drawn.G) / coil**3 / (Na / drawn.active_coils)
        solid_wires = drawn.solid_length / drawn.wire_diameter + (Na - drawn.active_coils)
        return cls(
            wire_diameter=d,
            mean_diameter=mean_diameter,
            free_length=values["free_length"],
            rate=drawn.rate * stiffness,
            solid_deflection=values["free_length"] - d * solid_wires,
            tensile_ratio=values["tensile_strength"] / drawn.Sut,
            set_removed=drawn.set_removed,
        )


@dataclass(frozen=True)
class Cycles:
    """Distinct cycles in deflections of the drawn spring (m), their number, and what was recorded at each end.

    ``low_measure`` and ``high_measure`` are positions in :data:`MEASURES`; all of shape (m,).
    """

    low: Floats
    high: Floats
    count: Floats
    low_measure: Ints
    high_measure: Ints

    def merged(self, groups: Ints) -> Cycles:
        """Put the cycles of each group into one with their number and their mean low and high."""
        _, first, group = np.unique(groups, return_index=True, return_inverse=True)
        number: Floats = np.bincount(group, self.count).astype(np.float64)
        low = np.bincount(group, self.count * self.low) / number
        high = np.bincount(group, self.count * self.high) / number
        return Cycles(low, high, number, self.low_measure[first], self.high_measure[first])

    def chosen(self, which: Any) -> Cycles:
        """Return some of the cycles."""
        parts = (self.low, self.high, self.count, self.low_measure, self.high_measure)
        return Cycles(*(part[which] for part in parts))

    def with_more(self, other: Cycles) -> Cycles:
        """Return these cycles and then the others."""
        names = ("low", "high", "count", "low_measure", "high_measure")
        return Cycles(*(np.concatenate([getattr(self, name), getattr(other, name)]) for name in names))


def measure_of(event: EventReading) -> int:
    """Return the position in :data:`MEASURES` of what an event was recorded as."""
    return MEASURES.index("deflection" if event.measures == "travel" else event.measures)


def cycles_of(duty: Duty, drawn: HelicalSpring, residue: str) -> Cycles:
    """Return the distinct cycles of one pass; events recorded as travel are deflections like any other."""
    table = duty.one_pass(drawn).cycles(residue)  # type: ignore[arg-type]
    measure = np.array([measure_of(event) for event in duty.events])
    found = Cycles(table.low, table.high, table.count, measure[table.event_low], measure[table.event_high])
    found = found.chosen((found.count > 0) & (found.high > found.low))
    keys = np.stack([found.low, found.high, found.low_measure, found.high_measure], axis=1)
    return found.merged(np.unique(keys, axis=0, return_inverse=True)[1].ravel()) if found.low.size else found


def in_cells(cycles: Cycles, damage: Floats) -> Cycles:
    """Keep the cycles that matter one by one and put the rest into cells with their mean low and high.

    Kept are those with the largest ``damage`` (of the drawn spring, shape (m,)) and the highest ones, which
    yield and solid contact hang on.
    """
    most = KEPT + SIDE * SIDE // 2
    if cycles.low.size <= most:
        return cycles
    keep = np.zeros(cycles.low.size, dtype=bool)
    keep[np.argsort(damage, kind="stable")[-KEPT:]] = True
    keep[np.argsort(cycles.high, kind="stable")[-KEPT // 8 :]] = True
    rest = cycles.chosen(~keep)
    bottom, width = rest.low.min(), (rest.high.max() - rest.low.min()) / SIDE
    column, row = (np.minimum((part - bottom) // width, SIDE - 1).astype(np.intp) for part in (rest.low, rest.high))
    size = len(MEASURES)
    cell = ((column * SIDE + row) * size + rest.low_measure) * size + rest.high_measure
    return cycles.chosen(keep).with_more(rest.merged(cell))


@dataclass(frozen=True)
class Outcome:
    """What became of n springs, arrays of shape (n,)."""

    passes: Floats  # infinite without damage
    yields: Bools  # the greatest stress is past the static limit
    solid: Bools  # the duty asks for more than the deflection at solid


class Population:
    """Springs of one drawing that scatter as ``spreads`` say, under the duty of a judged case."""

    def __init__(self, case: Case, duty: Duty, judgement: Judgement, spreads: tuple[Spread, ...]) -> None:
        """Gather the duty's cycles and what does not scatter."""
        self.case, self.drawn, self.model, self.spreads = case, judgement.spring, judgement.model, spreads
        self.stretch = _MEAN_OVER_DRAWN[drawn_diameter(case)[0]]
        self.recorded = {measure_of(event): event for event in duty.events}.values()  # one a measure
        self.centre = self._centre(case)
        self.every = cycles_of(duty, self.drawn, "repeat")
        self.steady = in_cells(self.every, self._of_the_drawing(self.every))
        self.first: Cycles | None = None  # when the first pass differs from those after it
        if case.judge.residue != "repeat":
            first = cycles_of(duty, self.drawn, case.judge.residue)
            self.first = in_cells(first, self._of_the_drawing(first))

    def _centre(self, case: Case) -> dict[str, float]:
        """Value of each variable when it does not scatter."""
        drawn = self.drawn
        return dict.fromkeys(VARIABLES, 1.0) | {
            "wire_diameter": drawn.wire_diameter,
            "coil_diameter": drawn_diameter(case)[1],
            "active_coils": drawn.active_coils,
            "free_length": drawn.free_length,
            "shear_modulus": drawn.G,
            "tensile_strength": drawn.Sut,
            "allowed_damage": case.judge.allowed_damage,
        }

    def outcome(self, u: Floats) -> Outcome:
        """Return what becomes of the springs at uniform numbers ``u``, shape (n, number of spreads)."""
        found = [self._outcome(part) for part in np.array_split(u, self._parts(len(u), self.steady))]
        return Outcome(
            *(np.concatenate([getattr(one, name) for one in found]) for name in ("passes", "yields", "solid"))
        )

    def cell_error(self, u: Floats) -> float:
        """Return the largest relative difference of damage that cells make, of the springs at ``u``."""
        if self.steady is self.every:
            return 0.0
        worst = 0.0
        for part in np.array_split(u, self._parts(len(u), self.every)):
            values = self._values(part)
            exact, near = (self._damage(cycles, values)[0].sum(axis=1) for cycles in (self.every, self.steady))
            sound = (exact > 0) & np.isfinite(exact)
            worst = max(worst, float(np.max(np.abs(near[sound] / exact[sound] - 1), initial=0.0)))
        return worst

    def _parts(self, samples: int, cycles: Cycles) -> int:
        return max(1, -(-samples * cycles.low.size // AT_ONCE))

    def _of_the_drawing(self, cycles: Cycles) -> Floats:
        """Damage of each cycle for the drawn spring, shape (m,)."""
        values = {name: np.full((1, 1), value) for name, value in self.centre.items()}
        damage, _, _ = self._damage(cycles, values)
        return np.asarray(damage[0], dtype=np.float64)

    def _values(self, u: Floats) -> dict[str, Floats]:
        """Turn uniform numbers into the value of each variable, shape (n, 1)."""
        values = {name: np.full((len(u), 1), value) for name, value in self.centre.items()}
        return values | {spread.name: spread.values(u[:, [i]]) for i, spread in enumerate(self.spreads)}

    def _outcome(self, u: Floats) -> Outcome:
        values = self._values(u)
        damage, peak, springs = self._damage(self.steady, values)
        each = damage.sum(axis=1)
        first = each if self.first is None else self._damage(self.first, values)[0].sum(axis=1)
        allowed = (values["allowed_damage"] * values["life"])[:, 0]
        stress = stress_map(cast("HelicalSpring", springs), self.case.judge.stress_factor)
        limit = self.drawn.static_limit * springs.tensile_ratio
        return Outcome(
            passes=_passes(first, each, allowed),
            yields=(stress.static(peak) > limit)[:, 0],
            solid=(peak > springs.solid_deflection)[:, 0],
        )

    def _damage(self, cycles: Cycles, values: dict[str, Floats]) -> tuple[Floats, Floats, Springs]:
        """Return the damage of each cycle for each spring, shape (n, m), and each one's peak, shape (n, 1).

        The laws take arrays where they say a spring: the stress map reads only numbers of it.
        """
        springs = Springs.of(self.drawn, values["coil_diameter"] + self.stretch * values["wire_diameter"], values)
        self._check(springs)
        low, high = self._deflections(cycles, springs, values["duty"])
        judge, model = self.case.judge, self.model
        stress = stress_map(cast("HelicalSpring", springs), judge.stress_factor, judge.curvature_on)
        Ssu, Ssy = model.Ssu * springs.tensile_ratio, model.Ssy * springs.tensile_ratio
        tau_ar = model.criterion.equivalent(*stress.cycles(low, high), Ssu, Ssy)
        lives = [life for life, _ in model.curve.points]
        strengths = self._strengths(springs.tensile_ratio, Ssu, Ssy)
        N = cycles_to_failure(tau_ar / values["endurance_strength"], lives, strengths, model.miner)
        with np.errstate(divide="ignore"):
            damage = cycles.count / N
        return damage, high.max(axis=1, keepdims=True, initial=0.0), springs

    def _check(self, springs: Springs) -> None:
        """Refuse tolerances under which springs come out that cannot be wound."""
        faults = {
            "they are solid at their free length": springs.solid_deflection <= 0,
            "they have no active coil": ~(springs.rate > 0),
            "their coil is no wider than their wire": springs.mean_diameter <= springs.wire_diameter,
        }
        for fault, which in faults.items():
            if which.any():
                raise InputError(
                    f"{self.case.path}: {np.count_nonzero(which)} of {which.size} springs cannot exist: {fault}; "
                    "narrow the tolerances in [scatter]"
                )

    def _deflections(self, cycles: Cycles, springs: Springs, duty: Floats) -> tuple[Floats, Floats]:
        """Give both ends of each cycle in deflections of each spring, m, shapes (n, m).

        A deflection stays, a length between the seats moves with the free length, a force with the rate; then
        the duty's factor stretches the range about its mean.
        """
        low, high = np.empty((len(duty), cycles.low.size)), np.empty((len(duty), cycles.low.size))
        for event in self.recorded:
            number = measure_of(event)
            slope0, shift0 = event.line(self.drawn)
            slope, shift = (np.asarray(part) for part in event.line(cast("HelicalSpring", springs)))
            for ends, at, measure in ((low, cycles.low, cycles.low_measure), (high, cycles.high, cycles.high_measure)):
                here = measure == number
                if here.any():
                    ends[:, here] = slope * ((at[here] - shift0) / slope0) + shift
        # Ends of different measures may change places; in which order they come does not matter.
        mean, half = (high + low) / 2, duty * np.abs(high - low) / 2
        return mean - half, mean + half

    def _strengths(self, ratio: Floats, Ssu: Floats, Ssy: Floats) -> list[Floats]:
        """Return the life curve's strengths for each spring, each of shape (n, 1).

        Zimmerli's pair does not depend on the wire's strength, but drawing the criterion through it does; the
        handbook's fractions grow with the wire's strength; curves of own tests stand as they were tested.
        """
        points = [strength for _, strength in self.model.curve.points]
        basis = self.case.judge.endurance
        if basis == "handbook":
            return [strength * ratio for strength in points]
        if basis != "zimmerli":
            return [np.full_like(ratio, strength) for strength in points]
        pair = zimmerli(self.drawn.shot_peened)
        Sse = self.model.criterion.equivalent(pair.Ssa, pair.Ssm, Ssu, Ssy)
        top = points[0] * ratio
        lost = int(np.count_nonzero(~(Sse < top)))
        if lost:
            raise InputError(
                f"{self.case.path}: {lost} of {ratio.size} springs are so weak in tension that "
                f"{self.model.criterion.name} has no strength from Zimmerli's pair; choose another criterion or "
                "endurance basis, or give scatter.tensile_strength"
            )
        return [top, Sse]


def _passes(first: Floats, each: Floats, allowed: Floats) -> Floats:
    """Return the passes until the damage reaches the allowed sum: the first pass, then the steady state."""
    with np.errstate(divide="ignore", invalid="ignore"):
        later = np.where(np.isfinite(each), 1.0 + (allowed - first) / each, 0.0)
        return np.where(each == 0, np.inf, np.where(first >= allowed, allowed / first, later))
