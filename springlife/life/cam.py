"""A spring under a cam over a range of speeds: the steady wave of each, and the life of the worst coil at it."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

import numpy as np

from springlife.duty.counting import count
from springlife.errors import InputError
from springlife.life.result import finite
from springlife.spring.surge import Wave, periodic
from springlife.spring.surge_filter import Floats

if TYPE_CHECKING:
    from springlife.life.assess import Judgement
    from springlife.life.case import Case
    from springlife.life.surge_input import CamInput

TURN = 360.0  # degrees


@dataclass(frozen=True)
class CamSpeed:
    """One speed in its steady state: deflections in m, forces in N, damage a turn of the worst coil."""

    turns_per_minute: float
    amplification: float
    place: int
    low: float
    high: float
    least_seat_force: float
    damage: float
    closed: bool

    @property
    def lifts(self) -> bool:
        """Whether a seat would have to pull."""
        return self.least_seat_force < 0

    @property
    def hours(self) -> float | None:
        """Hours at this speed until the damage is 1; None when there is no damage."""
        return None if self.damage == 0 else 1 / self.damage / (60 * self.turns_per_minute)


@dataclass(frozen=True)
class CamSweep:
    """A cam at each of its speeds, beside the damage a turn of slow motion."""

    name: str
    slow_damage: float
    speeds: tuple[CamSpeed, ...]

    def to_dict(self, coil: Any) -> dict[str, Any]:
        """Give the sweep for JSON; ``coil`` turns a place into a coil number."""
        return {
            "name": self.name,
            "slow_damage_per_turn": finite(self.slow_damage),
            "speeds": [
                {
                    "turns_per_minute": one.turns_per_minute,
                    "amplification": one.amplification,
                    "worst_coil": coil(one.place),
                    "low_m": one.low,
                    "high_m": one.high,
                    "least_seat_force_N": one.least_seat_force,
                    "damage_per_turn": finite(one.damage),
                    "hours_to_damage_1": one.hours,
                    "gap_closed": one.closed,
                    "lifts_off": one.lifts,
                }
                for one in self.speeds
            ],
        }


def sweeps(case: Case, judgement: Judgement, wave: Wave, positions: Floats) -> tuple[CamSweep, ...]:
    """Judge every cam of a case at each of its speeds.

    Raises
    ------
    FileError, InputError
        A lift table cannot be read, or is not one turn.
    """
    found = []
    for cam in case.input.surge.cam:
        turn = cam.installed_deflection + lift_of(case, cam)
        slow = _damage(judgement, turn)
        speeds = tuple(_at(case, judgement, wave, positions, turn, speed) for speed in cam.speeds)
        found.append(CamSweep(cam.name, slow, speeds))
    return tuple(found)


def lift_of(case: Case, cam: CamInput) -> Floats:
    """Return the lift over one turn in m, evenly spaced, at least as finely as the table; the turn closes.

    Notes
    -----
    A periodic cubic spline through the rows, which may lie at any increasing angles.
    """
    from scipy.interpolate import CubicSpline

    path = case.beside(cam.cam)
    angle, lift = _column(case, cam, cam.angle, None), _column(case, cam, cam.lift, "length")
    steps = np.diff(angle)
    if not (steps > 0).all():
        row = int(np.argmax(steps <= 0)) + 2
        raise InputError(f"{path}, column {cam.angle!r}: row {row} of the table does not increase the angle; sort it")
    span = float(angle[-1] - angle[0])
    if abs(span - TURN) > 1e-6 * TURN:  # the row that closes the turn has been left out
        if not 0 < TURN - span <= 2 * float(steps.max()):
            raise InputError(f"{path}, column {cam.angle!r}: covers {span:g} degrees; a lift table covers 360")
        angle, lift = np.append(angle, angle[0] + TURN), np.append(lift, lift[0])
    elif abs(lift[-1] - lift[0]) > 1e-3 * np.ptp(lift):
        raise InputError(
            f"{path}, column {cam.lift!r}: ends at {1e3 * lift[-1]:g} mm and starts at {1e3 * lift[0]:g} mm; "
            "the lift after one turn must be that before it"
        )
    lift[-1] = lift[0]
    samples = 1 << (angle.size - 1).bit_length()
    even = angle[0] + TURN * np.arange(samples) / samples
    return np.asarray(CubicSpline(angle, lift, bc_type="periodic")(even), dtype=np.float64)


def _column(case: Case, cam: CamInput, name: str | int, kind: str | None) -> Floats:
    from springlife.duty.record import RecordSpec, open_record

    unit = cam.unit if kind else None
    spec = RecordSpec(path=case.beside(cam.cam), channel=name, sample_rate=1.0, unit=unit, kind=kind)
    return np.concatenate(list(open_record(spec).blocks()))


def _at(case: Case, judgement: Judgement, wave: Wave, positions: Floats, turn: Floats, speed: float) -> CamSpeed:
    """Judge one speed."""
    given, spring = case.input.surge, judgement.spring
    local = periodic(turn, speed / 60, wave, positions, up_to=given.up_to, moving_ends=given.moving_ends)
    damage = np.array([_damage(judgement, row) for row in local])
    span = np.ptp(local, axis=1)
    worst = int(np.lexsort((span, damage))[-1])
    still = float(np.ptp(turn))
    return CamSpeed(
        turns_per_minute=speed,
        amplification=float(span.max()) / still if still > 0 else 1.0,
        place=worst,
        low=float(local[worst].min()),
        high=float(local[worst].max()),
        least_seat_force=spring.rate * float(min(local[0].min(), local[-1].min())),
        damage=float(damage[worst]),
        closed=bool(local.max() > spring.solid_deflection),
    )


def _damage(judgement: Judgement, turn: Floats) -> float:
    """Return the damage of one turn that goes on for ever."""
    table = count(turn).table("repeat")
    return float(judgement.model.damage(table.low, table.high, table.count).sum())


def warnings(sweep: CamSweep) -> Iterator[str]:
    """Yield the speeds at which the model does not hold."""
    closed = [one.turns_per_minute for one in sweep.speeds if one.closed]
    lifts = [one.turns_per_minute for one in sweep.speeds if one.lifts]
    if closed:
        least = f"{min(closed):g} rpm"
        yield f"cam {sweep.name!r} closes the gap of a coil from {least}: coils clash, which is not followed"
    if lifts:
        yield f"cam {sweep.name!r} would have a seat pull from {min(lifts):g} rpm: the spring lifts off there"
