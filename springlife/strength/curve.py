"""Finite life: cycles to failure over the fully reversed amplitude, straight between points in log-log.

A curve comes from Zimmerli's pair and an assumed upper end (:func:`two_point`), from the handbook's
fractions (:func:`handbook_curve`) or from a curve file of own tests (:func:`read_curve`);
:func:`endurance_curve` chooses.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from itertools import pairwise
from pathlib import Path

import numpy as np
from numpy.typing import ArrayLike

from springlife.errors import CriterionError, FileError, InputError, nearest
from springlife.strength.criteria import CRITERIA, Criterion, Floats
from springlife.strength.endurance import BASES, Fractions, data, handbook, zimmerli
from springlife.tables import Table, parse_toml
from springlife.units import METRIC

Miner = str  # a key of MINERS
# Slope past the knee from the slope k before it: what a cycle under the knee still does.
MINERS: dict[str, Callable[[Floats], Floats]] = {
    "original": lambda k: k * np.inf,
    "elementary": lambda k: k,
    "haibach": lambda k: 2 * k - 1,
}
FORMAT = 1
MOST_POINTS = 500


def cycles_to_failure(
    tau_ar: ArrayLike, lives: Sequence[float], strengths: Sequence[ArrayLike], miner: Miner = "haibach"
) -> Floats:
    """Return the cycles to failure at fully reversed amplitudes, on a curve through points.

    Parameters
    ----------
    tau_ar : array_like
        Fully reversed amplitudes, Pa; infinite for a static failure.
    lives : sequence of float
        Cycles of the points, rising; the last is the knee.
    strengths : sequence of array_like
        Amplitudes of the points, Pa, falling; each broadcasts against ``tau_ar``, so that every sample of a
        study may have its own curve.
    miner : str
        A key of :data:`MINERS`: under the knee no damage ("original"), the same slope k on ("elementary"),
        or the slope 2k - 1 ("haibach").

    Returns
    -------
    float or ndarray
        N; 0 for an infinite amplitude, infinite for none.

    Notes
    -----
    Between points N = N_i (tau_ar/S_i)^-k_i with k_i = ln(N_i+1/N_i)/ln(S_i/S_i+1); the first slope goes on
    to shorter lives, where the caller says that the curve is not valid.

    References
    ----------
    E. Haibach, Betriebsfestigkeit: slope 2k - 1 past the knee (memory).
    """
    if miner not in MINERS:
        raise InputError(f"miner {miner!r} is not known; {nearest(miner, MINERS)}")
    y = [np.log(life) for life in lives]
    S = [np.log(np.asarray(strength, dtype=np.float64)) for strength in strengths]
    k: list[Floats] = [(y[i + 1] - y[i]) / (S[i] - S[i + 1]) for i in range(len(y) - 1)]
    k.append(MINERS[miner](k[-1]))
    with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
        x = np.log(np.asarray(tau_ar, dtype=np.float64))
        log_N: Floats = y[0] - k[0] * (x - S[0])
        for i in range(1, len(y)):
            log_N = np.where(x < S[i], y[i] - k[i] * (x - S[i]), log_N)
        return np.exp(log_N)


@dataclass(frozen=True)
class LifeCurve:
    """Points (N, S) with N rising and S falling, S in Pa fully reversed; the last point is the knee.

    ``label`` completes "lives follow ..."; lives outside ``valid_from`` to ``valid_to`` are extrapolated.
    ``reliability``, ``confidence`` and ``scatter`` (of log10 N) are None where the source does not state them.
    """

    points: tuple[tuple[float, float], ...]
    label: str
    sources: tuple[str, ...]
    valid_from: float
    valid_to: float
    reliability: float | None = None
    confidence: float | None = None
    scatter: float | None = None

    def __post_init__(self) -> None:
        """Refuse points that are not a falling curve."""
        if len(self.points) < 2:
            raise InputError(f"{self.label}: {len(self.points)} points; a life curve needs at least two")
        for (N1, S1), (N2, S2) in pairwise(self.points):
            if not (0 < N1 < N2 < np.inf and np.inf > S1 > S2 > 0):
                raise InputError(
                    f"{self.label}: {METRIC(S1, 'stress')} at {N1:g} cycles is followed by "
                    f"{METRIC(S2, 'stress')} at {N2:g}; cycles must rise and amplitudes fall, all above zero"
                )

    @property
    def knee(self) -> float:
        """Cycles of the last point."""
        return self.points[-1][0]

    @property
    def strength_at_knee(self) -> float:
        """Fully reversed amplitude at the knee, Pa: Sse."""
        return self.points[-1][1]

    @property
    def slope(self) -> float:
        """Slope k of the last segment, N proportional to S^-k."""
        (N1, S1), (N2, S2) = self.points[-2:]
        return float(np.log(N2 / N1) / np.log(S1 / S2))

    def cycles(self, tau_ar: ArrayLike, miner: Miner = "haibach") -> Floats:
        """Return the cycles to failure of each amplitude: see :func:`cycles_to_failure`."""
        lives, strengths = zip(*self.points, strict=True)
        return cycles_to_failure(tau_ar, lives, strengths, miner)


def two_point(Sse: float, Ssu: float, f: float | None = None, knee: float | None = None) -> LifeCurve:
    """Return the curve through f Ssu at 1,000 cycles and Sse at the knee.

    Parameters
    ----------
    Sse, Ssu : float
        Fully reversed strength and ultimate strength in shear, Pa.
    f, knee : float, optional
        Fraction of Ssu at 1,000 cycles, and cycles of the knee; None takes data/endurance.toml's.

    Raises
    ------
    CriterionError
        Sse is not positive, not finite, or at or above f Ssu: the curve would rise with life.

    Notes
    -----
    tau_ar = a N^b, slope k = -1/b = ln(knee/1000)/ln(f Ssu/Sse). Not valid under 1,000 cycles; no published
    spring test fixes its upper end.

    References
    ----------
    Shigley's Mechanical Engineering Design, sec. 6-8, in torsion (memory).
    """
    table = data()["two_point"]
    start = table["start"]["cycles"]
    f = table["f"] if f is None else f
    knee = data()["zimmerli"]["knee"]["cycles"] if knee is None else knee
    if not 0 < f <= 1:
        raise InputError(f"strength fraction f is {f:g}; it must be above 0 and at most 1")
    if not start < knee < np.inf:
        raise InputError(f"knee is {knee:g} cycles; it must be finite and past the curve's start at {start:g}")
    if not 0 < Sse < f * Ssu:
        raise CriterionError(
            f"fully reversed strength Sse = {METRIC(Sse, 'stress')} is not between 0 and "
            f"f Ssu = {f:g} x {METRIC(Ssu, 'stress')} = {METRIC(f * Ssu, 'stress')}: the curve would not fall"
        )
    return LifeCurve(
        points=((start, f * Ssu), (knee, Sse)),
        label=f"the two-point curve from {f:g} Ssu at {start:g} cycles to the endurance strength at {knee:g}",
        sources=(f"{table['source']} ({table['provenance']})",),
        valid_from=start,
        valid_to=knee,
    )


def handbook_curve(criterion: Criterion, fractions: Fractions, Sut: float, Ssu: float, Ssy: float) -> LifeCurve:
    """Return the curve through the handbook's points, each converted from R = 0 by the criterion.

    Parameters
    ----------
    fractions : Fractions
        Peak stress at R = 0 as fractions p of the tensile strength.
    Sut, Ssu, Ssy : float
        Tensile strength, ultimate and yield strength in shear, Pa.

    Raises
    ------
    CriterionError
        The criterion has no value at one of the points, or the converted points do not fall.

    Notes
    -----
    A peak p Sut at R = 0 is tau_a = tau_m = p Sut/2.
    """
    half = np.asarray(fractions.fractions) * Sut / 2
    S = criterion.reversed_strength(half, half, Ssu, Ssy)
    if not np.all(np.diff(S) < 0):
        raise CriterionError(f"{criterion.name}: the handbook's points do not fall with life once fully reversed")
    return LifeCurve(
        points=tuple(zip(fractions.cycles, (float(one) for one in S), strict=True)),
        label="the handbook's fractions of tensile strength",
        sources=(f"{fractions.source} ({fractions.provenance})",),
        valid_from=data()["two_point"]["start"]["cycles"],
        valid_to=fractions.cycles[-1],
    )


def endurance_curve(
    basis: str | Path,
    criterion: Criterion,
    *,
    shot_peened: bool,
    family: str | None,
    Sut: float,
    Ssu: float,
    Ssy: float,
    f: float | None = None,
    knee: float | None = None,
) -> LifeCurve:
    """Return the life curve of a wire from an endurance basis, as a criterion reads it.

    Parameters
    ----------
    basis : str or Path
        "zimmerli", "handbook", or the path of a curve file (.toml).
    shot_peened : bool
        Which half of the basis applies.
    family : str or None
        The handbook's family of the wire.
    Sut, Ssu, Ssy : float
        Tensile strength, ultimate and yield strength in shear, Pa.
    f, knee : float, optional
        Of the two-point curve on Zimmerli's pair; None takes data/endurance.toml's.

    Raises
    ------
    CriterionError
        The criterion has no usable strength from this basis.
    InputError
        The basis is not known, or has no data for this wire.
    """
    if basis == "zimmerli":
        return _zimmerli_curve(criterion, shot_peened, Ssu, Ssy, f, knee)
    if basis == "handbook":
        return handbook_curve(criterion, handbook(family, shot_peened), Sut, Ssu, Ssy)
    if not str(basis).endswith(".toml"):
        raise InputError(
            f"endurance {str(basis)!r} is not known; {nearest(str(basis), BASES)}, or a curve file (.toml)"
        )
    return read_curve(basis).curve(criterion, shot_peened)


def _zimmerli_curve(
    criterion: Criterion, shot_peened: bool, Ssu: float, Ssy: float, f: float | None, knee: float | None
) -> LifeCurve:
    pair = zimmerli(shot_peened)
    Sse = float(criterion.reversed_strength(pair.Ssa, pair.Ssm, Ssu, Ssy))
    try:
        curve = two_point(Sse, Ssu, f, knee)
    except CriterionError as error:
        peening = "peened" if shot_peened else "unpeened"
        raise CriterionError(f"{criterion.name} on zimmerli {peening}: {error}; choose another criterion") from error
    zimmerli_source = f"{pair.source} ({pair.provenance})"
    return LifeCurve(curve.points, curve.label, (zimmerli_source, *curve.sources), curve.valid_from, curve.valid_to)


@dataclass(frozen=True)
class CurveGroup:
    """One curve of a curve file; ``shot_peened`` None serves both."""

    name: str
    shot_peened: bool | None
    life: LifeCurve


@dataclass(frozen=True)
class CurveFile:
    """Life curves of own tests, fully reversed by ``criterion``."""

    path: Path
    title: str
    source: str
    criterion: str
    groups: tuple[CurveGroup, ...]

    def curve(self, criterion: Criterion, shot_peened: bool) -> LifeCurve:
        """Return the curve of peened or unpeened springs.

        Raises
        ------
        CriterionError
            The file's amplitudes were made fully reversed by another criterion.
        InputError
            No group, or more than one, is of such springs.
        """
        if criterion.name != self.criterion:
            raise CriterionError(
                f"{self.path}: its amplitudes are made fully reversed by {self.criterion}, "
                f"so {criterion.name} has no value; judge by {self.criterion}"
            )
        fitting = [group for group in self.groups if group.shot_peened in (None, shot_peened)]
        if len(fitting) != 1:
            peening = "true" if shot_peened else "false"
            raise InputError(f"{self.path}: {len(fitting)} groups are for shot_peened = {peening}; exactly one must be")
        return fitting[0].life


def read_curve(path: str | Path) -> CurveFile:
    """Read a curve file: TOML with ``format``, ``title``, ``source``, ``criterion`` and ``[[group]]`` tables.

    A group has either ``points``, a list of ``{cycles, amplitude}``, or ``line``, one table
    ``{slope, cycles, amplitude}`` for N = cycles (S/amplitude)^-slope. ``tested`` = ``{shortest, longest}``
    gives the lives that tests reached; a line ends there, its knee at the longest. ``shot_peened`` says which
    springs a group is for, ``scatter`` the standard deviation of log10 N.

    Raises
    ------
    FileError, InputError
        Named by file and key, with the value seen and what would be right.
    """
    path = Path(path)
    try:
        text = path.read_text(encoding="utf-8-sig")
    except FileNotFoundError as error:
        raise FileError(f"{path}: there is no such curve file; check the path") from error
    except OSError as error:
        raise FileError(f"{path}: cannot be read ({error.strerror}); name a curve file") from error
    except UnicodeDecodeError as error:
        raise InputError(f"{path}: not valid TOML: {error}") from error
    raw = parse_toml(text, str(path))
    top = Table(raw, f"{path}: ")
    top.only("format", "title", "source", "criterion", "reliability", "confidence", "group")
    if top.whole("format") != FORMAT:
        raise InputError(f"{path}: format is {raw['format']}; this version reads format = {FORMAT}")
    name = top.text("criterion")
    if name not in CRITERIA:
        raise InputError(f"{path}: criterion {name!r} is not known; {nearest(name, CRITERIA)}")
    return CurveFile(
        path=path,
        title=top.text("title"),
        source=top.text("source"),
        criterion=name,
        groups=tuple(_group(group, path, top) for group in top.tables("group")),
    )


def _group(table: Table, path: Path, top: Table) -> CurveGroup:
    table.only("name", "shot_peened", "scatter", "points", "line", "tested")
    if ("points" in table.raw) == ("line" in table.raw):
        raise InputError(f"{table.where}give exactly one of points and line")
    if "points" in table.raw:
        given = table.tables("points")
        if len(given) > MOST_POINTS:
            raise InputError(f"{table.where}points has {len(given)} points; at most {MOST_POINTS} make a curve")
        for point in given:
            point.only("cycles", "amplitude")
        points = tuple((point.positive("cycles"), point.quantity("amplitude", "stress")) for point in given)
        first, last = points[0][0], points[-1][0]
        if "tested" in table.raw:
            first, last = _tested(table)
    else:
        first, last = _tested(table)
        line = table.table("line")
        line.only("slope", "cycles", "amplitude")
        k, N, S = line.positive("slope"), line.positive("cycles"), line.quantity("amplitude", "stress")
        points = tuple((life, S * (N / life) ** (1 / k)) for life in (first, last))
    peened = table.flag("shot_peened") if "shot_peened" in table.raw else None
    name = table.text("name")
    life = LifeCurve(
        points=points,
        label=f"{path.name}, {name}",
        sources=(top.text("source"),),
        valid_from=first,
        valid_to=last,
        reliability=top.share("reliability") if "reliability" in top.raw else None,
        confidence=top.share("confidence") if "confidence" in top.raw else None,
        scatter=table.positive("scatter") if "scatter" in table.raw else None,
    )
    return CurveGroup(name, peened, life)


def _tested(table: Table) -> tuple[float, float]:
    tested = table.table("tested")
    tested.only("shortest", "longest")
    shortest, longest = tested.positive("shortest"), tested.positive("longest")
    if not shortest < longest:
        raise InputError(f"{tested.where}shortest {shortest:g} must be less than longest {longest:g}")
    return shortest, longest
