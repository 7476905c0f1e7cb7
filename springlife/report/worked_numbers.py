"""The formulas of a judgement with the numbers of the case in them: computed here, typed nowhere."""

from __future__ import annotations

import math
from collections.abc import Iterator
from typing import TYPE_CHECKING

from springlife.report.blocks import Worked, worked
from springlife.spring.helical import ENDS, SSU_OVER_SUT, SUPPORTS, buckling_constant
from springlife.spring.stress import FACTORS, direct_shear
from springlife.strength import endurance

if TYPE_CHECKING:
    from springlife.life.assess import Assessment, Judgement

Values = dict[str, tuple[float, str]]
SHIGLEY = "Shigley's Mechanical Engineering Design"
FACTOR_FORMULAS = {
    "bergstraesser": ("K_B", "(4·C + 2) / (4·C − 3)", f"Bergstraesser's factor; {SHIGLEY}, eq. 10-5 (memory)"),
    "wahl": ("K_W", "(4·C − 1) / (4·C − 4) + 0.615/C", f"Wahl, Mechanical Springs; {SHIGLEY}, eq. 10-4 (memory)"),
}
# The amplitude that harms as much without a mean, by criterion.
EQUIVALENT = {
    "goodman": "τ_a / (1 − τ_m/S_su)",
    "gerber": "τ_a / (1 − (τ_m/S_su)^2)",
    "asme-elliptic": "τ_a / √(1 − (τ_m/S_sy)^2)",
    "sines": "τ_a",
}


def of_geometry(result: Assessment, j: Judgement) -> Iterator[Worked]:
    """Yield index, solid length and deflection."""
    say, s = result.say, j.spring
    values: Values = {
        "D": (s.mean_diameter, "length"),
        "d": (s.wire_diameter, "length"),
        "N_t": (s.total_coils, "number"),
        "n_e": (ENDS[s.ends]["inactive"], "number"),
        "n_s": (ENDS[s.ends]["solid_wires"], "number"),
        "L_0": (s.free_length, "length"),
        "L_s": (s.solid_length, "length"),
    }
    table = f"{SHIGLEY}, table 10-1 (memory)"
    yield worked("Spring index", "C", "D/d", values, (s.index, "number"), f"{SHIGLEY}, ch. 10 (memory)", say)
    yield worked(f"Active coils, ends {s.ends}", "N_a", "N_t − n_e", values, (s.active_coils, "number"), table, say)
    yield worked("Solid length", "L_s", "d·(N_t + n_s)", values, (s.solid_length, "length"), table, say)
    yield worked("Deflection to solid", "y_s", "L_0 − L_s", values, (s.solid_deflection, "length"), "definition", say)


def of_behaviour(result: Assessment, j: Judgement) -> Iterator[Worked]:
    """Yield buckling and surge."""
    say, s = result.say, j.spring
    slenderness = SUPPORTS[s.supports] * s.free_length / s.mean_diameter
    values: Values = {
        "α": (SUPPORTS[s.supports], "number"),
        "L_0": (s.free_length, "length"),
        "D": (s.mean_diameter, "length"),
        "λ": (slenderness, "number"),
        "E": (s.E, "stress"),
        "G": (s.G, "stress"),
        "c": (buckling_constant(s.E, s.G), "number"),
        "k": (s.rate, "rate"),
        "m": (s.active_mass, "mass"),
    }
    source = f"{SHIGLEY}, eq. 10-10 to 10-13 and table 10-2 (memory)"
    yield worked(f"Slenderness, ends {s.supports}", "λ", "α·L_0/D", values, (slenderness, "number"), source, say)
    formula = "π·√(2·(E − G) / (2·G + E))"
    yield worked("Slenderness without buckling", "c", formula, values, values["c"], source, say)
    if s.buckling_deflection is not None:
        formula = "L_0·E / (2·(E − G))·(1 − √(1 − (c/λ)^2))"
        result_is = (s.buckling_deflection, "length")
        yield worked("Deflection at which it buckles", "y_cr", formula, values, result_is, source, say)
    source = f"{SHIGLEY}, eq. 10-25, between plates, m the active mass (memory)"
    yield worked("Surge frequency", "f_1", "0.5·√(k/m)", values, (s.surge_frequency, "frequency"), source, say)


def of_load(result: Assessment, j: Judgement) -> Iterator[Worked]:
    """Yield rate, stress factors and the stresses of the worst cycle."""
    say, s, judge = result.say, j.spring, result.case.judge
    values: Values = {
        "D": (s.mean_diameter, "length"),
        "d": (s.wire_diameter, "length"),
        "G": (s.G, "stress"),
        "N_a": (s.active_coils, "number"),
        "C": (s.index, "number"),
        "k": (s.rate, "rate"),
    }
    rate = (s.calculated_rate, "rate")
    yield worked("Spring rate", "k", "d^4·G / (8·D^3·N_a)", values, rate, f"{SHIGLEY}, eq. 10-9 (memory)", say)
    name, formula, source = FACTOR_FORMULAS[judge.stress_factor]
    K, Ks = FACTORS[judge.stress_factor](s.index), direct_shear(s.index)
    yield worked("Stress factor", name, formula, values, (K, "number"), source, say)
    if judge.curvature_on != "both" or s.set_removed:
        source = f"{SHIGLEY}, ch. 10 (memory)"
        yield worked("Direct-shear factor", "K_s", "1 + 0.5/C", values, (Ks, "number"), source, say)
    if j.worst is None:
        return
    low, high = (min(max(y, 0.0), s.solid_deflection) for y in (j.worst.low, j.worst.high))
    values |= {
        name: (K, "number"),
        "K_s": (Ks, "number"),
        "y_1": (low, "length"),
        "y_2": (high, "length"),
        "F_1": (float(s.force(low)), "force"),
        "F_2": (float(s.force(high)), "force"),
    }
    for end, words in (("1", "least"), ("2", "greatest")):
        force = values[f"F_{end}"]
        yield worked(f"Worst cycle, {words} force", f"F_{end}", f"k·y_{end}", values, force, "linear spring", say)
    source = f"{SHIGLEY}, ch. 10 (memory)"
    formula = f"{name}·8·D·(F_2 − F_1) / (2·π·d^3)"
    yield worked("Worst cycle, amplitude", "τ_a", formula, values, (j.worst.tau_a, "stress"), source, say)
    mean = name if judge.curvature_on == "both" else "K_s"
    formula = f"{mean}·8·D·(F_2 + F_1) / (2·π·d^3)"
    yield worked("Worst cycle, mean", "τ_m", formula, values, (j.worst.tau_m, "stress"), source, say)


def of_strength(result: Assessment, j: Judgement) -> Iterator[Worked]:
    """Yield the wire's strengths and the endurance data made fully reversed."""
    say, s = result.say, j.spring
    fraction = s.static_limit / s.Sut
    values: Values = {
        "d": (s.wire_diameter, "length"),
        "S_ut": (s.Sut, "stress"),
        "S_su": (s.Ssu, "stress"),
        "S_sy": (s.Ssy, "stress"),
        "f_u": (SSU_OVER_SUT, "number"),
        "f_y": (s.Ssy / s.Sut, "number"),
        "f_s": (fraction, "number"),
    }
    segment = None if s.tensile_strength else next((t for t in s.grade.tensile if s.wire_diameter <= t.high), None)
    if segment is not None and segment.m:
        values |= {"A": (segment.A, "stress"), "d_0": (segment.at, "length"), "m": (segment.m, "number")}
        source = f"{s.grade.title}; {s.grade.sources[0]}"
        yield worked("Tensile strength", "S_ut", "A·(d_0/d)^(m)", values, (s.Sut, "stress"), source, say)
    source = f"{SHIGLEY}, eq. 10-30 (memory)"
    yield worked("Ultimate strength in shear", "S_su", "f_u·S_ut", values, (s.Ssu, "stress"), source, say)
    source = f"{SHIGLEY}, table 10-6 (memory)"
    yield worked("Yield strength in shear", "S_sy", "f_y·S_ut", values, (s.Ssy, "stress"), source, say)
    if s.set_removed:
        words = "Static limit after set removal"
        yield worked(words, "S_lim", "f_s·S_ut", values, (s.static_limit, "stress"), source, say)
    yield from _reversed(result, j, values)


def _reversed(result: Assessment, j: Judgement, values: Values) -> Iterator[Worked]:
    """Yield the endurance strength made fully reversed, and the slope of the life curve."""
    say, judge, curve = result.say, result.case.judge, j.model.curve
    source = f"{judge.criterion} through the endurance data; {SHIGLEY}, ch. 6 and sec. 10-9 (memory)"
    formula = EQUIVALENT[judge.criterion].replace("τ_a", "S_sa").replace("τ_m", "S_sm")
    knee = (curve.strength_at_knee, "stress")
    if judge.endurance == "zimmerli":
        pair = endurance.zimmerli(j.spring.shot_peened)
        values = values | {"S_sa": (pair.Ssa, "stress"), "S_sm": (pair.Ssm, "stress")}
        yield worked("Endurance strength, fully reversed", "S_se", formula, values, knee, source, say)
    elif judge.endurance == "handbook":
        p = endurance.handbook(j.spring.grade.cyclic_family, j.spring.shot_peened).fractions[-1]
        half = p * j.spring.Sut / 2
        values = values | {"p": (p, "number"), "S_sa": (half, "stress"), "S_sm": (half, "stress")}
        at_zero = "the peak p S_ut at R = 0 is amplitude and mean alike"
        yield worked("Handbook amplitude", "S_sa", "p·S_ut/2", values, (half, "stress"), at_zero, say)
        yield worked("Endurance strength, fully reversed", "S_se", formula, values, knee, source, say)
    (N1, S1), (N2, S2) = curve.points[-2:]
    ends: Values = {
        "N_1": (N1, "number"), "N_2": (N2, "number"), "S_1": (S1, "stress"), "S_2": (S2, "stress"),
    }  # fmt: skip
    words = "straight in log-log between points of the life curve"
    yield worked("Slope of the life curve", "k", "ln(N_2/N_1) / ln(S_1/S_2)", ends, (curve.slope, "number"), words, say)


def of_damage(result: Assessment, j: Judgement) -> Iterator[Worked]:
    """Yield the worst cycle's life and damage, and the life of the spring in passes."""
    say, judge, model = result.say, result.case.judge, j.model
    if j.worst is None or not math.isfinite(j.damage_per_pass):
        return
    amplitude = float(model.criterion.equivalent(j.worst.tau_a, j.worst.tau_m, model.Ssu, model.Ssy))
    values: Values = {
        "τ_a": (j.worst.tau_a, "stress"),
        "τ_m": (j.worst.tau_m, "stress"),
        "S_su": (model.Ssu, "stress"),
        "S_sy": (model.Ssy, "stress"),
        "τ_ar": (amplitude, "stress"),
        "n": (j.worst.count, "number"),
        "N": (j.worst.cycles_to_failure, "number"),
        "D_1": (j.damage_per_pass, "number"),
        "D_all": (judge.allowed_damage, "number"),
        "P": (result.case.duty.target_passes, "number"),
    }
    source = f"{judge.criterion}; {SHIGLEY}, ch. 6 (memory)"
    words = "Worst cycle, fully reversed amplitude"
    yield worked(words, "τ_ar", EQUIVALENT[judge.criterion], values, (amplitude, "stress"), source, say)
    if not 0 < j.worst.cycles_to_failure < math.inf:
        return
    yield _life_of_worst(result, j, amplitude, values)
    harm = j.worst.count / j.worst.cycles_to_failure
    miner = "Miner's rule (Palmgren 1924, Miner 1945)"
    yield worked("Worst cycle, damage a pass", "D_i", "n/N", values, (harm, "number"), miner, say)
    if judge.residue == "repeat" and j.life_passes is not None:
        at_target = (j.damage_at_target, "number")
        yield worked("Damage at the target", "D", "P·D_1", values, at_target, "passes times damage a pass", say)
        life = (j.life_passes, "number")
        yield worked("Life in passes", "L", "D_all/D_1", values, life, "damage reaches the allowed sum", say)


def _life_of_worst(result: Assessment, j: Judgement, amplitude: float, values: Values) -> Worked:
    """Return the worst cycle's cycles to failure, from the piece of the life curve that holds it."""
    curve, miner = j.model.curve, j.model.miner
    points = curve.points
    past = amplitude < curve.strength_at_knee
    piece = next((i for i in range(1, len(points)) if amplitude >= points[i][1]), len(points) - 1)
    (N1, S1), (N2, S2) = points[piece - 1], points[piece]
    k = math.log(N2 / N1) / math.log(S1 / S2)
    exponent = "2·k − 1" if past and miner == "haibach" else "k"
    values = values | {"N_2": (N2, "number"), "S_2": (S2, "stress"), "k": (k, "number")}
    if past:
        words = "E. Haibach, Betriebsfestigkeit: slope 2k − 1 past the knee (memory)"
        source = words if miner == "haibach" else "elementary Miner: the slope goes on past the knee"
    else:
        source = "straight in log-log between points of the life curve"
    formula = f"N_2·(S_2/τ_ar)^({exponent})"
    return worked("Worst cycle, cycles to failure", "N", formula, values, values["N"], source, result.say)
