"""A file appears whole or not at all."""

from __future__ import annotations

from pathlib import Path

import pytest

from springlife.errors import FileError
from springlife.files import write_file


def test_written_whole(tmp_path: Path) -> None:
    assert write_file(tmp_path / "a.txt", lambda p: p.write_text("x")).read_text() == "x"


def test_failure_leaves_the_old_file_and_no_other(tmp_path: Path) -> None:
    target = tmp_path / "a.txt"
    target.write_text("old")

    def fail(path: Path) -> None:
        path.write_text("half")
        raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        write_file(target, fail, force=True)
    assert target.read_text() == "old" and list(tmp_path.iterdir()) == [target]


@pytest.mark.parametrize(("name", "words"), [("a.txt", "--force"), (".", "directory"), ("no/b.txt", "does not exist")])
def test_refusals(name: str, words: str, tmp_path: Path) -> None:
    (tmp_path / "a.txt").write_text("old")
    with pytest.raises(FileError, match=words):
        write_file(tmp_path / name, lambda p: p.write_text("new"))
