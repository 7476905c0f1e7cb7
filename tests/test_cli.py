"""The commands as a person runs them: exit codes, what goes where, terminals wide and narrow."""

from __future__ import annotations

import json
import subprocess
import sys
from pathlib import Path

import pytest
from casefile import write_case
from test_findings import QUIET

from springlife import cli
from springlife.cli import main

ROOT = Path(__file__).parent.parent
SEAT = ROOT / "loadcases" / "forwarder-seat" / "case.toml"
PUMP = ROOT / "loadcases" / "dosing-pump" / "case.toml"


def shell(*words: str, **environment: str) -> subprocess.CompletedProcess[str]:
    """Run the real command in a process of its own."""
    command = [sys.executable, "-m", "springlife.cli", *words]
    return subprocess.run(
        command, capture_output=True, text=True, encoding="utf-8", check=False, cwd=ROOT,
        env={"PATH": "/usr/bin:/bin", "HOME": "/tmp", "PYTHONUTF8": "1", "PYTHONPATH": str(ROOT), **environment},
    )  # fmt: skip


@pytest.mark.parametrize(
    ("change", "code", "head"),
    [
        (("100 h", "100 h"), 0, "MEETS THE TARGET"),
        (("cycles = 100", "cycles = 900000"), 1, "FALLS SHORT OF THE TARGET"),
        (('"20 mm"', '"32 mm"'), 3, "JUDGEMENT WITHHELD"),
    ],
)
def test_exit_codes_and_the_verdict_first(
    change: tuple[str, str], code: int, head: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    case = QUIET.replace('high = "20 mm"', 'high = "30 mm"') if code == 1 else QUIET
    assert main(["assess", str(write_case(tmp_path, case.replace(*change), None))]) == code
    assert capsys.readouterr().out.splitlines()[0].strip() == head


def test_piped_output_has_no_colour_and_nothing_on_stderr() -> None:
    run = shell("assess", str(PUMP))
    assert run.returncode == 0 and "\x1b" not in run.stdout and run.stderr == ""


@pytest.mark.parametrize("columns", [40, 60, 80, 200])
def test_any_width_fits(columns: int) -> None:
    """Narrow terminals wrap; no line is wider than the terminal."""
    run = shell("assess", str(SEAT), COLUMNS=str(columns))
    assert run.returncode == 0
    assert max(len(line.rstrip()) for line in run.stdout.splitlines()) <= columns


def test_markup_of_a_case_is_text(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    case = QUIET.replace('title = "quiet"', 'title = "[bold red]loud[/] $x$"').replace('"work"', '"[/x] & co"')
    assert main(["assess", str(write_case(tmp_path, case, None))]) == 0
    out = capsys.readouterr().out
    assert "[bold red]loud[/] $x$" in out and "[/x] & co" in out


@pytest.mark.parametrize("find", ['"quiet"', '"work"'])
def test_control_characters_are_refused(find: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    case = QUIET.replace(find, '"red \\u001b[31m"')
    assert main(["assess", str(write_case(tmp_path, case, None))]) == 2
    assert "control character U+001B" in capsys.readouterr().err


def test_waiver_is_printed_with_name_and_reason(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    waiver = '[[waive]]\nfinding = "past-solid"\nby = "R. Viewer"\nreason = "bump stop"\n[judge]'
    case = QUIET.replace('"20 mm"', '"32 mm"').replace("[judge]", waiver)
    main(["assess", str(write_case(tmp_path, case, None))])
    assert "waived by R. Viewer: bump stop" in " ".join(capsys.readouterr().out.split())


def test_check_reads_everything_and_judges_nothing(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["check", str(SEAT)]) == 0
    out = capsys.readouterr().out
    assert "smooth.csv" in out and "sha256" in out and "250 Hz" in out and "MEETS" not in out
    assert main(["check", str(SEAT), "--json"]) == 0
    data = json.loads(capsys.readouterr().out)
    assert [event["name"] for event in data["events"]] == ["haul road", "rough stand", "stump strikes"]
    assert data["events"][0]["record"]["samples"] == 15000


def test_count_agrees_with_the_independent_package(capsys: pytest.CaptureFixture[str]) -> None:
    words = ["count", str(SEAT.parent / "hits.csv"), "--channel", "seat travel", "--time", "time"]
    assert main([*words, "--recount"]) == 0
    assert "the rainflow package finds the same" in capsys.readouterr().out
    assert main([*words, "--recount", "--json", "--residue", "repeat", "--gate", "1.0"]) == 0
    data = json.loads(capsys.readouterr().out)
    assert data["recount_agrees"] is True and data["unit"] == "mm" and min(row["range"] for row in data["rows"]) > 1.0


def test_grades(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["grades"]) == 0
    assert "A228" in capsys.readouterr().out
    assert main(["grades", "A401", "--json"]) == 0
    assert json.loads(capsys.readouterr().out)["grades"][0]["name"] == "A401"
    assert main(["grades", "A402"]) == 2
    assert "did you mean 'A401'" in capsys.readouterr().err


def test_scatter_prints_its_seed_and_repeats_itself(capsys: pytest.CaptureFixture[str]) -> None:
    words = ["scatter", str(PUMP), "--samples", "1024", "--seed", "7"]
    outs = []
    for _ in range(2):
        assert main(words) == 0
        outs.append(capsys.readouterr().out)
    assert outs[0] == outs[1] and "7" in outs[0]


def test_same_input_same_bytes() -> None:
    first, second = (shell("assess", str(SEAT), "--json").stdout for _ in range(2))
    assert first == second and json.loads(first)["verdict"] == "meets"


def test_no_command_prints_help_and_is_bad_usage(capsys: pytest.CaptureFixture[str]) -> None:
    assert main([]) == 2
    assert "assess" in capsys.readouterr().out


def test_a_reader_that_goes_away_is_no_traceback_and_no_verdict() -> None:
    command = f"{sys.executable} -m springlife.cli grades | true; exit ${{PIPESTATUS[0]}}"
    run = subprocess.run(["bash", "-c", command], capture_output=True, text=True, check=False, cwd=ROOT)
    assert "Traceback" not in run.stderr and run.returncode == 141


def test_a_fault_of_the_program_is_no_verdict(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    def fail(argv: object = None) -> int:
        raise RuntimeError("made to fail")

    monkeypatch.setattr(cli, "main", fail)
    with pytest.raises(SystemExit) as stop:
        cli.run()
    assert stop.value.code == 70 and "RuntimeError: made to fail" in capsys.readouterr().err


def test_limits_of_the_case_are_told(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    case = QUIET.replace("[judge]", "[limits]\nclash_allowance = 0.1\n[judge]")
    main(["assess", str(write_case(tmp_path, case, None))])
    assert "clash_allowance 0.1 for 0.15" in capsys.readouterr().out
