"""What the README shows runs, and says what it shows."""

from __future__ import annotations

import re
import shlex
import tomllib
from pathlib import Path

import pytest

from springlife.cli import main
from springlife.life.case_input import CaseInput

ROOT = Path(__file__).parent.parent
README = (ROOT / "README.md").read_text(encoding="utf-8")
BLOCKS = re.findall(r"```(\w*)\n(.*?)```", README, flags=re.DOTALL)
TOUR = [line for kind, text in BLOCKS if kind == "sh" for line in text.splitlines() if line.startswith("springlife ")]


@pytest.mark.parametrize("line", TOUR)
def test_tour(line: str, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    monkeypatch.chdir(ROOT)
    words = [
        str(tmp_path / word.removeprefix("/tmp/")) if word.startswith("/tmp/") else word for word in shlex.split(line)
    ]
    assert main(words[1:]) in {0, 1}
    assert capsys.readouterr().out


def test_the_two_commands_stand_first() -> None:
    first, second = (text for kind, text in BLOCKS[:2])
    assert "springlife assess loadcases/forwarder-seat/case.toml" in first and "-m pytest" in second


def test_the_case_file_shown_is_valid() -> None:
    (shown,) = (text for kind, text in BLOCKS if kind == "toml")
    case = CaseInput.model_validate(tomllib.loads(shown))
    assert case.duty.target_passes == 3000


def test_the_output_shown_is_the_output(monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> None:
    monkeypatch.chdir(ROOT)
    main(["assess", "loadcases/forwarder-seat/case.toml"])
    seen = " ".join(capsys.readouterr().out.split())
    (shown,) = (text for kind, text in BLOCKS if kind == "text")
    for line in shown.splitlines():
        assert " ".join(line.removesuffix("...").split()) in seen


def test_python_shown_runs(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(ROOT)
    (shown,) = (text for kind, text in BLOCKS if kind == "python")
    exec(compile(shown, "README.md", "exec"), {})


def test_every_picture_and_path_named_is_there() -> None:
    for target in re.findall(r"\]\(([^)#]+)\)", README):
        assert (ROOT / target).exists(), target
    for path in re.findall(r"`((?:springlife|loadcases)/[\w./-]+)`", README):
        assert (ROOT / path).exists(), path
