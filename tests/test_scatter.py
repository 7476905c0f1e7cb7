"""The scatter study against closed forms, and spring by spring against the plain judgement.

Quantiles of the normal distribution: Phi^-1(0.1) = -1.2815516, Phi^-1(0.01) = -2.3263479, Phi(1) = 0.8413447
(standard tables).
"""

from __future__ import annotations

import json
import math
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from casefile import write_case

import springlife.life.population as population
from springlife.cli import main
from springlife.errors import InputError
from springlife.life.assess import assess, judge, model_of
from springlife.life.case import Case, load_case
from springlife.life.population import Population
from springlife.life.reading import Duty
from springlife.life.scatter import ScatterResult, scatter
from springlife.life.scatter_input import VARIABLES
from springlife.life.spread import spreads_of
from springlife.report.figures_scatter import tornado
from springlife.spring.stress import stress_map

ROOT = Path(__file__).parent.parent
DEMOS = ["forwarder-seat", "dosing-pump"]
CASE = """\
format = 1
title = "valve return"
[spring]
grade = "A228"
wire_diameter = "2.0 mm"
mean_diameter = "16 mm"
total_coils = 12
free_length = "55 mm"
[duty]
one_pass = "1 h"
target = "20000 h"
[[duty.event]]
name = "work"
blocks = [{ low = "5 mm", high = "20 mm", cycles = 100 }]
[judge]
criterion = "gerber"
miner = "elementary"
"""
TENTH, HUNDREDTH = 1.2815515655446004, 2.3263478740408408


def demo(name: str) -> Path:
    return ROOT / "loadcases" / name / "case.toml"


def only(*names: str) -> str:
    return f"[scatter]\noff = {[name for name in VARIABLES if name not in names]}\n"


def study(
    folder: Path, table: str, *changes: tuple[str, str], record: str | None = None, **settings: int
) -> ScatterResult:
    text = CASE
    for find, put in changes:
        assert find in text
        text = text.replace(find, put)
    return scatter(write_case(folder, text + table, record), **settings)


def drawn_life(result: ScatterResult) -> float:
    """Life of the spring as drawn, passes: the plain judgement, which has tests of its own."""
    assert result.assessment.judgement is not None
    life = result.assessment.judgement.life_passes
    assert life is not None
    return life


# --- closed forms -----------------------------------------------------------------------------------


def test_with_only_life_scattering_b_lives_are_lognormal_quantiles(tmp_path: Path) -> None:
    """Life times 10^(0.3 z): B10/B50 = 10^(-0.3 x 1.28155), B1/B50 = 10^(-0.3 x 2.32635); derived by hand."""
    result = study(tmp_path, only("life") + "life = { log10_sd = 0.3 }\n")
    life = drawn_life(result)
    expected = {"B1": life * 10 ** (-0.3 * HUNDREDTH), "B10": life * 10 ** (-0.3 * TENTH), "B50": life}
    for name, value in expected.items():
        found = result.b_lives[name]
        # A quantile lies within one in 16,384 of its place; at 1 % that is 0.6 % of it.
        assert found.value == pytest.approx(value, rel=5e-3)
        assert found.low <= found.value <= found.high
    assert [one.variable for one in result.sensitivities] == ["life"]


def test_failures_before_the_target_by_hand(tmp_path: Path) -> None:
    """A target of one standard deviation under the median: Phi(-1) = 0.1586553."""
    first = study(tmp_path, only("life"), samples=1024)
    target = drawn_life(first) * 10**-0.2
    fails = study(tmp_path, only("life"), ('"20000 h"', f'"{target!r} h"')).fails
    assert fails.value == pytest.approx(0.15865525, abs=2e-4)
    assert fails.low <= 0.15865525 <= fails.high


def test_intervals_hold_the_truth_as_often_as_they_say(tmp_path: Path) -> None:
    """Of 30 studies at 95 %, 25 or more hold it with probability 0.9964 (binomial); seeds fixed."""
    case = load_case(write_case(tmp_path, CASE + only("life", "allowed_damage"), None))
    sd = math.hypot(0.2 * math.log(10), math.sqrt(math.log1p(0.09)))  # two lognormals multiplied
    drawn = assess(case).judgement
    assert drawn is not None and drawn.life_passes is not None
    truth = {"B10": drawn.life_passes * math.exp(-TENTH * sd), "B50": drawn.life_passes}
    held = dict.fromkeys(truth, 0)
    widths = []
    for seed in range(30):
        lives = scatter(case, samples=1024, seed=seed).b_lives
        for name, value in truth.items():
            held[name] += lives[name].low <= value <= lives[name].high
        widths.append(lives["B10"].high / lives["B10"].low)
    assert min(held.values()) >= 25
    assert max(widths) < 1.25  # and not by being wide: the lives themselves span a factor of ten


def test_indices_of_an_additive_case_are_shares_of_variance_and_sum_to_one(tmp_path: Path) -> None:
    """One slope k: ln life = k ln e + ln L + ln D + const, so each index is a variance over their sum."""
    table = only("life", "endurance_strength", "allowed_damage") + "life = { log10_sd = 0.3 }\n"
    result = study(tmp_path, table)
    assert result.assessment.judgement is not None
    k = result.assessment.judgement.model.curve.slope
    variance = {
        "endurance_strength": k**2 * math.log1p(0.08**2),
        "life": (0.3 * math.log(10)) ** 2,
        "allowed_damage": math.log1p(0.3**2),
    }
    whole = sum(variance.values())
    for one in result.sensitivities:
        share = variance[one.variable] / whole
        assert one.total.value == pytest.approx(share, abs=0.02)
        assert one.first.value == pytest.approx(share, abs=0.03)
        assert one.total.low - 0.01 <= share <= one.total.high + 0.01
    assert sum(one.first.value for one in result.sensitivities) == pytest.approx(1, abs=0.03)
    assert sum(one.total.value for one in result.sensitivities) == pytest.approx(1, abs=0.03)
    totals = [one.total.value for one in result.sensitivities]
    assert totals == sorted(totals, reverse=True)


def test_strengths_read_as_b10_are_passed_by_nine_in_ten(tmp_path: Path) -> None:
    """Life goes with strength to the power k; the median strength is exp(1.28155 sd) times a B10."""
    table = only("endurance_strength")
    median, low = study(tmp_path, table), study(tmp_path, table + 'strengths_are = "B10"\n')
    assert median.assessment.judgement is not None
    k = median.assessment.judgement.model.curve.slope
    sd = math.sqrt(math.log1p(0.08**2))
    assert low.b_lives["B50"].value / median.b_lives["B50"].value == pytest.approx(math.exp(k * TENTH * sd))
    assert low.b_lives["B10"].value == pytest.approx(drawn_life(low), rel=5e-3)


def test_solid_contact_by_hand(tmp_path: Path) -> None:
    """Solid is 31 mm down; 30.5 mm needs a free length 1 sd short: (Phi(-1) - Phi(-3))/(Phi(3) - Phi(-3))."""
    table = only("free_length") + 'free_length = { half_range = "1.5 mm" }\n'
    result = study(tmp_path, table, ('"20 mm"', '"30.5 mm"'), ("[judge]", "[limits]\nclash_allowance = 0.0\n[judge]"))
    expected = (0.15865525393145707 - 0.0013498980316301) / 0.9973002039367398
    assert result.solid.value == pytest.approx(expected, abs=3e-4)
    assert result.yields.value in (0.0, 1.0)


def test_yielding_by_hand(tmp_path: Path) -> None:
    """The limit falls with the tensile strength: peak at 2/3 sd under the limit, Phi(-2/3) = 0.2524925."""
    longer = ('"55 mm"', '"75 mm"')  # room to yield before solid
    first = study(tmp_path, only("tensile_strength"), longer, samples=1024)
    assert first.assessment.judgement is not None
    spring = first.assessment.judgement.spring
    slope = float(stress_map(spring).static(np.asarray(1e-3))) / 1e-3
    high = spring.static_limit * (1 - 0.02) / slope * 1000
    table = only("tensile_strength") + "tensile_strength = { share = 0.09 }\n"
    result = study(tmp_path, table, longer, ('"20 mm"', f'"{high!r} mm"'))
    expected = (0.25249253754692 - 0.0013498980316301) / 0.9973002039367398
    assert result.yields.value == pytest.approx(expected, abs=3e-4)
    assert result.yields.low <= result.yields.value <= result.yields.high
    assert result.solid.value == 0 and 0 < result.solid.high < 3e-4  # none of 16,384: 3/n


# --- spring by spring against the plain judgement ---------------------------------------------------


def one_by_one(case: Case, duty: Duty, values: dict[str, float]) -> float:
    """Life of one spring through a case file of its own and the plain laws, passes."""
    drawn = next(n for n in ("mean_diameter", "outer_diameter", "inner_diameter") if n in case.raw["spring"])
    spring = assess(case).judgement.spring  # type: ignore[union-attr]
    override: dict[str, Any] = {
        "wire_diameter": f"{values['wire_diameter']!r} m",
        drawn: f"{values['coil_diameter']!r} m",
        "total_coils": values["active_coils"] + spring.total_coils - spring.active_coils,
        "free_length": f"{values['free_length']!r} m",
        "shear_modulus": f"{values['shear_modulus']!r} Pa",
        "tensile_strength": f"{values['tensile_strength']!r} Pa",
    }
    other = case.varied("one", override, {}, "")
    if spring.measured_rate:
        built, base = other.build_spring(), spring.calculated_rate
        rate = spring.measured_rate * built.calculated_rate / base
        other = other.varied("one", override | {"measured_rate": f"{rate!r} N/m"}, {}, "")
    part = other.build_spring()
    model = model_of(other, part, stress_map(part, other.judge.stress_factor, other.judge.curvature_on))
    e = values["endurance_strength"]
    model = replace(model, curve=replace(model.curve, points=tuple((N, S * e) for N, S in model.curve.points)))

    def damage(residue: str) -> float:
        cycles = duty.one_pass(part).cycles(residue)  # type: ignore[arg-type]
        mean, half = (cycles.low + cycles.high) / 2, values["duty"] * (cycles.high - cycles.low) / 2
        return float(model.damage(mean - half, mean + half, cycles.count).sum()) / values["life"]

    each, first, allowed = damage("repeat"), damage(case.judge.residue), values["allowed_damage"]
    if each == 0:
        return math.inf
    return allowed / first if first >= allowed else 1 + (allowed - first) / each


RECORD = "y\n" + "\n".join(map(str, [5.0, 20, 8, 16, 4, 19, 5, 18, 6])) + "\n"
BLOCKS = 'blocks = [{ low = "5 mm", high = "20 mm", cycles = 100 }]'
VARIANTS = {
    "mean diameter": [],
    "outer diameter": [('mean_diameter = "16 mm"', 'outer_diameter = "18 mm"')],
    "inner diameter": [('mean_diameter = "16 mm"', 'inner_diameter = "14 mm"')],
    "one that yields": [('high = "20 mm"', 'high = "30 mm"')],
    "set removed": [("total_coils", "set_removed = true\nshot_peened = true\ntotal_coils")],
    "curvature on the amplitude": [('"gerber"', '"goodman"\ncurvature_on = "alternating"\nstress_factor = "wahl"')],
    "handbook": [("[judge]", '[judge]\nendurance = "handbook"')],
    "haibach, happens once": [('"elementary"', '"haibach"\nresidue = "half"')],
    "plain ends": [("free_length", 'ends = "plain"\nfree_length')],
    "measured rate": [("total_coils", 'measured_rate = "4.5 N/mm"\ntotal_coils')],
    "lengths": [(BLOCKS, 'record = "work.csv"\nchannel = "y"\nunit = "mm"\nmeasures = "length"\nscale = -1.0\noffset = 55.0')],
    "forces": [(BLOCKS, 'record = "work.csv"\nchannel = "y"\nunit = "N"\nmeasures = "force"\nscale = 5.0')],
    "travel": [(BLOCKS, 'record = "work.csv"\nchannel = "y"\nunit = "mm"\nmeasures = "travel"\ninstalled_deflection = "2 mm"')],
}  # fmt: skip


@pytest.mark.parametrize("name", VARIANTS)
def test_each_spring_lives_as_the_plain_laws_say(name: str, tmp_path: Path) -> None:
    text = CASE
    for find, put in VARIANTS[name]:
        assert find in text
        text = text.replace(find, put, 1)
    case = load_case(write_case(tmp_path, text, RECORD))
    judged = assess(case)
    assert judged.judgement is not None and judged.duty is not None
    spreads = spreads_of(case, judged.judgement.spring)
    springs = Population(case, judged.duty, judged.judgement, spreads)
    u = np.random.default_rng(7).uniform(0.01, 0.99, (12, len(spreads)))
    found = springs.outcome(u)
    for i in range(len(u)):
        values = {one.name: float(one.values(u[i : i + 1, n])[0]) for n, one in enumerate(spreads)}
        assert found.passes[i] == pytest.approx(one_by_one(case, judged.duty, values), rel=1e-9), i


@pytest.mark.parametrize("residue", ["repeat", "half", "drop"])
@pytest.mark.parametrize("name", DEMOS)
def test_the_spring_in_the_middle_is_the_drawn_one(name: str, residue: str) -> None:
    case = load_case(demo(name)).varied("as drawn", {}, {"residue": residue}, "")
    judged = assess(case)
    assert judged.judgement is not None and judged.duty is not None
    spreads = spreads_of(case, judged.judgement.spring)
    middle = Population(case, judged.duty, judged.judgement, spreads).outcome(np.full((1, len(spreads)), 0.5))
    assert middle.passes[0] == pytest.approx(judged.judgement.life_passes, rel=1e-9)


def test_only_the_wire_diameter_against_drawing_springs_one_by_one(tmp_path: Path) -> None:
    """Life falls with the wire diameter at a given stroke, so B10 is the life at the diameter's 90 % value."""
    result = study(tmp_path, only("wire_diameter") + 'wire_diameter = { half_range = "0.1 mm" }\n', samples=2048)
    case, duty = result.case, result.assessment.duty
    assert duty is not None and result.assessment.judgement is not None
    drawn = Population(case, duty, result.assessment.judgement, ()).centre
    (spread,) = result.spreads
    rng = np.random.default_rng(11)
    wires = spread.values(rng.uniform(size=100))
    lives = [one_by_one(case, duty, drawn | {"wire_diameter": float(d)}) for d in wires]
    order = np.argsort(wires)
    assert np.all(np.diff(np.asarray(lives)[order]) < 0)
    for name, part in (("B10", 0.9), ("B50", 0.5)):
        at = float(spread.values(np.array([part]))[0])
        exact = one_by_one(case, duty, drawn | {"wire_diameter": at})
        assert result.b_lives[name].value == pytest.approx(exact, rel=2e-3)
    # The plain Monte Carlo median agrees within three of its standard errors.
    logs = np.log(lives)
    error = 1.2533 * logs.std(ddof=1) / math.sqrt(len(lives))
    assert abs(np.median(logs) - math.log(result.b_lives["B50"].value)) < 3 * error


# --- seeds, cells, refusals -------------------------------------------------------------------------


def test_the_seed_makes_the_study_and_another_agrees_within_the_intervals() -> None:
    case = load_case(demo("dosing-pump"))
    one, again, other = (scatter(case, samples=1024, seed=seed) for seed in (5, 5, 6))
    assert json.dumps(one.to_dict()) == json.dumps(again.to_dict())
    assert not np.array_equal(one.lives, other.lives)
    assert one.seed == 5 and one.to_dict()["seed"] == 5
    a, b = one.b_lives["B10"], other.b_lives["B10"]
    assert a.low < b.high and b.low < a.high


def noisy(folder: Path) -> Case:
    y = np.clip(12 + 2.2 * np.random.default_rng(3).normal(size=6000), 3, 25)
    record = "y\n" + "\n".join(f"{value:.6f}" for value in y) + "\n"
    text = CASE.replace(BLOCKS, 'record = "work.csv"\nchannel = "y"\nunit = "mm"').replace("elementary", "haibach")
    return load_case(write_case(folder, text, record))


def test_cells_keep_number_and_peak_and_say_their_error(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    case = noisy(tmp_path)
    judged = assess(case)
    assert judged.duty is not None and judged.judgement is not None
    spreads = spreads_of(case, judged.judgement.spring)
    springs = Population(case, judged.duty, judged.judgement, spreads)
    every, cells = springs.every, springs.steady
    assert cells.low.size < every.low.size / 2
    assert cells.count.sum() == pytest.approx(every.count.sum())
    assert (cells.count * cells.low).sum() == pytest.approx((every.count * every.low).sum())
    assert cells.high.max() == every.high.max()
    u = np.random.default_rng(2).uniform(size=(16, len(spreads)))
    said = springs.cell_error(u)
    assert 0 < said < 2e-3
    near = springs.outcome(u).passes
    monkeypatch.setattr(population, "KEPT", every.low.size)
    exact = Population(case, judged.duty, judged.judgement, spreads)
    assert exact.steady is exact.every and exact.cell_error(u) == 0
    assert np.max(np.abs(exact.outcome(u).passes / near - 1)) == pytest.approx(said, rel=1e-6)


def test_a_case_that_cannot_be_judged_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"case.toml: cannot be judged, so there is nothing to scatter: .*free length"):
        study(tmp_path, "", ('"55 mm"', '"20 mm"'))


def test_a_duty_without_damage_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="no spring of 1024 takes damage"):
        study(tmp_path, "", ("elementary", "original"), ('high = "20 mm"', 'high = "6 mm"'), samples=1024)


def test_wire_too_weak_for_the_criterion_is_refused(tmp_path: Path) -> None:
    changes = [
        ("total_coils", 'shot_peened = true\ntensile_strength = "1400 MPa"\ntotal_coils'),
        ("gerber", "asme-elliptic"),
    ]
    with pytest.raises(InputError, match=r"\d+ of \d+ springs are so weak in tension that asme-elliptic has no"):
        study(tmp_path, "[scatter]\ntensile_strength = { share = 0.12 }\n", *changes, samples=1024)


@pytest.mark.parametrize(
    ("table", "message"),
    [
        ('wire_diameter = { half_range = "1.2 mm" }', "scatter.wire_diameter.half_range is 1.2 mm, not under half of"),
        ("active_coils = { half_range = 11 }", "active_coils.half_range is 11, not under half of the drawing's 20"),
        ('free_length = { half_range = "20 mm" }', "springs cannot exist: they are solid at their free length"),
    ],
)
def test_springs_that_cannot_exist_are_refused(table: str, message: str, tmp_path: Path) -> None:
    with pytest.raises(InputError) as error:
        study(tmp_path, f"[scatter]\n{table}\n", ('"20 mm"', '"7 mm"'), ("coils = 12", "coils = 22"), samples=1024)
    assert message in str(error.value) and "case.toml: " in str(error.value)


def test_many_unlimited_lives_leave_no_ranking(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """At the knee about half the springs take no damage by Miner's original reading: B50 and more unlimited."""
    changes = [("elementary", "original"), ('high = "20 mm"', 'high = "22 mm"')]
    result = study(tmp_path, "", *changes, samples=1024)
    unlimited = np.isinf(result.lives).mean()
    assert 0.5 < unlimited < 1
    assert result.sensitivities == () and "no life to take a logarithm of" in (result.no_sensitivities or "")
    assert math.isinf(result.b_lives["B50"].value)
    assert result.to_dict()["b_lives"]["B50"]["passes"]["value"] is None
    with pytest.raises(ValueError, match="no indices to draw"):
        tornado(result)
    assert main(["scatter", str(result.case.path), "--samples", "1024"]) == 0
    assert "unlimited" in capsys.readouterr().out


# --- end to end -------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", DEMOS)
def test_the_command_on_the_demo_cases(name: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["scatter", str(demo(name)), "--samples", "1024", "--seed", "3"]) == 0
    out, err = capsys.readouterr()
    assert err == ""
    for word in ("1024 springs drawn, seed 3", "B1 life", "B10 life", "B50 life", "failing", "endurance strength"):
        assert word in out
    assert main(["scatter", str(demo(name)), "--samples", "1024", "--seed", "3", "--json"]) == 0
    data = json.loads(capsys.readouterr().out)
    lives = [data["b_lives"][key]["passes"]["value"] for key in ("B1", "B10", "B50")]
    assert lives == sorted(lives) and lives[0] < lives[2]
    assert data["b_lives"]["B10"]["life"]["unit"] == data["target"]["unit"]
    assert {one["variable"] for one in data["distributions"]} == set(VARIABLES)
    assert all(one["source"] and one["provenance"] for one in data["distributions"])


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (["--samples", "1000"], "samples is 1000; give a power of two"),
        (["--seed", "-4"], "seed is -4; give a whole number from 0 up"),
    ],
)
def test_bad_arguments_end_in_one_sentence(
    arguments: list[str], message: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert main(["scatter", str(demo("dosing-pump")), *arguments]) == 2
    out, err = capsys.readouterr()
    assert out == "" and err.startswith("springlife: " + message) and err.count("\n") == 1


def test_what_is_held_and_what_the_case_says_are_printed(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    table = (
        '[scatter]\noff = ["allowed_damage"]\nsamples = 1024\nwire_diameter = { half_range = "0.02 mm", sigmas = 2 }\n'
    )
    assert main(["scatter", str(write_case(tmp_path, CASE + table, None))]) == 0
    out = capsys.readouterr().out
    assert "2 ± 0.02 mm at 2 sigma" in out and "the case file" in out
    assert "held" in out and "allowed damage" in out


def test_events_measured_differently_are_said_to_keep_their_pairing(tmp_path: Path) -> None:
    force = (
        '[[duty.event]]\nname = "push"\nrecord = "work.csv"\nchannel = "y"\nunit = "N"\nmeasures = "force"\nscale = 4.0'
    )
    mixed = study(tmp_path, "", ("[judge]", force + "\n[judge]"), record=RECORD, samples=1024)
    alike = study(tmp_path, "", samples=1024)
    assert mixed.pairing_held and not alike.pairing_held


def test_the_tornado_shows_every_variable_apart(tmp_path: Path) -> None:
    figure = tornado(study(tmp_path, "", samples=1024))
    (axes,) = figure.axes
    figure.canvas.draw()
    assert len(axes.patches) == len(VARIABLES)
    assert {label.get_text().replace(" ", "_") for label in axes.get_yticklabels()} == set(VARIABLES)
    assert "%" in axes.get_xlabel()
    boxes = [text.get_window_extent() for text in (*axes.texts, *axes.get_yticklabels())]
    assert not any(a.overlaps(b) for i, a in enumerate(boxes) for b in boxes[:i])


def test_judging_afterwards_is_untouched(tmp_path: Path) -> None:
    """A [scatter] table changes no verdict."""
    plain = assess(write_case(tmp_path, CASE, None))
    with_table = assess(write_case(tmp_path, CASE + "[scatter]\nlife = { log10_sd = 1.0 }\n", None))
    assert plain.judgement is not None and with_table.judgement is not None and with_table.duty is not None
    assert judge(with_table.case, with_table.duty).judgement is not None
    assert plain.judgement.life_passes == with_table.judgement.life_passes
