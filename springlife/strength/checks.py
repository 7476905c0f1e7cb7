"""What the strength room answers to published checks: inputs as written in data/published, SI values out."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import Any

from springlife.strength.criteria import CRITERIA
from springlife.strength.endurance import handbook, zimmerli
from springlife.units import parse

Inputs = Mapping[str, Any]


def _strengths(inputs: Inputs) -> tuple[float, float]:
    """Return Ssu and Ssy; without an Ssy, Ssu stands in for it and no elliptic answer is asked."""
    Ssu = parse(inputs["Ssu"], "stress")
    return Ssu, parse(inputs.get("Ssy", inputs["Ssu"]), "stress")


def _load_line(inputs: Inputs) -> dict[str, float]:
    """Zimmerli's pair, fully reversed; then the factor and the amplitude along tau_a/tau_m."""
    pair = zimmerli(inputs["shot_peened"])
    tau_a, tau_m = parse(inputs["tau_a"], "stress"), parse(inputs["tau_m"], "stress")
    Ssu, Ssy = _strengths(inputs)
    answers: dict[str, float] = {}
    for name, rule in CRITERIA.items():
        Sse = rule.reversed_strength(pair.Ssa, pair.Ssm, Ssu, Ssy)
        factor = float(rule.safety_factor(tau_a, tau_m, Sse, Ssu, Ssy))
        answers |= {f"{name}_Sse": float(Sse), f"{name}_Ssa": factor * tau_a, f"{name}_nf": factor}
    return answers


def _reversed_strengths(inputs: Inputs) -> dict[str, float]:
    """Zimmerli's pair, fully reversed by every criterion."""
    pair = zimmerli(inputs["shot_peened"])
    return {
        name: float(rule.reversed_strength(pair.Ssa, pair.Ssm, *_strengths(inputs))) for name, rule in CRITERIA.items()
    }


def _design_amplitude(inputs: Inputs) -> dict[str, float]:
    """Zimmerli's amplitude by Sines, divided by the design factor."""
    pair = zimmerli(inputs["shot_peened"])
    Ssu, Ssy = _strengths(inputs)
    return {"amplitude": float(CRITERIA["sines"].allowable(pair.Ssm, pair.Ssa, Ssu, Ssy)) / inputs["factor"]}


def _peak_at_zero_minimum(inputs: Inputs) -> dict[str, float]:
    """Greatest peak at R = 0 for endless life: the handbook's, and each criterion's on Zimmerli's pair."""
    pair = zimmerli(inputs["shot_peened"])
    Ssu, Ssy = _strengths(inputs)
    peaks = {
        "handbook": handbook(inputs["family"], inputs["shot_peened"]).fractions[-1] * parse(inputs["Sut"], "stress")
    }
    for name, rule in CRITERIA.items():
        Sse = rule.reversed_strength(pair.Ssa, pair.Ssm, Ssu, Ssy)
        peaks[name] = 2 * Ssu * float(rule.safety_factor(Ssu, Ssu, Sse, Ssu, Ssy))
    return peaks


def _basquin(inputs: Inputs) -> dict[str, float]:
    """A line through complete data: intercept, slope and unbiased variance; amplitudes in any one unit."""
    from springlife.strength.fit import fit_tests

    amplitude, cycles = inputs["amplitude"], inputs["cycles"]
    n = len(cycles)
    rule = CRITERIA["sines"]
    (line,) = fit_tests(amplitude, [0.0] * n, cycles, [True] * n, criterion=rule, Ssu=1.0, Ssy=1.0).lines
    return {"A": line.A, "B": line.B, "variance": line.s**2 * n / (n - 2)}


def _tolerance_factor(inputs: Inputs) -> dict[str, float]:
    """One-sided normal tolerance factor of a sample of n."""
    from springlife.strength.line import tolerance_factor

    n = inputs["n"]
    return {"k": tolerance_factor(inputs["reliability"], inputs["confidence"], n - 1, 1 / n)}


METHODS: dict[str, Callable[[Inputs], dict[str, float]]] = {
    "fatigue factor on the load line": _load_line,
    "fully reversed strength": _reversed_strengths,
    "design amplitude": _design_amplitude,
    "peak stress at R = 0": _peak_at_zero_minimum,
    "line through complete tests": _basquin,
    "one-sided tolerance factor": _tolerance_factor,
}
