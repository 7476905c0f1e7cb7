"""An independent, slow calculation of a case's damage a pass: pure Python, no import from the package.

Written from the published methods (ASTM E1049-85 5.4.5 for the recurring pass, Shigley's formulas, Zimmerli's
pairs, Miner's sum) so that the package can be held against something it did not make. It knows only what the
demo cases use.
"""

from __future__ import annotations

import csv
import math
import tomllib
from pathlib import Path

INCH, PSI, LBF = 0.0254, 6894.757293168361, 4.4482216152605
UNIT = {"mm": 1e-3, "in": INCH}
# ASTM grade: A in kpsi in^m, exponent m, G in Mpsi
WIRE = {"A232": (169.0, 0.168, 11.2), "A228": (201.0, 0.145, 11.75)}
ZIMMERLI = {False: (35.0, 55.0), True: (57.5, 77.5)}  # peened: Ssa, Ssm in kpsi


def length(text: str) -> float:
    number, unit = text.split()
    return float(number) * UNIT[unit]


def samples(folder: Path, event: dict) -> list[float]:
    """Deflections of a record in m: second column, decimal comma, header and units row."""
    with (folder / event["record"]).open(encoding="utf-8-sig") as file:
        rows = list(csv.reader(file, delimiter=";"))[2:]
    installed = length(event["installed_deflection"])
    return [float(row[1].replace(",", ".")) * 1e-3 + installed for row in rows]


def turning_points(series: list[float]) -> list[float]:
    points: list[float] = []
    for value in series:
        if points and value == points[-1]:
            continue
        if len(points) > 1 and (points[-1] - points[-2]) * (value - points[-1]) > 0:
            points[-1] = value
        else:
            points.append(value)
    return points


def recurring_cycles(series: list[float]) -> dict[tuple[float, float], int]:
    """ASTM E1049-85 5.4.5: start at the highest point, return to it; every cycle closes."""
    top = series.index(max(series))
    points = turning_points([*series[top:], *series[:top], series[top]])
    cycles: dict[tuple[float, float], int] = {}
    stack: list[float] = []
    for point in points:
        stack.append(point)
        while len(stack) >= 3 and abs(stack[-1] - stack[-2]) >= abs(stack[-2] - stack[-3]):
            pair = (min(stack[-2], stack[-3]), max(stack[-2], stack[-3]))
            if pair[0] != pair[1]:
                cycles[pair] = cycles.get(pair, 0) + 1
            del stack[-3:-1]
    assert len(stack) == 1
    return cycles


def damage_per_pass(case_file: Path, peened: bool | None = None) -> float:
    """Miner's sum of one recurring pass: Gerber, Zimmerli, two-point curve, Haibach's second slope."""
    case = tomllib.loads(case_file.read_text())
    spring = case["spring"]
    d = length(spring["wire_diameter"])
    D = length(spring["mean_diameter"]) if "mean_diameter" in spring else length(spring["outer_diameter"]) - d
    A, m, G = WIRE[spring["grade"]]
    Sut = A * 1000 * PSI / (d / INCH) ** m
    Na = spring["total_coils"] - 2
    rate = d**4 * G * 1e6 * PSI / (8 * D**3 * Na)
    solid = length(spring["free_length"]) - d * spring["total_coils"]
    C = D / d
    stress_per_metre = (4 * C + 2) / (4 * C - 3) * 8 * rate * D / (math.pi * d**3)

    Ssu = 0.67 * Sut
    is_peened = spring["shot_peened"] if peened is None else peened
    Ssa, Ssm = (value * 1000 * PSI for value in ZIMMERLI[is_peened])
    Sse = Ssa / (1 - (Ssm / Ssu) ** 2)
    k = math.log(1e7 / 1e3) / math.log(0.9 * Ssu / Sse)

    series: list[float] = []
    for event in case["duty"]["event"]:
        if "blocks" in event:
            once = [
                end
                for block in event["blocks"]
                for end in [length(block["low"]), length(block["high"])] * block["cycles"]
            ]
        else:
            once = turning_points(samples(case_file.parent, event))
        series += once * event.get("repeats", 1)

    total = 0.0
    for (low, high), number in recurring_cycles(series).items():
        low, high = min(max(low, 0.0), solid), min(max(high, 0.0), solid)
        tau_a, tau_m = stress_per_metre * (high - low) / 2, stress_per_metre * (high + low) / 2
        reversed_amplitude = tau_a / (1 - (tau_m / Ssu) ** 2)
        slope = k if reversed_amplitude >= Sse else 2 * k - 1
        total += number / (1e7 * (reversed_amplitude / Sse) ** -slope)
    return total
