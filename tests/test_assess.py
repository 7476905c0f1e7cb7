"""The whole judgement against an independent slow calculation, and the contract of its result."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest
import slow
from casefile import write_case
from test_findings import QUIET

from springlife.cli import main
from springlife.life.assess import Assessment, assess, judge
from springlife.life.case import load_case
from springlife.life.reading import read_duty

ROOT = Path(__file__).parent.parent
DEMOS = ["forwarder-seat", "dosing-pump"]


def demo(name: str) -> Path:
    return ROOT / "loadcases" / name / "case.toml"


@pytest.mark.parametrize("name", DEMOS)
@pytest.mark.parametrize("peened", [False, True])
def test_damage_equals_the_independent_slow_calculation(name: str, peened: bool) -> None:
    case = load_case(demo(name)).varied("variant", {"shot_peened": peened}, {}, "")
    result = assess(case)
    assert result.judgement is not None
    assert result.judgement.damage_per_pass == pytest.approx(slow.damage_per_pass(demo(name), peened), rel=1e-9)


def test_demo_verdicts_are_the_interesting_ones() -> None:
    case = load_case(demo("forwarder-seat"))
    drawn = assess(case)
    assert drawn.verdict == "meets"
    (unpeened,) = case.options()
    assert assess(unpeened).verdict == "falls short"


@pytest.mark.parametrize("name", DEMOS)
def test_events_share_the_whole(name: str) -> None:
    j = assess(demo(name)).judgement
    assert j is not None
    assert sum(event.damage for event in j.events) == pytest.approx(j.damage_per_pass, rel=1e-12)
    assert sum(event.share for event in j.events) == pytest.approx(1.0)
    assert sum(event.cycles for event in j.events) == pytest.approx(float(j.cycles.count.sum()))


def variant(folder: Path, *changes: tuple[str, str]) -> Assessment:
    text = QUIET
    for find, put in changes:
        assert find in text
        text = text.replace(find, put)
    return assess(write_case(folder, text, None))


def test_constant_amplitude_by_hand(tmp_path: Path) -> None:
    """Gerber and the two-point curve worked by hand for 5 to 20 mm; Shigley ch. 10 formulas."""
    j = variant(tmp_path).judgement
    assert j is not None
    psi = 6894.757293168361
    d, D, Na, G = 2e-3, 16e-3, 10.0, 11.75e6 * psi
    k = d**4 * G / (8 * D**3 * Na)
    C = D / d
    tau = (4 * C + 2) / (4 * C - 3) * 8 * k * D / (np.pi * d**3)
    tau_a, tau_m = tau * 7.5e-3, tau * 12.5e-3
    Ssu = 0.67 * 201e3 * psi / (d / 0.0254) ** 0.145
    Sse = 35e3 * psi / (1 - (55e3 * psi / Ssu) ** 2)
    b = np.log10(Sse / (0.9 * Ssu)) / 4
    tau_ar = tau_a / (1 - (tau_m / Ssu) ** 2)
    # Below the knee, Haibach: slope 2k - 1.
    N = 1e7 * (tau_ar / Sse) ** -(2 / -b - 1)
    assert tau_ar < Sse
    assert j.damage_per_pass == pytest.approx(100 / N, rel=1e-12)
    assert j.life_passes == pytest.approx(N / 100, rel=1e-12)
    assert j.safety_factors is not None
    assert j.safety_factors["goodman"] == pytest.approx(
        1 / (tau_a / (35e3 * psi / (1 - 55e3 * psi / Ssu)) + tau_m / Ssu), rel=1e-12
    )
    assert j.safety_factors["sines"] == pytest.approx(35e3 * psi / tau_a, rel=1e-12)


@pytest.mark.parametrize("miner", ["original", "elementary", "haibach"])
@pytest.mark.parametrize("residue", ["repeat", "half", "drop"])
def test_stress_margin_just_meets_the_target(miner: str, residue: str, tmp_path: Path) -> None:
    """At the margin the damage is the allowed sum (or the yield limit is reached); a hair above it fails."""
    result = variant(tmp_path, ("[judge]", f'[judge]\nminer = "{miner}"\nresidue = "{residue}"'), ("100 h", "20000 h"))
    j = result.judgement
    assert j is not None and j.stress_margin is not None
    case = result.case
    assert result.duty is not None
    table = result.duty.one_pass(j.spring).life(case.duty.target_passes, residue)  # type: ignore[arg-type]
    damage = [float(j.model.damage(*table, factor=j.stress_margin * x).sum()) for x in (1 - 1e-9, 1 + 1e-9)]
    if j.margin_governed_by == "yield":
        peak = float(j.model.stress.static(np.asarray(20e-3)))
        assert j.stress_margin * peak == pytest.approx(j.spring.static_limit)
        assert damage[0] <= 1.0
    else:
        assert damage[0] <= 1.0 <= damage[1]


@pytest.mark.parametrize("residue", ["repeat", "half", "drop"])
@pytest.mark.parametrize("name", DEMOS)
def test_life_is_where_the_damage_reaches_the_allowed_sum(name: str, residue: str) -> None:
    case = load_case(demo(name)).varied("half", {"shot_peened": False}, {"residue": residue}, "")
    j = assess(case).judgement
    assert j is not None and j.life_passes is not None
    duty = read_duty(case, j.spring)
    for passes in (np.floor(j.life_passes), j.life_passes):
        damage = float(j.model.damage(*duty.one_pass(j.spring).life(float(passes), residue)).sum())  # type: ignore[arg-type]
        assert damage == pytest.approx(1.0 - (j.life_passes - passes) * j.damage_per_pass, rel=1e-9)


def test_scaling_all_lengths_scales_rate_and_keeps_stress(tmp_path: Path) -> None:
    """Dimensions times s with the wire's strength held: k times s, stress at the same relative stroke equal."""
    strength = ("total_coils", 'tensile_strength = "1900 MPa"\ntotal_coils')
    one = variant(tmp_path, strength).judgement
    twice = variant(
        tmp_path, strength, ('"2.0 mm"', '"2.2 mm"'), ('"16 mm"', '"17.6 mm"'), ('"55 mm"', '"60.5 mm"'),
        ('"5 mm"', '"5.5 mm"'), ('"20 mm"', '"22 mm"'),
    ).judgement  # fmt: skip
    assert one is not None and twice is not None
    assert twice.spring.rate == pytest.approx(1.1 * one.spring.rate)
    assert twice.damage_per_pass == pytest.approx(one.damage_per_pass, rel=1e-9)


def test_no_motion_means_unlimited_life(tmp_path: Path) -> None:
    text = QUIET.replace(
        'blocks = [{ low = "5 mm", high = "20 mm", cycles = 100 }]',
        'record = "work.csv"\nchannel = "y"\nunit = "mm"',
    )
    result = assess(write_case(tmp_path, text, "y\n5\n5\n5\n"))
    assert result.verdict == "meets" and result.judgement is not None
    assert result.judgement.life_passes is None and result.judgement.worst is None
    assert result.to_dict()["life_passes"] is None


def test_judging_again_reads_nothing(tmp_path: Path) -> None:
    case = load_case(write_case(tmp_path))
    first = assess(case)
    assert first.duty is not None
    (tmp_path / "work.csv").unlink()
    again = judge(case, first.duty).judgement
    assert again is not None and first.judgement is not None
    assert again.damage_per_pass == first.judgement.damage_per_pass


def test_force_and_length_records_give_the_deflection_record_s_damage(tmp_path: Path) -> None:
    """The same motion told as deflection, length and force is the same duty."""
    text = QUIET.replace(
        'blocks = [{ low = "5 mm", high = "20 mm", cycles = 100 }]',
        'record = "work.csv"\nchannel = "y"\nUNIT',
    )
    y = np.array([5.0, 20, 8, 16, 4, 19, 5])
    rate = 4.0

    def damage(extra: str, samples: np.ndarray) -> float:
        body = text.replace("UNIT", extra).replace("total_coils", 'measured_rate = "4 N/mm"\ntotal_coils')
        record = "y\n" + "\n".join(map(str, samples)) + "\n"
        j = assess(write_case(tmp_path, body, record)).judgement
        assert j is not None
        return j.damage_per_pass

    expected = damage('unit = "mm"', y)
    assert damage('unit = "mm"\nmeasures = "length"', 55 - y) == pytest.approx(expected, rel=1e-9)
    assert damage('unit = "N"\nmeasures = "force"', rate * y) == pytest.approx(expected, rel=1e-9)
    travel = 'unit = "mm"\nmeasures = "travel"\ninstalled_deflection = "3 mm"'
    assert damage(travel, y - 3) == pytest.approx(expected, rel=1e-9)
    assert damage('unit = "mm"\ninvert = true', -y) == pytest.approx(expected, rel=1e-9)
    assert damage('unit = "mm"\nscale = 2.0\noffset = 1.0', (y - 1) / 2) == pytest.approx(expected, rel=1e-9)


KEYS = {
    "verdict", "damage_per_pass", "damage_at_target", "life_passes", "life", "target", "stress_margin", "spring",
    "events", "worst_cycle", "safety_factors", "band", "findings", "sources", "inputs", "version",
}  # fmt: skip
SPRING_KEYS = {
    "index", "rate_N_per_m", "active_coils", "solid_length_m", "solid_force_N", "mass_kg", "surge_frequency_Hz",
    "Sut_Pa", "Ssu_Pa", "Ssy_Pa", "Sse_Pa",
}  # fmt: skip


@pytest.mark.parametrize(("name", "code"), [("forwarder-seat", 0), ("dosing-pump", 0)])
def test_json_of_the_real_command(name: str, code: int, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["assess", str(demo(name)), "--json"]) == code
    data = json.loads(capsys.readouterr().out)
    assert data.keys() >= KEYS and data["spring"].keys() >= SPRING_KEYS
    assert {"name", "repeats", "cycles", "damage", "share"} <= data["events"][0].keys()
    assert {"low_m", "high_m", "tau_a_Pa", "tau_m_Pa", "cycles_to_failure"} <= data["worst_cycle"].keys()
    assert {"criterion", "endurance", "miner", "life_passes"} <= data["band"][0].keys()
    assert {"code", "level", "message", "waived"} <= data["findings"][0].keys()
    assert {"path", "sha256"} <= data["inputs"][0].keys()
