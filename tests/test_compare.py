"""Options side by side: what is held, what differs, and that nothing is read again."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
from casefile import write_case
from test_findings import QUIET

from springlife.cli import main
from springlife.errors import InputError
from springlife.life.case import load_case
from springlife.life.compare import Comparison, compare

ROOT = Path(__file__).parent.parent
SEAT = ROOT / "loadcases" / "forwarder-seat" / "case.toml"


def compared(folder: Path, option: str, hold: str = "stroke", case: str = QUIET) -> Comparison:
    return compare(load_case(write_case(folder, case + option, None)), hold)  # type: ignore[arg-type]


THICK = '[[option]]\nname = "thick"\nspring.wire_diameter = "2.2 mm"\n'
LONG = '[[option]]\nname = "long"\nspring.free_length = "58 mm"\n'


def test_peened_against_not_is_built_in_unless_an_option_is_just_that(tmp_path: Path) -> None:
    assert [option.name for option in compared(tmp_path, "").options] == ["as drawn", "shot-peened"]
    own = '[[option]]\nname = "bright"\nspring.shot_peened = true\n'
    assert [option.name for option in compared(tmp_path, own).options] == ["as drawn", "bright"]


def test_option_equals_assessing_it_alone(tmp_path: Path) -> None:
    result = compared(tmp_path, THICK)
    thick = result.options[-1].assessment.judgement
    alone = compared(tmp_path, "", case=QUIET.replace('"2.0 mm"', '"2.2 mm"')).options[0].assessment.judgement
    assert thick is not None and alone is not None
    assert thick.damage_per_pass == pytest.approx(alone.damage_per_pass, rel=1e-12)


@pytest.mark.parametrize("hold", ["stroke", "force", "length", "rate"])
def test_what_is_held_stays(hold: str, tmp_path: Path) -> None:
    result = compared(tmp_path, THICK, hold)
    drawn, _, thick = (option.assessment for option in result.options)
    assert drawn.judgement and drawn.duty and thick.judgement and thick.duty
    k0, k = drawn.judgement.spring.rate, thick.judgement.spring.rate
    (low0, high0), (low, high) = (
        drawn.duty.extremes(drawn.judgement.spring),
        thick.duty.extremes(thick.judgement.spring),
    )
    if hold == "force":
        assert (k * low, k * high) == pytest.approx((k0 * low0, k0 * high0))
    else:
        assert (low, high) == pytest.approx((low0, high0))
    assert (k == pytest.approx(k0)) == (hold == "rate")
    assert result.held.startswith(
        {"stroke": "deflections", "force": "forces", "length": "lengths", "rate": "rate"}[hold]
    )


def test_length_held_preloads_a_longer_spring_more(tmp_path: Path) -> None:
    by_length, by_stroke = compared(tmp_path, LONG, "length").options[-1], compared(tmp_path, LONG).options[-1]
    rate = by_length.spring.rate if by_length.spring else 0.0
    assert by_length.preload is not None and by_stroke.preload is not None
    assert by_length.preload - by_stroke.preload == pytest.approx(3e-3 * rate)


def test_options_that_change_rate_or_lengths_are_noted(tmp_path: Path) -> None:
    (finding,) = compared(tmp_path, THICK).findings
    assert finding.code == "options-differ" and "'thick' changes rate and solid length" in finding.message
    assert compared(tmp_path, "").findings == ()


def test_a_measured_rate_goes_when_the_wire_changes(tmp_path: Path) -> None:
    case = QUIET.replace("total_coils = 12", 'total_coils = 12\nmeasured_rate = "4.1 N/mm"')
    drawn, _, thick = compared(tmp_path, THICK, case=case).options
    assert drawn.spring and drawn.spring.rate == pytest.approx(4100)
    assert thick.spring and thick.spring.measured_rate is None


def test_grid_expands_without_reading_again(tmp_path: Path) -> None:
    grid = (
        '[[option]]\nname = "grid"\nspring.wire_diameter = ["1.8 mm", "2.0 mm", "2.2 mm"]\n'
        'spring.total_coils = [11, 12, 13.5]\nspring.grade = ["A228", "A401"]\n'
    )
    result = compared(tmp_path, grid)
    assert len(result.options) == 2 + 3 * 3 * 2
    assert "grid: 2.2 mm, 13.5, A401" in {option.name for option in result.options}


def test_a_bad_value_in_a_grid_is_named(tmp_path: Path) -> None:
    grid = '[[option]]\nname = "grid"\nspring.wire_diameter = ["1.8 mm", "2"]\n'
    with pytest.raises(InputError, match=r"option\[1\].*'2' has no unit"):
        compared(tmp_path, grid)


def test_the_best_on_life_and_mass_is_beaten_by_none(tmp_path: Path) -> None:
    grid = (
        '[[option]]\nname = "g"\nspring.wire_diameter = ["1.8 mm", "2.0 mm", "2.2 mm"]\nspring.total_coils = [11, 12]\n'
    )
    options = compared(tmp_path, grid).options
    judged = [o for o in options if o.life >= 0 and o.spring is not None]
    for one in judged:
        beaten = any(
            other.spring.mass <= one.spring.mass and other.life >= one.life  # type: ignore[union-attr]
            and (other.spring.mass < one.spring.mass or other.life > one.life)  # type: ignore[union-attr]
            for other in judged
        )  # fmt: skip
        assert ("mass" in one.best_for) == (not beaten)


def test_b10_is_below_the_nominal_life(tmp_path: Path) -> None:
    option = compared(tmp_path, "").options[0]
    assert option.b10 is not None and option.b10.value < option.life


def test_an_option_that_cannot_exist_is_withheld_and_the_rest_stands(tmp_path: Path) -> None:
    result = compared(tmp_path, '[[option]]\nname = "short"\nspring.free_length = "20 mm"\n')
    assert result.options[-1].assessment.verdict == "withheld" and result.options[0].assessment.verdict == "meets"
    assert result.options[-1].best_for == ()


def test_a_record_that_is_not_what_it_is_taken_for_withholds_every_option(tmp_path: Path) -> None:
    event = 'record = "work.csv"\nchannel = "y"\nunit = "mm"'
    case = QUIET.replace('blocks = [{ low = "5 mm", high = "20 mm", cycles = 100 }]', event)
    lengths = "y\n" + "\n".join(["50", "35", "48", "36", "50"] * 20) + "\n"
    result = compare(load_case(write_case(tmp_path, case, lengths)))
    assert {option.assessment.verdict for option in result.options} == {"withheld"}
    assert all("swapped-signal" in {f.code for f in option.assessment.findings} for option in result.options)


def test_nothing_to_compare_when_the_drawn_spring_cannot_be_read(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="nothing to compare"):
        compared(tmp_path, "", case=QUIET.replace('"16 mm"', '"1.5 mm"'))


def test_command_and_json(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    assert main(["compare", str(SEAT), "--figure", str(tmp_path / "o.svg")]) == 0
    out = capsys.readouterr().out
    assert "Held: stroke" in out and "not peened" in out and "falls short" in out
    assert (tmp_path / "o.svg").read_text(encoding="utf-8").startswith("<?xml")
    assert main(["compare", str(SEAT), "--json", "--hold", "force"]) == 0
    data = json.loads(capsys.readouterr().out)
    assert data["held"] == "force" and data["options"][0]["B10_passes"]["value"] > 0
