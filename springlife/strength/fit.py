"""Own tests: fitted with run-outs counted as what they are, and written as a curve file.

Each group gets its own Basquin line with lognormal life; likelihood-ratio tests say whether groups differ.
A run-out says only that the life is longer: it is never dropped and never a failure.
"""

from __future__ import annotations

import json
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import ArrayLike, NDArray

from springlife.errors import InputError
from springlife.files import write_file
from springlife.strength.criteria import Criterion, Floats
from springlife.strength.curve import FORMAT, LifeCurve
from springlife.strength.endurance import data
from springlife.strength.likelihood import Censored
from springlife.strength.line import CONFIDENCE, Line, share
from springlife.units import METRIC

PEENED = {"peened": True, "shot-peened": True, "unpeened": False, "not peened": False}  # group names


@dataclass(frozen=True)
class Comparison:
    """A likelihood-ratio test between groups: a small ``p_value`` speaks against ``question``."""

    question: str
    statistic: float
    dof: int
    p_value: float


@dataclass(frozen=True)
class Fit:
    """The lines of all groups, the tests between them, and what a reader must know."""

    lines: tuple[Line, ...]
    comparisons: tuple[Comparison, ...]
    criterion: str
    notes: tuple[str, ...]

    def to_dict(self) -> dict[str, Any]:
        """Give everything for JSON; intervals at the usual confidence."""
        return {
            "criterion": self.criterion,
            "confidence": CONFIDENCE,
            "lines": [_line_dict(line) for line in self.lines],
            "comparisons": [vars(comparison) for comparison in self.comparisons],
            "notes": list(self.notes),
        }


def _line_dict(line: Line) -> dict[str, Any]:
    limit = line.fatigue_limit()
    return {
        "group": line.group,
        "A_Pa": line.A,
        "B": line.B,
        "slope": line.slope,
        "slope_interval": list(line.slope_interval()),
        "scatter_log10": line.s,
        "scatter_interval": list(line.scatter_interval()),
        "failures": line.failures,
        "run_outs": line.run_outs,
        "amplitudes_tested_Pa": list(line.amplitudes),
        "lives_tested": list(line.lives),
        "design_method": line.design_method,
        "fatigue_limit_Pa": limit.amplitude,
        "fatigue_limit_interval_Pa": [limit.low, limit.high],
        "fatigue_limit_p_value": limit.p_value,
    }


def fit_tests(
    amplitude: ArrayLike,
    mean: ArrayLike,
    cycles: ArrayLike,
    failed: ArrayLike,
    groups: Sequence[str] | None = None,
    *,
    criterion: Criterion,
    Ssu: float,
    Ssy: float,
) -> Fit:
    """Fit Basquin lines to tests, one for each group, and test whether the groups differ.

    Parameters
    ----------
    amplitude, mean : array_like
        Alternating and mean shear stress of each spring, Pa.
    cycles : array_like
        Cycles at failure, or at which the test was stopped.
    failed : array_like of bool
        False for a run-out.
    groups : sequence of str, optional
        Group of each spring, such as "peened"; without it all springs are one group.
    criterion, Ssu, Ssy
        How a mean stress is taken into account, and the wire's strengths in shear, Pa.

    Raises
    ------
    InputError
        Too few failures, one stress level, only run-outs, no scatter, or values that are not tests.

    References
    ----------
    ASTM E739 for complete data (memory); W. Q. Meeker and L. A. Escobar, Statistical Methods for Reliability
    Data, for run-outs (memory).
    """
    S, N, ran, names = _checked(amplitude, mean, cycles, failed, groups, criterion, Ssu, Ssy)
    order = list(dict.fromkeys(names.tolist()))
    lines = tuple(_fit_line(name, S[names == name], N[names == name], ran[names == name]) for name in order)
    comparisons = _compare(lines, np.log10(S), np.log10(N), ran, names) if len(lines) > 1 else ()
    return Fit(lines, comparisons, criterion.name, tuple(note for line in lines for note in _notes(line)))


def _checked(
    amplitude: ArrayLike,
    mean: ArrayLike,
    cycles: ArrayLike,
    failed: ArrayLike,
    groups: Sequence[str] | None,
    criterion: Criterion,
    Ssu: float,
    Ssy: float,
) -> tuple[Floats, Floats, NDArray[np.bool_], NDArray[np.str_]]:
    """Return fully reversed amplitudes, cycles, failed and group names as arrays of one length."""
    tau_a, tau_m, N = (np.atleast_1d(np.asarray(one, dtype=np.float64)) for one in (amplitude, mean, cycles))
    ran = np.atleast_1d(np.asarray(failed, dtype=bool))
    names = np.asarray(["all"] * len(N) if groups is None else list(groups), dtype=str)
    sizes = {len(one) for one in (tau_a, tau_m, N, ran, names)}
    if len(sizes) > 1:
        raise InputError(f"amplitude, mean, cycles, failed and groups have lengths {sorted(sizes)}; give one a spring")
    for values, what in ((tau_a, "stress amplitude"), (N, "number of cycles")):
        bad = ~(np.isfinite(values) & (values > 0))
        if bad.any():
            i = int(np.argmax(bad))
            raise InputError(f"test {i + 1}: {what} is {values[i]:g}; it must be above zero and finite")
    S = np.asarray(criterion.equivalent(tau_a, tau_m, Ssu, Ssy))
    if not np.isfinite(S).all():
        i = int(np.argmin(np.isfinite(S)))
        raise InputError(
            f"test {i + 1}: mean stress {METRIC(float(tau_m[i]), 'stress')} has no value by {criterion.name} "
            f"(Ssu {METRIC(Ssu, 'stress')}, Ssy {METRIC(Ssy, 'stress')}); it must lie under the intercept"
        )
    return S, N, ran, names


def _fit_line(name: str, S: Floats, N: Floats, failed: NDArray[np.bool_]) -> Line:
    """Fit one group, or say what it lacks."""
    of = "" if name == "all" else f"group {name!r}: "
    failures = int(np.count_nonzero(failed))
    least = data()["own_tests"]["least_failures"]
    if failures == 0:
        raise InputError(f"{of}all {len(N)} springs are run-outs; test at higher stress until some fail")
    x, y = np.log10(S), np.log10(N)
    levels = 1 + int(np.count_nonzero(np.diff(np.sort(x[failed])) > 1e-6))
    if levels < 2:
        level = METRIC(float(S[failed][0]), "stress")
        raise InputError(f"{of}all failures are at one stress level, {level}; a slope needs failures at two or more")
    if failures < least:
        raise InputError(f"{of}{failures} failures are too few for a line and its scatter; at least {least} are needed")
    centre = (float(x.mean()), float(y.mean()))
    X = np.column_stack([np.ones_like(x), x - centre[0]])
    residuals = y[failed] - X[failed] @ np.linalg.lstsq(X[failed], y[failed], rcond=None)[0]
    if np.max(np.abs(residuals)) < 1e-9:
        raise InputError(f"{of}all failures lie on one line, so there is no scatter to estimate; check the results")
    observed = Censored(X, y - centre[1], failed)
    B = float(observed.beta[1])
    return Line(
        group=name,
        A=float(observed.beta[0]) + centre[1] - B * centre[0],
        B=B,
        s=observed.sigma,
        failures=failures,
        run_outs=len(N) - failures,
        amplitudes=(float(S.min()), float(S.max())),
        lives=(float(N.min()), float(N.max())),
        observed=observed,
        centre=centre,
    )


def _compare(
    lines: tuple[Line, ...], x: Floats, y: Floats, failed: NDArray[np.bool_], names: NDArray[np.str_]
) -> tuple[Comparison, ...]:
    """Test scatter, then slope, then position, then everything at once, each by the likelihood ratio."""
    from scipy.special import chdtrc

    x, y = x - x.mean(), y - y.mean()
    one = np.ones_like(x)
    members = [np.where(names == line.group, 1.0, 0.0) for line in lines[1:]]
    apart = sum(line.observed.log_likelihood for line in lines)
    same_scatter, same_slope, same_line = (
        Censored(np.column_stack(columns), y, failed).log_likelihood
        for columns in (
            [one, x, *members, *(member * x for member in members)],
            [one, x, *members],
            [one, x],
        )
    )
    more = len(members)
    steps = (
        ("the groups scatter alike", apart, same_scatter, more),
        ("with one scatter, the slopes are alike", same_scatter, same_slope, more),
        ("with one scatter and slope, the lines are one", same_slope, same_line, more),
        ("the groups are alike in all", apart, same_line, 3 * more),
    )
    return tuple(
        Comparison(question, float(gain := max(2 * (wide - narrow), 0.0)), dof, float(chdtrc(dof, gain)))
        for question, wide, narrow, dof in steps
    )


def _notes(line: Line) -> list[str]:
    of = "" if line.group == "all" else f"group {line.group!r}: "
    springs = line.failures + line.run_outs
    design = data()["own_tests"]["design"]
    notes = []
    if springs < design["least_springs"]:
        notes.append(f"{of}{springs} springs; {design['source']} asks {design['least_springs']} for a design curve")
    if not line.falls():
        notes.append(f"{of}the tests do not show that life falls with stress; spread the stress levels further")
    return notes


def write_curve(
    fit: Fit,
    path: str | Path,
    *,
    title: str,
    source: str,
    reliability: float = 0.9,
    confidence: float | None = CONFIDENCE,
    force: bool = False,
) -> None:
    """Write the curve file that a case names as ``endurance``: one group for each line of the fit.

    Parameters
    ----------
    title, source : str
        What was tested, and where the tests are kept.
    reliability, confidence : float
        Of the design curve; without a confidence, the best estimate for that share of springs.
    force : bool
        Write over a file that is already there.

    Raises
    ------
    InputError
        The lives asked for do not fall with stress over the amplitudes tested.
    FileError
        The file is there already, or cannot be written.
    """
    head = [
        f"format = {FORMAT}",
        f"title = {_text(title)}",
        f"source = {_text(source)}",
        f"criterion = {_text(fit.criterion)}",
        f"reliability = {share(reliability, 'reliability'):g}",
        *([] if confidence is None else [f"confidence = {share(confidence, 'confidence'):g}"]),
    ]
    text = "\n".join([*head, *(row for line in fit.lines for row in _group_rows(line, reliability, confidence)), ""])
    write_file(path, lambda place: place.write_text(text, encoding="utf-8"), force=force)


def _group_rows(line: Line, reliability: float, confidence: float | None) -> list[str]:
    points = line.curve_points(reliability, confidence)
    name = "the springs tested" if line.group == "all" else line.group
    try:
        LifeCurve(points, name, (), *line.lives)
    except InputError as error:
        raise InputError(f"the tests give no curve at this reliability and confidence: {error}") from error
    peened = PEENED.get(line.group)
    return [
        "",
        "[[group]]",
        f"name = {_text(name)}",
        *([] if peened is None else [f"shot_peened = {str(peened).lower()}"]),
        f"scatter = {line.s:.4g}",
        f"tested = {{ shortest = {line.lives[0]:.9g}, longest = {line.lives[1]:.9g} }}",
        "points = [",
        *(f'    {{ cycles = {N:.6g}, amplitude = "{S / 1e6:.6g} MPa" }},' for N, S in points),
        "]",
    ]


def _text(text: str) -> str:
    return json.dumps(text, ensure_ascii=False)
