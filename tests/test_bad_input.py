"""Whatever a person gets wrong ends in one sentence: where, what was seen, what would be right.

Exit 2 for bad input, 3 for a stop that withholds the judgement; never a traceback.
"""

from __future__ import annotations

import json
import os
from pathlib import Path

import pytest
from casefile import CASE, RECORD, write_case

from springlife.cli import main

# name: (text to find, its replacement, words that the message must hold); exit code 2
BAD_CASES: dict[str, tuple[str, str, list[str]]] = {
    "not TOML": ("format = 1", "format = = 1", ["case.toml", "TOML", "line 1"]),
    "wrong format number": ("format = 1", "format = 7", ["format", "7", "format = 1"]),
    "format missing": ("format = 1\n", "", ["format", "missing"]),
    "title missing": ('title = "a latch"\n', "", ["title", "missing"]),
    "unknown key": ("total_coils", "totl_coils", ["spring.totl_coils", "did you mean 'total_coils'"]),
    "unknown table": ("[judge]", "[jugde]", ["jugde", "did you mean 'judge'"]),
    "unknown event key": ("repeats = 3", "repeat = 3", ["duty.event[1].repeat", "did you mean 'repeats'"]),
    "two diameters": (
        "total_coils", 'outer_diameter = "18 mm"\ntotal_coils',
        ["spring", "mean_diameter and outer_diameter", "exactly one"],
    ),
    "no diameter": ('mean_diameter = "16 mm"\n', "", ["spring", "exactly one", "none given"]),
    "no unit": ('"2.0 mm"', '"2.0"', ["spring.wire_diameter", "'2.0'", "no unit", "4.5 mm"]),
    "bare number": ('"2.0 mm"', "2.0", ["spring.wire_diameter", "2.0", "no unit"]),
    "wrong dimension": ('"2.0 mm"', '"2.0 N"', ["spring.wire_diameter", "'N'", "length"]),
    "unknown unit": ('"2.0 mm"', '"2.0 mmm"', ["spring.wire_diameter", "'mmm'", "not known"]),
    "decimal comma": ('"2.0 mm"', '"2,0 mm"', ["spring.wire_diameter", "2,0 mm", "decimal point"]),
    "text for a quantity": ('"60 mm"', '"long"', ["spring.free_length", "'long'", "number with a unit"]),
    "not finite": ('"60 mm"', '"1e999 mm"', ["spring.free_length", "not finite"]),
    "negative wire": ('"2.0 mm"', '"-2.0 mm"', ["spring.wire_diameter", "greater than 0"]),
    "coils as text": ("total_coils = 12", 'total_coils = "12"', ["spring.total_coils", "'12'", "number"]),
    "coils nan": ("total_coils = 12", "total_coils = nan", ["spring.total_coils", "nan", "finite"]),
    "boolean as text": ("[duty]", 'shot_peened = "yes"\n[duty]', ["spring.shot_peened", "'yes'", "boolean"]),
    "unknown grade": ('"A228"', '"A999"', ["A999", "A228", "grade"]),
    "grades file missing": ('grade = "A228"', 'grade = "A228"\ngrade_file = "mine.toml"', ["mine.toml", "o such file"]),
    "unknown ends": ('"squared and ground"', '"closed"', ["spring.ends", "'closed'", "squared and ground"]),
    "unknown criterion": ('"gerber"', '"gerbr"', ["judge.criterion", "'gerbr'", "did you mean 'gerber'"]),
    "unknown endurance": ("[judge]", '[judge]\nendurance = "zimmermann"', ["zimmermann", "zimmerli", "handbook"]),
    "repeats of zero": ("repeats = 3", "repeats = 0", ["duty.event[1].repeats", "0", "greater than or equal to 1"]),
    "repeats of one half": ("repeats = 3", "repeats = 2.5", ["duty.event[1].repeats", "2.5", "integer"]),
    "no event": (CASE[CASE.index("[[duty.event]]") : CASE.index("[judge]")], "", ["duty.event", "missing"]),
    "record and blocks": (
        "repeats = 3", 'repeats = 3\nblocks = [{low = "1 mm", high = "2 mm", cycles = 1}]',
        ["duty.event[1]", "exactly one of record and blocks"],
    ),
    "neither record nor blocks": ('record = "work.csv"\n', "", ["duty.event[1]", "exactly one of record and blocks"]),
    "travel without datum": ('"deflection"', '"travel"', ["duty.event[1]", "installed_deflection"]),
    "time and rate": ('time = "t"', 'time = "t"\nsample_rate = "10 Hz"', ["duty.event[1]", "time or sample_rate"]),
    "zero rate": ('time = "t"', 'sample_rate = "0 Hz"', ["sample_rate", "greater than 0"]),
    "target in another kind": ('"100 h"', '"100 km"', ["duty", "'100 km'", "one kind"]),
    "target in other words": ('"100 h"', '"100 landings"', ["duty", "'100 landings'", "counting word"]),
    "target of zero": ('"100 h"', '"0 h"', ["duty", "greater than zero"]),
    "pass of zero": ('"1 h"', '"0 h"', ["duty", "zero"]),
    "allowed damage of zero": ("[judge]", "[judge]\nallowed_damage = 0.0", ["judge.allowed_damage", "greater than 0"]),
    "unknown limit": ("[judge]", "[limits]\nclash = 0.1\n[judge]", ["limits.clash", "clash_allowance"]),
    "waiver of the unknown": (
        "[judge]", '[[waive]]\nfinding = "past-sold"\nby = "N. N."\nreason = "r"\n[judge]',
        ["waive[1]", "past-sold", "past-solid"],
    ),
    "waiver without a name": (
        "[judge]", '[[waive]]\nfinding = "past-solid"\nby = ""\nreason = "r"\n[judge]', ["waive[1].by", "character"],
    ),
    "option with an unknown key": (
        "[judge]", '[[option]]\nname = "thick"\nspring.wire = "3 mm"\n[judge]', ["option[1]", "spring.wire", "wire_diameter"],
    ),
    "option with a bad value": (
        "[judge]", '[[option]]\nname = "thick"\nspring.wire_diameter = "3"\n[judge]', ["option[1]", "'3'", "no unit"],
    ),
    "record missing": ('"work.csv"', '"rest.csv"', ["rest.csv", "no such file"]),
    "record is a directory": ('"work.csv"', '"."', ["directory"]),
    "missing column": ('channel = "travel"', 'channel = "travle"', ["work.csv", "'travle'", "did you mean 'travel'"]),
    "column number past the end": ('channel = "travel"', "channel = 9", ["work.csv", "9", "2"]),
    "time column missing": ('time = "t"', 'time = "clock"', ["work.csv", "'clock'"]),
    "unit of another kind": ('unit = "mm"', 'unit = "N"', ["'N'", "length"]),
    "a path with a NUL": ('"work.csv"', '"work\\u0000.csv"', ["duty.event[1].record", "U+0000"]),
    "a length beyond any spring": ('"60 mm"', '"1e300 mm"', ["spring.free_length", "beyond any length"]),
    "a target beyond any duty": ('"100 h"', '"1e300 h"', ["duty", "beyond any duty"]),
    "a scale beyond any sensor": ('unit = "mm"', 'unit = "mm"\nscale = 1e-300', ["duty.event[1]", "scale is 1e-300"]),
    "a fraction past all floats": ('"60 mm"', '"60/1' + "0" * 400 + ' mm"', ["spring.free_length", "not finite"]),
    "nested past reading": ("format = 1", "format = " + "[" * 5000 + "]" * 5000, ["case.toml", "nested too deeply"]),
    "a whole number of thousands of digits": ("format = 1", "format = " + "1" * 6000, ["case.toml", "digits"]),
    "a grid of a million": (
        "[judge]", '[[option]]\nname = "g"\nspring.total_coils = ' + str(list(range(1, 1001)))
        + "\nspring.free_length = " + str([f"{n} mm" for n in range(50, 1050)]).replace("'", '"') + "\n[judge]",
        ["option 'g'", "1000000 springs", "5000"],
    ),
    "a limit below zero": ("[judge]", "[limits]\nyield_factor = -5.0\n[judge]", ["limits.yield_factor is -5", "above zero"]),
    "a yield factor under one": ("[judge]", "[limits]\nyield_factor = 0.5\n[judge]", ["limits.yield_factor", "at least 1"]),
    "a share of more than all": ("[judge]", "[limits]\nlift_off_fraction = 9.0\n[judge]", ["lift_off_fraction is 9", "share"]),
    "limits that cross": ("[judge]", "[limits]\nindex_low = 100.0\n[judge]", ["index_low is 100", "below index_high"]),
    "a waiver by nobody": (
        "[judge]", '[[waive]]\nfinding = "past-solid"\nby = " "\nreason = "r"\n[judge]', ["waive[1].by", "write a name"],
    ),
    "a waiver twice": (
        "[judge]", '[[waive]]\nfinding = "yields"\nby = "a"\nreason = "r"\n' * 2 + "[judge]", ["two waivers are for 'yields'"],
    ),
    "an empty list in a grid": (
        "[judge]", '[[option]]\nname = "g"\nspring.wire_diameter = []\n[judge]', ["option 'g'", "spring.wire_diameter is empty"],
    ),
    "names that clash after expansion": (
        "[judge]", '[[option]]\nname = "g"\nspring.wire_diameter = ["2 mm", "2 mm"]\n[judge]', ["two options come out as 'g: 2 mm'"],
    ),
    "a knee past all tests": ("[judge]", "[judge]\nknee = 1e300", ["judge.knee", "less than or equal"]),
    "an allowed sum past all sense": ("[judge]", "[judge]\nallowed_damage = 1e6", ["judge.allowed_damage", "less than or equal"]),
    "a record without a name": ('"work.csv"', '""', ["duty.event[1].record", "at least 1 character"]),
    "unit missing": ('unit = "mm"\n', "", ["work.csv", "travel", "unit"]),
}  # fmt: skip

# name: (record, words that the message must hold, exit code)
BAD_RECORDS: dict[str, tuple[str | bytes, list[str], int]] = {
    "empty file": ("", ["work.csv", "empty"], 2),
    "header only": ("t,travel\n", ["work.csv"], 2),
    "one row": ("t,travel\n0.0,5\n", ["work.csv", "one"], 2),
    "text in a number column": (RECORD.replace("15", "off"), ["work.csv", "travel", "'off'"], 2),
    "NaN": (RECORD.replace("15", "nan"), ["work.csv", "travel"], 3),
    "blank cell": (RECORD.replace("15", ""), ["work.csv", "travel"], 3),
    "infinite": (RECORD.replace("15", "inf"), ["work.csv", "travel", "inf"], 2),
    "time going back": (RECORD.replace("0.3,", "0.15,"), ["work.csv", "0.15"], 3),
    "duplicate header": (
        RECORD.replace("t,travel", "t,travel,travel").replace("\n0", "\n0"),
        ["work.csv"],
        2,
    ),
    "ragged row": (RECORD.replace("0.3,15", "0.3,15,7"), ["work.csv"], 2),
    "binary junk": (bytes(range(256)) * 40, ["work.csv"], 2),
    "a long line": ("t,travel," + "9" * 10_000_000, ["work.csv"], 2),
    "decimal comma in commas": ("t,travel\n0,0,5,1\n0,1,6,2\n0,2,5,9\n", ["work.csv"], 2),
}


def run(path: Path, capsys: pytest.CaptureFixture[str]) -> tuple[int, str]:
    code = main(["assess", str(path)])
    caught = capsys.readouterr()
    return code, caught.err + caught.out


@pytest.mark.parametrize("name", BAD_CASES)
def test_bad_case(name: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    find, put, words = BAD_CASES[name]
    assert find in CASE
    code, text = run(write_case(tmp_path, CASE.replace(find, put)), capsys)
    assert code == 2, text
    assert all(word in text for word in words), text
    assert "Traceback" not in text and len(text.strip().splitlines()) == 1, text


@pytest.mark.parametrize("name", BAD_RECORDS)
def test_bad_record(name: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    record, words, expected = BAD_RECORDS[name]
    code, text = run(write_case(tmp_path, record=record), capsys)
    assert code == expected, text
    assert all(word in text for word in words), text
    assert "Traceback" not in text and len(text) < 4000, text


def test_all_faults_of_a_case_are_told_at_once(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    case = CASE.replace('"2.0 mm"', '"2.0"').replace("repeats = 3", "repeats = 0")
    code, text = run(write_case(tmp_path, case), capsys)
    assert code == 2
    assert "spring.wire_diameter" in text and "duty.event[1].repeats" in text


def test_case_missing_or_a_directory(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    code, text = run(tmp_path / "none.toml", capsys)
    assert code == 2 and "none.toml" in text and "no such file" in text
    code, text = run(tmp_path, capsys)
    assert code == 2 and "is a directory" in text


def test_a_pipe_is_no_record_and_no_case(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    os.mkfifo(tmp_path / "pipe")
    code, text = run(tmp_path / "pipe", capsys)
    assert code == 2 and "no regular file" in text
    code, text = run(write_case(tmp_path, CASE.replace("work.csv", "pipe")), capsys)
    assert code == 2 and "no regular file" in text


def test_infinite_results_are_null_in_json(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    case = CASE.replace("total_coils = 12", 'total_coils = 12\ntensile_strength = "500 MPa"')
    main(["assess", str(write_case(tmp_path, case)), "--json"])
    json.loads(capsys.readouterr().out, parse_constant=lambda word: pytest.fail(f"{word} in JSON"))


def test_case_that_is_not_text(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (tmp_path / "case.toml").write_bytes(b"\xff\xfe\x00\x01")
    code, text = run(tmp_path / "case.toml", capsys)
    assert code == 2 and "UTF-8" in text


@pytest.mark.parametrize(
    ("find", "put", "finding"),
    [
        ('"16 mm"', '"1.9 mm"', "impossible-geometry"),
        ("total_coils = 12", "total_coils = -12", "impossible-geometry"),
        ('"60 mm"', '"20 mm"', "impossible-geometry"),
        ('"2.0 mm"', '"8 mm"', "wire-off-table"),
    ],
)
def test_withheld_for_the_part(
    find: str, put: str, finding: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    case = CASE.replace(find, put)
    if finding == "wire-off-table":
        case = case.replace('"16 mm"', '"64 mm"').replace('"60 mm"', '"240 mm"')
    code, text = run(write_case(tmp_path, case), capsys)
    assert code == 3 and finding in text, text


@pytest.mark.parametrize(
    "words",
    [
        ["nonsense"],
        ["assess"],
        ["assess", "case.toml", "--nonsense"],
        ["count", "x.csv", "--residue", "none"],
    ],
)
def test_bad_usage(words: list[str], capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as stop:
        main(words)
    assert stop.value.code == 2
    assert len(capsys.readouterr().err.strip().splitlines()) == 1
