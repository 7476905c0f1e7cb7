"""One recording: units, scale, gaps, blocks, pieces, provenance.

Expected values are derived by hand from the few numbers each fixture holds.
"""

from __future__ import annotations

import hashlib
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from springlife.duty.formats import text
from springlife.duty.record import Recording, RecordSpec, SummaryAccumulator, open_record, summarise
from springlife.errors import FileError, GapError, InputError

CSV = "t,travel,load (kN)\n0,5,1\n0.1,12,2\n0.2,6,3\n0.3,15,4\n"


def opened(folder: Path, content: str = CSV, **spec: object) -> Recording:
    (folder / "work.csv").write_text(content, encoding="utf-8")
    chosen: dict[str, object] = {"channel": "travel", "time": "t", "unit": "mm"} | spec
    return open_record(RecordSpec(folder / "work.csv", **chosen))  # type: ignore[arg-type]


def samples(recording: Recording, size: int = 1_000_000) -> np.ndarray:
    return np.concatenate(list(recording.blocks(size)))


def test_millimetres_become_metres(tmp_path: Path) -> None:
    np.testing.assert_allclose(samples(opened(tmp_path)), [0.005, 0.012, 0.006, 0.015], rtol=1e-15)


def test_inches_become_metres(tmp_path: Path) -> None:
    # 1 in = 25.4 mm exactly (international inch, 1959)
    np.testing.assert_allclose(samples(opened(tmp_path, unit="in"))[1], 12 * 0.0254, rtol=1e-15)


def test_force_takes_its_unit_from_the_header(tmp_path: Path) -> None:
    recording = opened(tmp_path, channel="load", unit=None, kind="force")
    np.testing.assert_allclose(samples(recording), [1000, 2000, 3000, 4000], rtol=1e-15)
    assert recording.unit == "kN"


def test_scale_then_offset_then_unit(tmp_path: Path) -> None:
    # value = 2 x recorded + 3 mm: 5 -> 13 mm; the sign turned first: -2 x 5 + 3 = -7 mm
    np.testing.assert_allclose(samples(opened(tmp_path, scale=2.0, offset=3.0))[0], 0.013, rtol=1e-15)
    np.testing.assert_allclose(samples(opened(tmp_path, scale=2.0, offset=3.0, invert=True))[0], -0.007, rtol=1e-15)


def test_scale_may_turn_the_units_of_the_file_into_others(tmp_path: Path) -> None:
    content = CSV.replace("travel", "travel (V)")
    np.testing.assert_allclose(samples(opened(tmp_path, content, scale=10.0))[0], 0.05, rtol=1e-15)
    with pytest.raises(InputError, match=r"'V' in the file and 'mm' in the case.*scale that turns 'V' into 'mm'"):
        opened(tmp_path, content)


def test_one_unit_spelt_two_ways_is_no_conflict(tmp_path: Path) -> None:
    content = CSV.replace("travel", "travel [millimeter]")
    assert samples(opened(tmp_path, content))[0] == pytest.approx(0.005)


def test_without_a_kind_numbers_stay_as_recorded(tmp_path: Path) -> None:
    recording = opened(tmp_path, kind=None, unit=None)
    assert samples(recording).tolist() == [5.0, 12.0, 6.0, 15.0]
    assert recording.unit is None


@pytest.mark.parametrize(
    ("spec", "words"),
    [
        ({"unit": "N"}, ["'travel'", "'N' is not a length"]),
        ({"unit": "mmm"}, ["'mmm'", "not known"]),
        ({"unit": None}, ["'travel'", "neither the file nor the case"]),
        ({"unit": "mm", "channel": "load", "kind": "force"}, ["'kN' in the file", "'mm' in the case"]),
        ({"time_unit": "mm"}, ["'t'", "'mm' is not a time"]),
        ({"sample_rate": 10.0}, ["'t'", "sample rate", "one of them"]),
        ({"time": None, "sample_rate": 0.0}, ["sample_rate is 0 Hz", "greater than zero"]),
        ({"time": None, "sample_rate": -5.0}, ["sample_rate is -5 Hz"]),
        ({"time": None, "sample_rate": float("nan")}, ["sample_rate is nan"]),
        ({"scale": 0.0}, ["scale 0", "not zero"]),
        ({"offset": float("inf")}, ["offset inf", "finite"]),
        ({"gaps": "ignore"}, ["gaps is 'ignore'", "'error' or 'split'"]),
        ({"between": "glue"}, ["between is 'glue'", "'join' or 'split'"]),
        ({"kind": "colour"}, ["kind is 'colour'", "length"]),
    ],
)
def test_what_cannot_be_meant_is_refused(spec: dict[str, object], words: list[str], tmp_path: Path) -> None:
    with pytest.raises(InputError) as caught:
        opened(tmp_path, **spec)
    message = str(caught.value)
    assert "work.csv" in message and all(word in message for word in words), message


def test_time_unit_from_the_case_or_the_file(tmp_path: Path) -> None:
    for content, stated in ((CSV, "ms"), (CSV.replace("t,", "t [ms],", 1), None)):
        recording = opened(tmp_path, content, time_unit=stated)
        samples(recording)
        assert recording.sample_rate == pytest.approx(10_000.0)  # 0.1 ms apart
    with pytest.raises(InputError, match="time unit is 'ms' in the file and 's' in the case"):
        opened(tmp_path, CSV.replace("t,", "t [ms],", 1), time_unit="s")


def test_a_given_rate_needs_no_time_column(tmp_path: Path) -> None:
    recording = opened(tmp_path, time=None, sample_rate=200.0)
    samples(recording)
    assert recording.sample_rate == 200.0
    assert recording.span == pytest.approx(3 / 200)


def test_without_time_or_rate_the_span_is_unknown(tmp_path: Path) -> None:
    recording = opened(tmp_path, time=None)
    assert samples(recording).size == 4
    assert recording.sample_rate is None and recording.span is None and recording.block_times is None


@given(st.integers(1, 12), st.integers(1, 60), st.sampled_from([30, 1 << 20]))
@settings(max_examples=60, deadline=None)
def test_blocks_of_any_size_give_the_same_samples(size: int, rows: int, block: int) -> None:
    import tempfile

    rng = np.random.default_rng(rows)
    values = rng.normal(size=rows + 1).round(4)
    content = "n,x\n" + "".join(f"{n},{x}\n" for n, x in enumerate(values))
    with tempfile.TemporaryDirectory() as folder, pytest.MonkeyPatch.context() as patch:
        patch.setattr(text, "BLOCK", block)
        (Path(folder) / "x.csv").write_text(content)
        blocks = list(open_record(RecordSpec(Path(folder) / "x.csv", channel="x", kind=None)).blocks(size))
    assert [b.size for b in blocks[:-1]] == [size] * (len(blocks) - 1)
    assert 0 < blocks[-1].size <= size
    assert np.concatenate(blocks).tolist() == values.tolist()


def test_a_block_of_no_size_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="block size is 0"):
        next(opened(tmp_path).blocks(0))


def test_a_record_can_be_read_twice(tmp_path: Path) -> None:
    recording = opened(tmp_path, CSV.replace("15", ""), gaps="split")
    first, lines = samples(recording), recording.provenance
    assert np.array_equal(samples(recording), first, equal_nan=True)
    assert recording.provenance == lines


# Gaps


def split(folder: Path, rows: str) -> tuple[list[float], Recording]:
    recording = opened(folder, "t,travel\n" + rows, kind=None, unit=None, gaps="split")
    return samples(recording).tolist(), recording


def is_split(values: list[float], expected: list[float]) -> bool:
    return np.array_equal(values, expected, equal_nan=True)


NAN = float("nan")


def test_a_missing_value_separates(tmp_path: Path) -> None:
    values, recording = split(tmp_path, "0,1\n1,2\n2,\n3,NaN\n4,5\n5,\n6,7\n")
    assert is_split(values, [1, 2, NAN, NAN, 5, NAN, 7])
    assert recording.gaps_found == 2
    assert "split at 2 gaps: column 'travel', row 4: the value is missing" in recording.provenance[-1]


def test_a_jump_of_the_clock_separates(tmp_path: Path) -> None:
    values, recording = split(tmp_path, "0,1\n1,2\n2,3\n9,4\n10,5\n")
    assert is_split(values, [1, 2, 3, NAN, 4, 5])
    assert recording.gaps_found == 1 and recording.sample_rate == pytest.approx(1.0)
    assert "row 5: the time jumps from 2 s to 9 s, where 1 s is usual" in recording.provenance[-1]


def test_a_clock_set_back_separates(tmp_path: Path) -> None:
    values, _ = split(tmp_path, "0,1\n1,2\n2,3\n0.5,4\n1.5,5\n")
    assert is_split(values, [1, 2, 3, NAN, 4, 5])


def test_a_repeated_time_is_told_but_does_not_separate(tmp_path: Path) -> None:
    rows = "0,1\n1,2\n2,3\n2,4\n3,5\n4,6\n4,7\n"
    values, recording = split(tmp_path, rows)
    assert values == [1, 2, 3, 4, 5, 6, 7]
    assert recording.repeated_times == 2 and recording.gaps_found == 0
    assert "2 repeated times kept in order, first column 't', row 5" in recording.provenance[-1]
    with pytest.raises(GapError, match="row 5: the time 2 s occurs twice, 2 repeated times in all"):
        samples(opened(tmp_path, "t,travel\n" + rows))


def test_what_is_wrong_is_an_error_even_when_gaps_split(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="row 3: inf is not finite"):
        split(tmp_path, "0,1\n1,inf\n2,2\n")
    with pytest.raises(InputError, match="row 3: the time is not finite"):
        split(tmp_path, "0,1\ninf,1\n2,2\n")


def test_times_of_a_block_stand_beside_its_samples(tmp_path: Path) -> None:
    recording = opened(tmp_path, "t,travel\n0,1\n1,2\n2,3\n9,4\n10,5\n", gaps="split")
    seen = [(block.size, recording.block_times) for block in recording.blocks(4)]
    assert [size for size, _ in seen] == [4, 2]
    assert is_split(seen[0][1].tolist(), [0, 1, 2, NAN]) and seen[1][1].tolist() == [9, 10]  # type: ignore[union-attr]


# Pieces


def pieces(folder: Path, names: list[str], content: list[str]) -> Path:
    for name, rows in zip(names, content, strict=True):
        (folder / name).write_text("t,travel\n" + rows)
    return folder


def test_a_folder_is_read_in_natural_order(tmp_path: Path) -> None:
    names = ["run10.csv", "run2.csv", "run1.csv", ".hidden", "~lock.csv"]
    folder = pieces(tmp_path, names, ["0,5\n1,6\n", "0,3\n1,4\n", "0,1\n1,2\n", "x", "x"])
    recording = open_record(RecordSpec(folder, channel="travel", time="t", kind=None))
    assert samples(recording, 4).tolist() == [1, 2, 3, 4, 5, 6]
    # each piece begins one interval after the one before
    assert recording.span == pytest.approx(5.0) and recording.sample_rate == pytest.approx(1.0)
    assert recording.provenance[1] == "3 pieces joined"
    digests = [hashlib.sha256((folder / n).read_bytes()).hexdigest() for n in ("run1.csv", "run2.csv", "run10.csv")]
    assert recording.provenance[2] == f"piece 1: run1.csv, sha256 {digests[0]}"
    listed = "".join(f"{d}  {n}\n" for d, n in zip(digests, ("run1.csv", "run2.csv", "run10.csv"), strict=True))
    assert recording.sha256 == hashlib.sha256(listed.encode()).hexdigest()


@pytest.mark.parametrize("pattern", ["run*.csv", "run?.csv", "*[[]*"])
def test_a_pattern_chooses_pieces_and_may_keep_them_apart(pattern: str, tmp_path: Path) -> None:
    folder = tmp_path / "bench [1]"
    folder.mkdir()
    pieces(folder, ["run1.csv", "run2.csv", "note.txt"], ["0,1\n1,2\n", "0,3\n1,4\n", "x"])
    spec = RecordSpec(folder / pattern, channel="travel", time="t", kind=None, between="split")
    if "[" in pattern:
        with pytest.raises(FileError, match="matches no file"):
            open_record(spec)
        return
    recording = open_record(spec)
    assert is_split(samples(recording, 3).tolist(), [1, 2, NAN, 3, 4])
    assert "2 pieces kept apart" in recording.provenance


def test_a_gap_in_a_piece_names_the_piece(tmp_path: Path) -> None:
    pieces(tmp_path, ["run1.csv", "run2.csv"], ["0,1\n1,2\n", "0,3\n1,\n"])
    with pytest.raises(GapError, match=r"run2\.csv, row 3: the value is missing"):
        samples(open_record(RecordSpec(tmp_path / "run*.csv", channel="travel", time="t", kind=None)))


def test_pieces_must_agree(tmp_path: Path) -> None:
    (tmp_path / "run1.csv").write_text("t,travel (mm)\n0,1\n1,2\n")
    (tmp_path / "run2.csv").write_text("t,force,travel (mm)\n0,1,1\n1,2,2\n")
    spec = RecordSpec(tmp_path / "run*", channel="travel", time="t")
    with pytest.raises(
        InputError, match=r"run2\.csv: has columns t, force, travel \(mm\) where run1\.csv has t, travel"
    ):
        open_record(spec)
    (tmp_path / "run2.csv").write_text("t,travel (mm)\ns,in\n0,1\n1,2\n")
    with pytest.raises(InputError, match=r"run2\.csv: its unit is in where run1\.csv has mm"):
        open_record(spec)


def test_an_unreadable_piece_of_a_folder_is_named(tmp_path: Path) -> None:
    pieces(tmp_path, ["run1.csv"], ["0,1\n1,2\n"])
    (tmp_path / "notes.txt").write_text("Dear all,\n")
    with pytest.raises(InputError, match=r"notes\.txt: .*every file of the directory .* is read.*pattern"):
        open_record(RecordSpec(tmp_path, channel="travel", time="t", kind=None))


def test_an_empty_folder_is_refused(tmp_path: Path) -> None:
    with pytest.raises(FileError, match="is a directory without files"):
        open_record(RecordSpec(tmp_path, channel=1))


# Summary and provenance


def test_summary_of_a_small_record(tmp_path: Path) -> None:
    summary = summarise(opened(tmp_path, "t,travel\n0,5\n0.1,12\n0.2,-1\n0.3,12\n0.4,12\n", kind=None, unit=None))
    assert (summary.samples, summary.minimum, summary.maximum, summary.mean) == (5, -1, 12, 8)
    assert (summary.minimum_at, summary.maximum_at) == (2, 1)
    assert summary.minimum_time_s == pytest.approx(0.2) and summary.maximum_time_s == pytest.approx(0.1)
    assert summary.rate_Hz == pytest.approx(10) and summary.span_s == pytest.approx(0.4)
    assert (summary.levels, summary.resolution) == (3, 6.0)  # -1, 5, 12: the smallest step is 6
    assert (summary.longest_at_minimum, summary.longest_at_maximum) == (1, 2)
    assert summary.negative_share == pytest.approx(0.2)
    assert summary.drift is None  # too short to tell
    assert summary.to_dict()["samples"] == 5
    assert ("samples", "5, 0.4 s at 10 Hz") in summary.lines()


def test_the_accumulator_works_without_a_recording(tmp_path: Path) -> None:
    gathered = SummaryAccumulator()
    for block in opened(tmp_path).blocks(3):
        gathered.feed(block)
    summary = gathered.result()
    assert summary.samples == 4 and summary.rate_Hz is None and summary.maximum_time_s is None


def test_provenance_tells_every_step(tmp_path: Path) -> None:
    recording = opened(tmp_path, CSV.replace(",", ";").replace(".", ","), scale=2.0, offset=-1.0, invert=True)
    samples(recording)
    assert recording.provenance == (
        "text in UTF-8, 3 columns between semicolons, decimal comma, numbers from row 2",
        "value = -2 x recorded - 1 mm",
        "unit mm, as the case says, turned into m",
        "4 samples read from 'travel'",
        "time from 't', taken as seconds because no unit is stated",
    )


def test_sha256_is_of_the_file(tmp_path: Path) -> None:
    recording = opened(tmp_path)
    assert recording.sha256 == hashlib.sha256((tmp_path / "work.csv").read_bytes()).hexdigest()


def test_a_small_record_loads_nothing_heavy(tmp_path: Path) -> None:
    (tmp_path / "work.csv").write_text(CSV)
    code = (
        "import sys\nfrom pathlib import Path\nfrom springlife.duty.record import *\n"
        f"summarise(open_record(RecordSpec(Path({str(tmp_path / 'work.csv')!r}), channel=2, time=1, unit='mm')))\n"
        "print(*[m for m in ('pandas', 'pyarrow', 'scipy.io', 'h5py', 'numba') if m in sys.modules])"
    )
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert run.stdout.split() == []
