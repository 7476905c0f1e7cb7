"""Text tables as loggers write them: every dialect gives the same numbers, every fault one sentence.

Expected values are the numbers written into the fixtures; no source beyond that is needed.
"""

from __future__ import annotations

import gzip
import math
import tracemalloc
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from springlife.duty.formats import text
from springlife.duty.formats.blocks import Columns, parse
from springlife.duty.record import RecordSpec, open_record
from springlife.errors import FileError, GapError, InputError

WAYS = {"cell by cell": math.inf, "Arrow": 0}  # the size below which a file is read cell by cell
BOTH_WAYS = pytest.mark.parametrize("short", WAYS.values(), ids=WAYS)
T = [0.0, 0.1, 0.2, 0.3, 0.4, 0.5]
X = [5.25, 12.0, -6.5, 15.0, 5.0, 10.125]
PLAIN = "t,travel\n" + "".join(f"{t},{x}\n" for t, x in zip(T, X, strict=True))
COMMA = "t;travel\n" + "".join(f"{t};{x}\n".replace(".", ",") for t, x in zip(T, X, strict=True))


def read(folder: Path, content: str | bytes, **spec: object) -> np.ndarray:
    """Write the record and read its channel in mm."""
    path = folder / "work.csv"
    path.write_bytes(content if isinstance(content, bytes) else content.encode())
    chosen: dict[str, object] = {"channel": "travel", "time": "t", "unit": "mm"} | spec
    return np.concatenate(list(open_record(RecordSpec(path, **chosen)).blocks())) * 1e3  # type: ignore[arg-type]


def table(delimiter: str) -> str:
    return PLAIN.replace(",", delimiter)


DIALECTS: dict[str, tuple[str | bytes, dict[str, object]]] = {
    "commas": (PLAIN, {}),
    "tabs": (table("\t"), {}),
    "semicolons": (table(";"), {}),
    "semicolons and decimal commas": (COMMA, {}),
    "tabs and decimal commas": (COMMA.replace(";", "\t"), {}),
    "Windows line ends and blank lines at the end": (PLAIN.replace("\n", "\r\n") + "\r\n\r\n", {}),
    "no line end at the end": (PLAIN.rstrip(), {}),
    "UTF-8 with a byte-order mark": (PLAIN.encode("utf-8-sig"), {}),
    "UTF-16 little-endian": (b"\xff\xfe" + PLAIN.encode("utf-16-le"), {}),
    "UTF-16 big-endian": (b"\xfe\xff" + PLAIN.encode("utf-16-be"), {}),
    "Latin-1": (PLAIN.replace("travel", "Weg für (mm)").encode("latin-1"), {"channel": "Weg für", "unit": None}),
    "gzip": (gzip.compress(PLAIN.encode()), {}),
    "quoted cells": ("".join(",".join(f'"{c}"' for c in line.split(",")) + "\n" for line in PLAIN.split()), {}),
    "quoted decimal commas": (
        "".join(",".join(f'"{c}"' for c in line.split(";")) + "\n" for line in COMMA.split()), {},
    ),
    "spaces round cells": (PLAIN.replace(",", " , "), {}),
    "plus signs": (PLAIN.replace(",1", ",+1"), {}),
    "exponents": (PLAIN.replace("12.0", "1.2e1").replace("10.125", "1012.5E-2"), {}),
    "a delimiter at the end of each line": (COMMA.replace("\n", ";\n"), {}),
    "a delimiter at the end of each row": (COMMA.replace("\n", ";\n").replace("travel;", "travel"), {}),
    "units row": (PLAIN.replace("travel\n", "travel\ns,mm\n"), {"unit": None}),
    "units row in brackets": (PLAIN.replace("travel\n", "travel\n[s],[mm]\n"), {"unit": None}),
    "units in the header": (PLAIN.replace("t,travel", "t [s],travel (mm)"), {"unit": None}),
    "units after a slash": (PLAIN.replace("t,travel", "t / s,travel / mm"), {"unit": None}),
    "comment lines": ("# made by a logger\n# 3 channels\n" + PLAIN, {}),
    "slashes for comments": ("// made by a logger\n" + PLAIN, {}),
    "semicolons for comments": ("; made by a logger\n; 2, 3\n" + PLAIN, {}),
    "percent signs for comments": ("% made by a logger\n" + PLAIN, {}),
    "a commented header": ("# " + PLAIN, {}),
    "a preamble": ("Logger X\nSerial,12345\nStarted,2025-01-01T10:00:00\n\n" + PLAIN, {}),
    "a preamble as wide as the table": ("Logger,X\nOperator,N.N.\n" + PLAIN, {}),
    "a preamble and a units row": ("Logger,X\n" + PLAIN.replace("travel\n", "travel\ns,mm\n"), {"unit": None}),
    "the delimiter named": ("sep=;\n" + COMMA, {}),
    "no header": (PLAIN.split("\n", 1)[1], {"channel": 2, "time": 1}),
    "column numbers": (PLAIN, {"channel": 2, "time": 1}),
    "other letter case": (PLAIN, {"channel": "TRAVEL", "time": "T"}),
    "one column besides the time": (PLAIN, {"channel": None}),
    "text columns in between": (
        "t,state,travel\n" + "".join(f"{t},idle,{x}\n" for t, x in zip(T, X, strict=True)), {},
    ),
    "ISO date-times": (
        PLAIN.replace("\n0.", "\n2025-03-31T14:00:00."), {},
    ),
    "ISO date-times with a space and Z": (
        "t,travel\n" + "".join(f"2025-03-31 14:00:0{t}Z,{x}\n" for t, x in zip(T, X, strict=True)), {},
    ),
    "summer time ends": (
        "t,travel\n" + "".join(
            f"2025-10-26T02:59:59.{5 + i}+02:00,{x}\n" if i < 5 else f"2025-10-26T02:00:00.0+01:00,{x}\n"
            for i, x in enumerate(X)
        ), {},
    ),
}  # fmt: skip


@BOTH_WAYS
@pytest.mark.parametrize("block", [40, 1 << 20], ids=["tiny blocks", "one block"])
@pytest.mark.parametrize("name", DIALECTS)
def test_every_dialect_gives_the_same_numbers(
    name: str, short: float, block: int, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(text, "SHORT", short)
    monkeypatch.setattr(text, "BLOCK", block)
    content, spec = DIALECTS[name]
    np.testing.assert_allclose(read(tmp_path, content, **spec), X, rtol=1e-15)


@pytest.mark.parametrize("name", DIALECTS)
def test_every_dialect_gives_the_same_rate(name: str, tmp_path: Path) -> None:
    content, spec = DIALECTS[name]
    path = tmp_path / "work.csv"
    path.write_bytes(content if isinstance(content, bytes) else content.encode())
    recording = open_record(RecordSpec(path, **({"channel": "travel", "time": "t", "unit": "mm"} | spec)))  # type: ignore[arg-type]
    assert recording.sample_rate is None
    assert sum(block.size for block in recording.blocks(2)) == 6
    assert recording.sample_rate == pytest.approx(10.0)
    assert recording.span == pytest.approx(0.5)


def test_the_way_of_reading_is_chosen_by_length(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    asked = []
    monkeypatch.setattr(text, "parse", lambda block, columns: asked.append(block))
    monkeypatch.setattr(text, "SHORT", len(PLAIN) + 1)
    read(tmp_path, PLAIN)
    assert not asked
    monkeypatch.setattr(text, "SHORT", len(PLAIN))
    np.testing.assert_allclose(read(tmp_path, PLAIN), X, rtol=1e-15)  # cell by cell, since that way took nothing
    assert b"".join(asked) == PLAIN.split("\n", 1)[1].encode()


def test_arrow_alone_takes_what_loggers_write() -> None:
    block = b"0.5,x,-1.25\r\n1,y, +3 \r\n\r\n2e-3,,nan\r\n-0,z,\r\n"
    values, times = parse(block, Columns(",", ".", 3, 2, 0)) or ([], None)
    np.testing.assert_array_equal(values, [-1.25, 3.0, np.nan, np.nan, np.nan])
    assert times is not None and np.signbit(times[4])
    np.testing.assert_array_equal(times, [0.5, 1.0, np.nan, 0.002, 0.0])


@pytest.mark.parametrize(
    "row", [b"1,2,3\n", b"1\n", b"1,\n2\n", b"1,1_0\n", b"1,0x1\n", b"1,--2\n", b"1,.\n", b"1,1e\n", b"1,'2'\n", b"1,2\r3\n",
            b'1,2"\n', b'1,"2\n', b'1,"0"1\n', b'"0"1,2\n', b"1,1 2\n", b"1,na\n"],
)  # fmt: skip
def test_arrow_refuses_what_needs_care(row: bytes) -> None:
    assert parse(b"0,1\n" + row, Columns(",", ".", 2, 1, None)) is None


def test_a_fraction_that_comes_late_still_tells_the_decimal_sign(tmp_path: Path) -> None:
    rows = "".join(f"{n};0\n" for n in range(1000))
    values = read(tmp_path, f"t;travel\n{rows}1000;0,5\n1001;1,5\n")
    np.testing.assert_allclose(values[-2:], [0.5, 1.5])


def test_a_long_preamble_is_passed_over(tmp_path: Path) -> None:
    preamble = "".join(f"Channel {n} calibrated by hand\n" for n in range(900))
    np.testing.assert_allclose(read(tmp_path, preamble + PLAIN), X, rtol=1e-15)


def test_zstandard(tmp_path: Path) -> None:
    import pyarrow as pa

    packed = pa.compress(PLAIN.encode(), codec="zstd", asbytes=True)
    np.testing.assert_allclose(read(tmp_path, packed), X, rtol=1e-15)


def rows(old: str, new: str) -> str:
    assert old in PLAIN
    return PLAIN.replace(old, new)


LONG = b"9" * 10_000_000
# name: (content, spec, class, words of the message)
BROKEN: dict[str, tuple[str | bytes, dict[str, object], type[Exception], list[str]]] = {
    "empty": ("", {}, InputError, ["is empty"]),
    "blank lines only": ("\n \n\n", {}, InputError, ["is empty"]),
    "header only": ("t,travel\n", {}, InputError, ["header but no rows", "t,travel"]),
    "one row": ("t,travel\n0.0,5\n", {}, InputError, ["only one value", "two samples"]),
    "prose": ("Dear all,\nsee below.\nRegards\n", {}, InputError, ["no rows of numbers", "Dear all"]),
    "text in a number column": (rows("15.0", "off"), {}, InputError, ["'travel', row 5", "'off'", "number"]),
    "text in the time column": (rows("0.3,", "late,"), {}, InputError, ["'t', row 5", "'late'"]),
    "underscore": (rows("15.0", "1_5"), {}, InputError, ["row 5", "'1_5'"]),
    "hexadecimal": (rows("15.0", "0x1F"), {}, InputError, ["row 5", "'0x1F'"]),
    "digits of another script": (rows("15.0", "\u0661\u0665"), {}, InputError, ["row 5", "\u0661\u0665"]),
    "NaN": (rows("15.0", "NaN"), {}, GapError, ["'travel', row 5", "missing", 'gaps = "split"']),
    "blank cell": (rows("15.0", ""), {}, GapError, ["'travel', row 5", "missing"]),
    "blank line between rows": (rows("0.3,", "\n0.3,"), {}, GapError, ["row 5", "missing"]),
    "time missing": (rows("0.3,", ","), {}, GapError, ["'t', row 5", "time is missing"]),
    "no value at all": ("t,travel\n0,\n1,\n", {"gaps": "split"}, InputError, ["'travel'", "no value"]),
    "decimal comma in the message": (COMMA.replace("15,0", "1,5x"), {}, InputError, ["row 5", "'1,5x'"]),
    "clock of seconds since 1970": (
        "t,travel\n1743426000.5,1\n1743426000.6,2\n1743426000.7,2\n1743426009.8,1\n", {}, GapError,
        ["row 5", "from 1743426000.7 s to 1743426009.8 s"],
    ),
    "infinite": (rows("15.0", "inf"), {}, InputError, ["'travel', row 5", "inf", "finite"]),
    "past the greatest float": (rows("15.0", "1e999"), {}, InputError, ["row 5", "inf"]),
    "time going back": (rows("0.3,", "0.15,"), {}, GapError, ["'t', row 5", "back from 0.2 s to 0.15 s"]),
    "a row missing": (rows("0.3,15.0\n", ""), {}, GapError, ["'t', row 5", "jumps from 0.2 s to 0.4 s", "0.1 s"]),
    "repeated time": (
        rows("0.5,", "0.4,"), {}, GapError, ["'t', row 7", "0.4 s occurs twice", "1 repeated", "sample_rate"],
    ),
    "missing column": (PLAIN, {"channel": "travle"}, InputError, ["'travle'", "did you mean 'travel'", "t, travel"]),
    "missing time column": (PLAIN, {"time": "clock"}, InputError, ["time column 'clock'", "t, travel"]),
    "number past the end": (PLAIN, {"channel": 3}, InputError, ["number 3", "1 to 2"]),
    "number zero": (PLAIN, {"channel": 0}, InputError, ["number 0", "1 to 2"]),
    "channel and time alike": (PLAIN, {"channel": 1}, InputError, ["'t'", "as channel and as time"]),
    "channel not named": (PLAIN, {"channel": None, "time": None}, InputError, ["name the channel", "t, travel"]),
    "ambiguous by letter case": (
        "t,Travel,TRAVEL\n0,1,2\n1,2,3\n", {}, InputError, ["'travel' is ambiguous", "2 and 3", "number"],
    ),
    "duplicate header": ("t,travel,travel\n0,1,2\n1,2,3\n", {}, InputError, ["ambiguous", "columns 2 and 3"]),
    "name without a header": (PLAIN.split("\n", 1)[1], {}, InputError, ["no header row", "1 to 2"]),
    "longer row": (rows("0.3,15.0", "0.3,15.0,7"), {}, InputError, ["row 5", "3 cells", "2"]),
    "shorter row": (rows("0.3,15.0", "0.3"), {}, InputError, ["row 5", "1 cell", "2"]),
    "header wider than the rows": (rows("t,travel", "t,travel,x"), {}, InputError, ["row 1", "3 cells", "row 2 has 2"]),
    "decimal commas between commas": (
        "t,travel\n0,0,5,1\n0,1,6,2\n", {}, InputError, ["row 1", "2 cells", "4", "decimal commas", "semicolons"],
    ),
    "decimal commas in one column": (
        "travel\n1,5\n2,5\n", {"time": None}, InputError, ["1 cell", "2", "decimal commas"],
    ),
    "whole numbers or decimal commas": (
        "1,5,2,3\n1,6,2,4\n", {"channel": 2, "time": 1}, InputError, ["'1,5,2,3'", "4 whole numbers", "2 with decimal"],
    ),
    "both decimal signs": (
        "t;travel\n0.0;5,25\n0.1;6,5\n", {}, InputError, ["decimal points", "decimal commas", "'5,25' in row 2"],
    ),
    "another decimal sign far down": (
        COMMA + "0,6;1,5\n" * 6000 + "0,7;1.5\n", {"time": None},
        InputError, ["'1.5'", "row 6008", "decimal comma"],
    ),
    "thousands separators": (COMMA.replace("15,0", "1.015,0"), {}, InputError, ["row 5", "'1.015,0'"]),
    "spaces between columns": (table("  "), {}, InputError, ["separated by spaces", "commas, semicolons or tabs"]),
    "day and month in unknown order": (
        rows("0.0,", "03/04/2025 10:00:00,"), {}, InputError, ["'t', row 2", "several ways", "ISO 8601"],
    ),
    "time of day only": (rows("0.0,", "10:00:00.0,"), {}, InputError, ["'t', row 2", "ISO 8601"]),
    "a month 13": (
        "t,travel\n2025-12-31T00:00:00,1\n2025-13-01T00:00:00,2\n", {}, InputError, ["row 3", "'2025-13-01T00:00:00'"],
    ),
    "a date-time that is none": (
        "t,travel\n2025-12-31T00:00:00,1\nlater,2\n", {}, InputError, ["'t', row 3", "'later'"],
    ),
    "bytes that are no text": (bytes(range(256)) * 40, {}, InputError, ["not text", "0x00"]),
    "a NUL in the middle": (PLAIN.encode().replace(b"15", b"1\x005"), {}, InputError, ["not text", "0x00"]),
    "old line ends": (PLAIN.replace("\n", "\r"), {}, InputError, ["carriage returns"]),
    "one long line": (b"t,travel," + LONG, {}, InputError, ["no line ends"]),
    "a long line below": (PLAIN.encode() + LONG, {}, InputError, ["row 8", "longer"]),
    "an open quote": (rows("15.0", '"15.0'), {}, InputError, ["row 5", "quoted cell"]),
    "an open quote at the end": (rows("10.125", '"10.125'), {}, InputError, ["row 7", "cells"]),
    "gzip cut short": (
        gzip.compress(PLAIN.encode() * 3000)[:-20], {"time": None}, InputError, ["packed data", "cut short"],
    ),
    "gzip damaged": (b"\x1f\x8b" + bytes(100), {}, InputError, ["packed data", "damaged"]),
    "Zstandard damaged": (b"\x28\xb5\x2f\xfd" + bytes(100), {}, InputError, ["packed data", "damaged"]),
    "UTF-16 cut in half": (b"\xff\xfe" + PLAIN.encode("utf-16-le") + b"\x00\xd8", {}, InputError, ["UTF-16"]),
}  # fmt: skip


@BOTH_WAYS
@pytest.mark.parametrize("name", BROKEN)
def test_every_fault_ends_in_one_sentence(
    name: str, short: float, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(text, "SHORT", short)
    content, spec, kind, words = BROKEN[name]
    with pytest.raises(kind) as caught:
        read(tmp_path, content, **spec)
    message = str(caught.value)
    assert type(caught.value) is kind, message
    assert "work.csv" in message and all(word in message for word in words), message
    assert "\n" not in message and len(message) < 500, message


def test_missing_file_and_directory(tmp_path: Path) -> None:
    with pytest.raises(FileError, match=r"none\.csv: there is no such file"):
        open_record(RecordSpec(tmp_path / "none.csv", channel=1))


def test_a_long_line_takes_little_memory(tmp_path: Path) -> None:
    path = tmp_path / "work.csv"
    path.write_bytes(PLAIN.encode() + LONG * 3)
    recording = open_record(RecordSpec(path, channel="travel", unit="mm"))
    tracemalloc.start()
    with pytest.raises(InputError, match="row 8: is longer"):
        list(recording.blocks())
    _, peak = tracemalloc.get_traced_memory()
    tracemalloc.stop()
    assert peak < 15e6  # of a line of 30 MB, reading stops after the longest row allowed, 4 MB, held twice


finite = st.floats(allow_nan=False, allow_infinity=False)


@given(
    values=st.lists(finite, min_size=2, max_size=30),
    style=st.sampled_from([("{!r}", ","), ("{!r}", "\t"), ("{:.17g}", ";"), ("{:.17e}", ","), ("{:.6g}", ",")]),
    short=st.sampled_from(list(WAYS.values())),
    block=st.sampled_from([30, 1 << 20]),
)
@settings(max_examples=150, deadline=None)
def test_written_numbers_come_back_bit_for_bit(
    values: list[float],
    style: tuple[str, str],
    short: float,
    block: int,
    tmp_path_factory: pytest.TempPathFactory,
) -> None:
    form, delimiter = style
    path = tmp_path_factory.mktemp("exact") / "x.csv"
    lines = [f"n{delimiter}x"] + [f"{n}{delimiter}{form.format(value)}" for n, value in enumerate(values)]
    path.write_text("\n".join(lines), encoding="utf-8")
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(text, "SHORT", short)
        patch.setattr(text, "BLOCK", block)
        read = np.concatenate(list(open_record(RecordSpec(path, channel="x", kind=None)).blocks()))
    expected = np.array([float(form.format(value)) for value in values])
    assert read.tobytes() == expected.tobytes()


QUOTED = st.lists(st.text('01"; ', max_size=8), min_size=1, max_size=4)
ROWS = st.lists(st.sampled_from(["", " ", "\r", "1", '""', ";", "1;", ";2", "1;2", '"1";2', "1;2;3"]), max_size=6)


def agree(path: Path, content: str, channel: str) -> None:
    """Read both ways: the numbers are the same, or the sentence."""
    path.write_bytes(content.encode())
    outcomes = []
    for short in WAYS.values():
        with pytest.MonkeyPatch.context() as patch:
            patch.setattr(text, "SHORT", short)
            try:
                spec = RecordSpec(path, channel=channel, kind=None, gaps="split")
                outcomes.append(np.concatenate(list(open_record(spec).blocks())).tolist())
            except InputError as error:
                outcomes.append(str(error))
    assert repr(outcomes[0]) == repr(outcomes[1])


@given(
    cells=st.lists(st.text("0123456789.,+-eEnaif_x \"'", max_size=8), min_size=1, max_size=6) | QUOTED,
)
@settings(max_examples=200, deadline=None)
def test_both_ways_of_reading_agree_on_any_cells(cells: list[str], tmp_path_factory: pytest.TempPathFactory) -> None:
    rows = "".join(f"1;{cell}\n" for cell in cells)
    agree(tmp_path_factory.mktemp("any") / "x.csv", f"n;x\n0;0\n{rows}", "x")


@given(first=st.sampled_from(["x\n0\n0.5\n", "n;x\n0;0\n0;0.5\n"]), rows=ROWS)
@settings(max_examples=200, deadline=None)
def test_both_ways_of_reading_agree_on_blank_and_ragged_rows(
    first: str, rows: list[str], tmp_path_factory: pytest.TempPathFactory
) -> None:
    agree(tmp_path_factory.mktemp("rows") / "x.csv", first + "".join(f"{row}\n" for row in [*rows, ""]), "x")
