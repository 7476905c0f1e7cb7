"""An assessment as plain data for JSON: SI values under keys that name the unit."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any

from springlife import __version__

if TYPE_CHECKING:
    from springlife.life.assess import Assessment, Judgement
    from springlife.spring.helical import HelicalSpring


def as_dict(assessment: Assessment) -> dict[str, Any]:
    """Return the assessment's JSON object; infinite numbers become null."""
    case, judgement = assessment.case, assessment.judgement
    life, unit = assessment.life
    number, target_unit = assessment.target
    data: dict[str, Any] = {
        "version": __version__,
        "title": case.input.title,
        "verdict": assessment.verdict,
        "target": {"value": number, "unit": target_unit},
        "target_passes": case.duty.target_passes,
        "one_pass": case.duty.one_pass,
        "allowed_damage": case.judge.allowed_damage,
        "life": {"value": life, "unit": unit},
    }
    data |= _numbers(judgement) if judgement else _NO_NUMBERS
    data |= {
        "band_moved_most_by": assessment.mover.sentence() if assessment.mover else None,
        "reliability": assessment.reliability,
        "judged_by": case.judge.model_dump(),
        "limits_changed": dict(case.input.limits),
        "findings": [finding.to_dict() for finding in assessment.findings],
        "records": _records(assessment),
        "sources": list(assessment.sources),
        "inputs": [{"path": name, "sha256": digest} for name, digest in assessment.inputs],
    }
    return data


_NO_NUMBERS: dict[str, Any] = {
    "damage_per_pass": None,
    "damage_at_target": None,
    "life_passes": None,
    "life_extrapolated": None,
    "stress_margin": None,
    "margin_governed_by": None,
    "spring": None,
    "events": [],
    "worst_cycle": None,
    "safety_factors": None,
    "safety_factors_fixed_preload": None,
    "curve": None,
    "band": [],
}


def _numbers(j: Judgement) -> dict[str, Any]:
    return {
        "damage_per_pass": finite(j.damage_per_pass),
        "damage_at_target": finite(j.damage_at_target),
        "life_passes": j.life_passes,
        "life_extrapolated": j.extrapolated,
        "stress_margin": j.stress_margin,
        "margin_governed_by": j.margin_governed_by,
        "spring": spring_facts(j.spring) | {"Sse_Pa": j.model.curve.strength_at_knee},
        "events": [
            {
                "name": event.name,
                "repeats": event.repeats,
                "cycles": event.cycles,
                "damage": finite(event.damage),
                "share": event.share,
            }
            for event in j.events
        ],
        "worst_cycle": None
        if j.worst is None
        else {
            "low_m": j.worst.low,
            "high_m": j.worst.high,
            "tau_a_Pa": j.worst.tau_a,
            "tau_m_Pa": j.worst.tau_m,
            "cycles_to_failure": finite(j.worst.cycles_to_failure),
            "count_per_pass": j.worst.count,
            "share": j.worst.share,
            "events": list(j.worst.events),
        },
        "safety_factors": j.safety_factors,
        "safety_factors_fixed_preload": j.factors_fixed_preload,
        "curve": {"label": j.model.curve.label, "slope": j.model.curve.slope, "knee": j.model.curve.knee},
        "band": [
            {
                "criterion": row.criterion,
                "endurance": row.endurance,
                "miner": row.miner,
                "life_passes": row.life_passes,
                "withheld": row.withheld,
            }
            for row in j.band
        ],
    }


def spring_facts(spring: HelicalSpring) -> dict[str, Any]:
    """Return the part's own numbers."""
    return {
        "grade": spring.grade.name,
        "index": spring.index,
        "rate_N_per_m": spring.rate,
        "calculated_rate_N_per_m": spring.calculated_rate,
        "active_coils": spring.active_coils,
        "solid_length_m": spring.solid_length,
        "solid_deflection_m": spring.solid_deflection,
        "solid_force_N": spring.solid_force,
        "mass_kg": spring.mass,
        "surge_frequency_Hz": spring.surge_frequency,
        "buckling_deflection_m": spring.buckling_deflection,
        "E_Pa": spring.E,
        "G_Pa": spring.G,
        "Sut_Pa": spring.Sut,
        "Ssu_Pa": spring.Ssu,
        "Ssy_Pa": spring.Ssy,
        "static_limit_Pa": spring.static_limit,
    }


def _records(assessment: Assessment) -> list[dict[str, Any]]:
    if assessment.duty is None:
        return []
    return [
        {
            "event": event.name,
            "path": event.record,
            "sha256": event.sha256,
            "counted_exactly": event.count.exact,
            "cell_size": event.count.cell or None,
            "summary": event.summary.to_dict() if event.summary else None,
            "provenance": list(event.provenance),
        }
        for event in assessment.duty.events
        if event.record is not None
    ]


def finite(value: float) -> float | None:
    """JSON has no infinity: an infinite damage or life is null."""
    return value if math.isfinite(value) else None
