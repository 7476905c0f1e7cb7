"""A constant-amplitude rig test with the damage of the duty to its target, under the same model.

References
----------
Equal Miner damage (A. Palmgren, 1924; M. A. Miner, 1945); success-run sample size n = ln(1 - C)/ln R and its form
with a Weibull life factor, n = ln(1 - C)/(L^beta ln R) (standard texts on reliability demonstration; memory).
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

import numpy as np

from springlife.errors import InputError
from springlife.life.assess import Assessment, Judgement, assess, model_of
from springlife.life.band import BandRow
from springlife.life.case import Case
from springlife.life.damage import DamageModel
from springlife.life.findings import Finding, found, settle
from springlife.life.limits import limit_values
from springlife.units import significant

MOST_SPRINGS = 1e6  # of one test; more is a number typed wrong


@dataclass(frozen=True)
class RigTest:
    """The test: deflection limits ``low``, ``high`` (m), ``cycles`` (whole), and what stands against it.

    ``spread`` holds the cycles under every published choice; ``findings`` with a stop mean that it must not be run.
    """

    assessment: Assessment
    low: float
    high: float
    exact_cycles: float
    frequency: float
    springs: int
    reliability: float
    confidence: float
    life_factor: float
    weibull_slope: float
    spread: tuple[tuple[BandRow, float | None], ...]
    findings: tuple[Finding, ...]

    @property
    def judgement(self) -> Judgement:
        """The judgement that the test stands on."""
        assert self.assessment.judgement is not None  # rig() refuses a case that was not judged
        return self.assessment.judgement

    @property
    def cycles(self) -> int:
        """Cycles to run on each spring: the equal-damage number times the life factor, rounded to a whole number."""
        return round(self.exact_cycles * self.life_factor)

    @property
    def hours(self) -> float:
        """Time on the rig at the frequency, h."""
        return self.cycles / self.frequency / 3600

    @property
    def stopped(self) -> bool:
        """Whether a stop speaks against the test."""
        return any(finding.blocks for finding in self.findings)

    def to_dict(self) -> dict[str, Any]:
        """Give the test for JSON."""
        tau_a, tau_m = self.judgement.model.stress.cycles(self.low, self.high)
        return {
            "title": self.assessment.case.input.title,
            "low_m": self.low,
            "high_m": self.high,
            "tau_a_Pa": float(tau_a),
            "tau_m_Pa": float(tau_m),
            "equal_damage_cycles": self.exact_cycles,
            "cycles": self.cycles,
            "damage": self.judgement.damage_at_target,
            "frequency_Hz": self.frequency,
            "hours": self.hours,
            "springs": self.springs,
            "reliability": self.reliability,
            "confidence": self.confidence,
            "life_factor": self.life_factor,
            "weibull_slope": self.weibull_slope,
            "spread": [
                {"criterion": row.criterion, "endurance": row.endurance, "miner": row.miner, "cycles": cycles}
                for row, cycles in self.spread
            ],
            "findings": [finding.to_dict() for finding in self.findings],
        }


def success_run(reliability: float, confidence: float, *, life_factor: float = 1.0, weibull_slope: float = 2.0) -> int:
    """Return how many springs must all survive to show a reliability with a confidence.

    Parameters
    ----------
    reliability, confidence : float
        R and C, between 0 and 1.
    life_factor : float
        L: each spring runs this many times the cycles.
    weibull_slope : float
        beta of the life distribution; only with a life factor other than 1 does it matter.

    Raises
    ------
    InputError
        A share outside 0 to 1, a factor or slope that is not above zero, or more springs than anybody tests.

    Notes
    -----
    n = ln(1 - C)/(L^beta ln R), rounded up.
    """
    for name, share in (("reliability", reliability), ("confidence", confidence)):
        if not 0 < share < 1:
            raise InputError(f"{name} is {share:g}; give a share between 0 and 1, such as 0.9")
    for name, value in (("life factor", life_factor), ("Weibull slope", weibull_slope)):
        if not 0 < value < math.inf:
            raise InputError(f"{name} is {value:g}; it must be above zero")
    once = math.log(1 - confidence) / math.log(reliability)
    power = weibull_slope * math.log(life_factor)
    if math.log(once) - power > math.log(MOST_SPRINGS):
        raise InputError(
            f"reliability {reliability:.12g} at confidence {confidence:.12g} with life factor {life_factor:g} and "
            f"Weibull slope {weibull_slope:g} takes more than {MOST_SPRINGS:g} springs; ask for less"
        )
    return max(1, math.ceil(once * math.exp(-power) - 1e-9))


def rig(
    case: Case | str | Path,
    *,
    low: float | None = None,
    high: float | None = None,
    frequency: float = 10.0,
    reliability: float = 0.9,
    confidence: float = 0.9,
    life_factor: float = 1.0,
    weibull_slope: float = 2.0,
) -> RigTest:
    """Propose a constant-amplitude test with the damage of the duty to its target.

    Parameters
    ----------
    low, high : float, optional
        Deflection limits, m; those of the duty's most damaging cycle by default.
    frequency : float
        Of the rig, Hz.
    reliability, confidence, life_factor, weibull_slope
        See :func:`success_run`.

    Raises
    ------
    FileError, InputError
        The case cannot be used or judged, the duty does no damage, or the limits do none.
    """
    springs = success_run(reliability, confidence, life_factor=life_factor, weibull_slope=weibull_slope)
    if not 0 < frequency < math.inf:
        raise InputError(f"rig frequency is {frequency:g} Hz; it must be above zero")
    result = assess(case)
    j = result.judgement
    if j is None or j.worst is None or result.duty is None:
        stops = "; ".join(finding.message for finding in result.findings if finding.level == "stop")
        raise InputError(f"{result.case.path}: no duty was judged, so no test can equal it: {stops or 'no cycle'}")
    if not 0 < j.damage_at_target < math.inf:
        raise InputError(
            f"{result.case.path}: the damage at the target is {j.damage_at_target:g}; no test can equal it"
        )
    low, high = j.worst.low if low is None else low, j.worst.high if high is None else high
    if not low < high:
        say = result.say
        raise InputError(
            f"rig limits {say(low, 'length')} and {say(high, 'length')} are no cycle; low must be below high"
        )
    exact = _cycles(j.model, low, high, j.damage_at_target)
    if not 0 < exact < math.inf:
        say = result.say
        raise InputError(
            f"rig limits {say(low, 'length')} to {say(high, 'length')} give {exact:g} cycles under the case's model; "
            "choose a cycle that does some damage and does not fail at once"
        )
    seen = _against(result, j, low, high, exact * life_factor, frequency)
    # A duty whose own judgement is withheld is no measure for a test.
    seen += [
        replace(finding, message=f"in the duty: {finding.message}") for finding in result.findings if finding.blocks
    ]
    return RigTest(
        result, low, high, exact, frequency, springs, reliability, confidence, life_factor, weibull_slope,
        _spread(result, j, low, high), settle(seen, result.case.input.waive),
    )  # fmt: skip


def _cycles(model: DamageModel, low: float, high: float, damage: float) -> float:
    """Return the cycles between two deflections that do a damage."""
    return damage * float(model.cycles_to_failure(np.array([low]), np.array([high]))[0])


def _spread(result: Assessment, j: Judgement, low: float, high: float) -> tuple[tuple[BandRow, float | None], ...]:
    """Return the equal-damage cycles under every choice of the band; None where duty or test do no damage."""
    assert result.duty is not None
    case = result.case
    table = result.duty.one_pass(j.spring).life(case.duty.target_passes, case.judge.residue)
    rows = []
    for row in j.band:
        if row.withheld is not None:
            continue
        model = model_of(case, j.spring, j.model.stress, by=row.criterion, basis=row.endurance, miner=row.miner)
        cycles = _cycles(model, low, high, float(model.damage(*table).sum()))
        rows.append((row, cycles if 0 < cycles < math.inf else None))
    return tuple(rows)


def _against(
    result: Assessment, j: Judgement, low: float, high: float, cycles: float, frequency: float
) -> list[Finding]:
    """List what speaks against the test: solid, lift-off, yield, the curve's range, surge on the rig."""
    say, limits, spring = result.say, limit_values(result.case.input.limits), j.spring
    seen = []
    if high > spring.solid_deflection:
        solid = say(spring.solid_deflection, "length")
        seen.append(found("past-solid", f"the test's deflection {say(high, 'length')} passes solid at {solid}"))
    if low < 0:
        seen.append(found("lift-off", f"the test lets the spring leave its seat at {say(low, 'length')}"))
    peak = float(j.model.stress.static(high))
    if peak > spring.static_limit:
        limit = say(spring.static_limit, "stress")
        seen.append(found("yields", f"the test's peak stress {say(peak, 'stress')} passes the static limit {limit}"))
    if cycles < j.model.curve.valid_from:
        message = (
            f"{significant(cycles, 3)} cycles are under {j.model.curve.valid_from:g}, where the curve is not valid"
        )
        seen.append(found("below-1e3", message))
    if cycles > j.model.curve.valid_to:
        message = (
            f"{significant(cycles, 3)} cycles are past the {j.model.curve.valid_to:g} of the endurance data; "
            "wider limits make a shorter test"
        )
        seen.append(found("endurance-scope", message))
    greatest = spring.surge_frequency / limits["surge_ratio"]
    if frequency > greatest:
        message = (
            f"rig frequency {significant(frequency, 3)} Hz is above {significant(greatest, 3)} Hz, "
            f"1/{limits['surge_ratio']:g} of the surge frequency"
        )
        seen.append(found("near-surge", message, "stop"))
    return seen
