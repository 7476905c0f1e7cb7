"""How lives scatter when dimensions, material, use and damage sum do: B lives, failures, what matters most.

The study draws scrambled Sobol points in independent replicates: each replicate fills the space evenly, and the
differences between replicates say how far the results can be trusted. The duty is counted once for all of them.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from springlife import __version__
from springlife.errors import InputError
from springlife.life.assess import Assessment, assess
from springlife.life.case import Case, load_case
from springlife.life.population import Floats, Outcome, Population
from springlife.life.result import finite
from springlife.life.scatter_input import ScatterInput
from springlife.life.spread import Spread, spreads_of

# Settings of the method: replicates, confidence of the intervals, failed parts of the B lives, replicates'
# share of the samples that the indices get, springs held against their exact damage, and the part of lives
# without end (or without beginning) that the indices bear.
REPLICATES, CONFIDENCE, B_LIVES, INDEX_SHARE, CHECKED, NO_NUMBER = 16, 0.95, (0.01, 0.10, 0.50), 8, 16, 0.01


@dataclass(frozen=True)
class Estimate:
    """A number with its confidence interval."""

    value: float
    low: float
    high: float

    def to_dict(self) -> dict[str, float | None]:
        """Give the three numbers for JSON; infinity is null."""
        return {"value": finite(self.value), "low": finite(self.low), "high": finite(self.high)}


@dataclass(frozen=True)
class Sensitivity:
    """A variable's part of the variance of log life: alone, and with everything it acts together with."""

    variable: str
    first: Estimate
    total: Estimate


@dataclass(frozen=True)
class ScatterResult:
    """A scatter study. Lives are in passes; infinite means no damage."""

    assessment: Assessment
    spreads: tuple[Spread, ...]
    seed: int
    samples: int
    b_lives: dict[str, Estimate]  # "B10": the life that nine springs in ten exceed
    fails: Estimate  # part of the springs that fail before the target
    yields: Estimate  # part whose greatest stress is past the static limit
    solid: Estimate  # part that the duty would press past solid
    sensitivities: tuple[Sensitivity, ...]  # largest total first
    no_sensitivities: str | None  # why there are none
    lives: Floats  # one a spring, in passes, shape (samples,)
    distinct_cycles: int
    cells: int  # what the distinct cycles were put into; the same number when none were joined
    cell_error: float  # largest relative difference of damage that cells made among the springs checked

    @property
    def case(self) -> Case:
        """The case studied."""
        return self.assessment.case

    @property
    def off(self) -> tuple[str, ...]:
        """Variables that do not scatter."""
        return tuple(self.case.input.scatter.off)

    @property
    def pairing_held(self) -> bool:
        """Whether cycles are paired as for the drawn spring: exact only when all ends are measured alike."""
        assert self.assessment.duty is not None
        strokes = {"deflection", "travel"}
        measures = {event.measures for event in self.assessment.duty.events}
        return len(measures - strokes) + bool(measures & strokes) > 1

    def to_dict(self) -> dict[str, Any]:
        """Give everything for JSON but the single lives; SI values under keys that name the unit."""
        number, unit = self.assessment.target
        per_pass = number / self.case.duty.target_passes
        return {
            "version": __version__,
            "title": self.case.input.title,
            "verdict": self.assessment.verdict,
            "target": {"value": number, "unit": unit},
            "target_passes": self.case.duty.target_passes,
            "seed": self.seed,
            "samples": self.samples,
            "replicates": REPLICATES,
            "confidence": CONFIDENCE,
            "strengths_are": self.case.input.scatter.strengths_are,
            "b_lives": {
                name: {
                    "passes": life.to_dict(),
                    "life": {
                        "value": finite(life.value * per_pass),
                        "low": finite(life.low * per_pass),
                        "high": finite(life.high * per_pass),
                        "unit": unit,
                    },
                }
                for name, life in self.b_lives.items()
            },
            "fails_before_target": self.fails.to_dict(),
            "past_static_limit": self.yields.to_dict(),
            "past_solid": self.solid.to_dict(),
            "sensitivities": [
                {"variable": one.variable, "first": one.first.to_dict(), "total": one.total.to_dict()}
                for one in self.sensitivities
            ],
            "no_sensitivities": self.no_sensitivities,
            "distributions": [spread.to_dict() for spread in self.spreads],
            "off": list(self.off),
            "distinct_cycles": self.distinct_cycles,
            "cells": self.cells,
            "cell_error": self.cell_error,
            "pairing_held": self.pairing_held,
            "findings": [finding.to_dict() for finding in self.assessment.findings],
            "inputs": [{"path": name, "sha256": digest} for name, digest in self.assessment.inputs],
        }


def scatter(case: Case | str | Path, *, samples: int | None = None, seed: int | None = None) -> ScatterResult:
    """Study how a case's life scatters; the records are read once.

    Parameters
    ----------
    case : Case or path
        The case; its [scatter] table changes the default distributions.
    samples, seed : int, optional
        In place of the case's.

    Raises
    ------
    FileError, InputError
        When the case or a record cannot be used, nothing could be judged, or no spring takes damage.
    """
    case = case if isinstance(case, Case) else load_case(case)
    given = _settings(case, samples, seed)
    assessment = assess(case)
    if assessment.duty is None or assessment.judgement is None:
        stops = "; ".join(finding.message for finding in assessment.findings if finding.level == "stop")
        raise InputError(f"{case.path}: cannot be judged, so there is nothing to scatter: {stops}")
    spreads = spreads_of(case, assessment.judgement.spring)
    springs = Population(case, assessment.duty, assessment.judgement, spreads)
    seeds = np.random.SeedSequence(given.seed).spawn(2 * REPLICATES)
    size = given.samples // REPLICATES
    drawn = [springs.outcome(_points(len(spreads), size, one)) for one in seeds[:REPLICATES]]
    lives = np.concatenate([one.passes for one in drawn])
    if not np.isfinite(lives).any():
        raise InputError(f"{case.path}: no spring of {lives.size} takes damage from the duty, so no life scatters")
    parts = [_points(2 * len(spreads), max(size // INDEX_SHARE, 32), one) for one in seeds[REPLICATES:]]
    sensitivities, reason = _sensitivities(springs, parts)
    target = case.duty.target_passes
    return ScatterResult(
        assessment=assessment,
        spreads=spreads,
        seed=given.seed,
        samples=given.samples,
        b_lives={f"B{100 * part:g}": _quantile(drawn, part) for part in B_LIVES},
        fails=_share(drawn, lambda one: one.passes < target),
        yields=_share(drawn, lambda one: one.yields),
        solid=_share(drawn, lambda one: one.solid),
        sensitivities=sensitivities,
        no_sensitivities=reason,
        lives=lives,
        distinct_cycles=springs.every.low.size,
        cells=springs.steady.low.size,
        cell_error=springs.cell_error(_points(len(spreads), CHECKED, seeds[0])),
    )


def b_lives(assessment: Assessment, *, samples: int | None = None) -> dict[str, Estimate] | None:
    """Return the B lives (passes) of a case already judged, without reading again; None when nothing takes damage.

    Parameters
    ----------
    assessment : Assessment
        Judged, with its duty as it is to be evaluated.
    samples : int, optional
        In place of the case's.
    """
    if assessment.duty is None or assessment.judgement is None:
        return None
    given = _settings(assessment.case, samples, None)
    spreads = spreads_of(assessment.case, assessment.judgement.spring)
    springs = Population(assessment.case, assessment.duty, assessment.judgement, spreads)
    seeds = np.random.SeedSequence(given.seed).spawn(REPLICATES)
    drawn = [springs.outcome(_points(len(spreads), given.samples // REPLICATES, one)) for one in seeds]
    if not np.isfinite(np.concatenate([one.passes for one in drawn])).any():
        return None
    return {f"B{100 * part:g}": _quantile(drawn, part) for part in B_LIVES}


def _settings(case: Case, samples: int | None, seed: int | None) -> ScatterInput:
    """Return the case's [scatter] table with the arguments in place of its samples and seed."""
    from pydantic import ValidationError

    changed = {key: value for key, value in (("samples", samples), ("seed", seed)) if value is not None}
    try:
        return ScatterInput.model_validate(case.input.scatter.model_dump(include={"samples", "seed"}) | changed)
    except ValidationError as error:
        raise InputError(error.errors()[0]["msg"].removeprefix("Value error, ")) from error


def _points(variables: int, size: int, seed: np.random.SeedSequence) -> Floats:
    """Draw scrambled Sobol points, shape (size, variables), strictly between 0 and 1."""
    from scipy.stats import qmc

    points = qmc.Sobol(variables, scramble=True, seed=np.random.default_rng(seed)).random(size)
    hair = np.finfo(float).eps
    return np.asarray(np.clip(points, hair, 1 - hair), dtype=np.float64)


def _quantile(drawn: list[Outcome], part: float) -> Estimate:
    """Return the life before which a part of the springs fails.

    Notes
    -----
    The value is that of all springs together; the interval, on log life, is Student's t about it with the
    standard error of the replicates' own quantiles. With a replicate that has no number, it is their range.
    """
    own = np.array([np.quantile(one.passes, part, method="inverted_cdf") for one in drawn])
    value = float(np.quantile(np.concatenate([one.passes for one in drawn]), part, method="inverted_cdf"))
    if not (np.isfinite(own).all() and (own > 0).all()):
        return Estimate(value, float(own.min()), float(own.max()))
    reach = float(np.exp(_reach(np.log(own))))
    return Estimate(value, value / reach, value * reach)


def _share(drawn: list[Outcome], of: Callable[[Outcome], Any]) -> Estimate:
    """Return the part of the springs for which something holds.

    Notes
    -----
    The interval is Student's t over the replicates. When it holds for none or all of n springs, the far end is
    1 - (1 - confidence)^(1/n) away, as for n independent springs.
    """
    own = np.array([np.mean(of(one)) for one in drawn])
    value = float(own.mean())
    reach = _reach(own)
    if value in (0.0, 1.0):
        reach = 1 - (1 - CONFIDENCE) ** (1 / sum(one.passes.size for one in drawn))
    return Estimate(value, max(0.0, value - reach), min(1.0, value + reach))


def _reach(own: Floats) -> float:
    """Half the width of Student's t interval of the mean of the replicates' values."""
    from scipy.special import stdtrit

    t = stdtrit(own.size - 1, (1 + CONFIDENCE) / 2)
    return float(t * np.std(own, ddof=1) / np.sqrt(own.size))


def _sensitivities(springs: Population, parts: list[Floats]) -> tuple[tuple[Sensitivity, ...], str | None]:
    """Return first-order and total Sobol indices of log life with their intervals over the replicates.

    Notes
    -----
    Each replicate's points of twice the dimension are the two independent matrices A and B; the matrix AB_i is
    A with the i-th column of B.

    References
    ----------
    A. Saltelli et al., Computer Physics Communications 181, 2010: the estimators (memory).
    """
    from scipy.stats import sobol_indices

    names = [spread.name for spread in springs.spreads]
    size = len(names)
    lives = np.stack([_of_design(springs, both[:, :size], both[:, size:]) for both in parts])
    sound = np.isfinite(lives)
    if not sound.any() or np.mean(~sound) > NO_NUMBER:
        share = f"{100 * np.mean(~sound):.2g} %"
        return (), f"{share} of the springs have no life to take a logarithm of (unlimited, or failing at once)"
    lives = np.clip(lives, lives[sound].min(), lives[sound].max())
    if size == 1:  # all the variance there is; scipy's estimator wants two variables
        whole = Estimate(*[float(np.ptp(lives) > 0)] * 3)
        return (Sensitivity(names[0], whole, whole),), None
    first, total = [], []
    for one in lives:
        indices = sobol_indices(func={"f_A": one[:1], "f_B": one[1:2], "f_AB": one[2:, None]}, n=one.shape[1])
        first.append(indices.first_order)
        total.append(indices.total_order)
    ranked = [
        Sensitivity(name, _mean([one[i] for one in first]), _mean([one[i] for one in total]))
        for i, name in enumerate(names)
    ]
    return tuple(sorted(ranked, key=lambda one: one.total.value, reverse=True)), None


def _of_design(springs: Population, A: Floats, B: Floats) -> Floats:
    """Return log life at A, B and each A with one column of B, shape (variables + 2, n)."""
    mixed = []
    for i in range(A.shape[1]):
        mixed.append(A.copy())
        mixed[-1][:, i] = B[:, i]
    with np.errstate(divide="ignore"):
        return np.log(springs.outcome(np.concatenate([A, B, *mixed])).passes).reshape(-1, len(A))


def _mean(own: list[float]) -> Estimate:
    values = np.asarray(own, dtype=np.float64)
    value, reach = float(values.mean()), _reach(values)
    return Estimate(value, value - reach, value + reach)
