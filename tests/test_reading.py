"""Records and blocks become counts once; pieces of a folder join or stay apart as the case says."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from casefile import write_case
from test_findings import QUIET

from springlife.life.assess import assess
from springlife.life.case import load_case
from springlife.life.reading import Beyond, Duty, read_duty

EVENT = 'blocks = [{ low = "5 mm", high = "20 mm", cycles = 100 }]'


def duty(folder: Path, event: str) -> Duty:
    case = load_case(write_case(folder, QUIET.replace(EVENT, event), None))
    return read_duty(case, case.build_spring())


def pieces(folder: Path, *parts: str) -> None:
    (folder / "rides").mkdir()
    for number, part in enumerate(parts, start=1):
        (folder / "rides" / f"ride-{number}.csv").write_text("y\n" + "\n".join(part.split()) + "\n")


RIDES = 'record = "rides"\nchannel = "y"\nunit = "mm"'


def test_folder_joined_is_the_one_long_record(tmp_path: Path) -> None:
    pieces(tmp_path, "5 20 8", "16 4 19", "5 9")
    (tmp_path / "whole.csv").write_text("y\n" + "\n".join(["5", "20", "8", "16", "4", "19", "5", "9"]) + "\n")
    joined, whole = duty(tmp_path, RIDES), duty(tmp_path, RIDES.replace("rides", "whole.csv"))
    assert joined.events[0].count == whole.events[0].count


def test_folder_kept_apart_has_no_cycle_across_its_pieces(tmp_path: Path) -> None:
    pieces(tmp_path, "5 20 8", "16 4 19")
    apart = duty(tmp_path, RIDES + '\nbetween = "split"').events[0].count.table("half")
    # By hand: 5-20 half, 20-8 half; 16-4 half, 4-19 half.
    assert list(zip(np.round(1e3 * apart.low), np.round(1e3 * apart.high), apart.count, strict=True)) == [
        (4.0, 16.0, 0.5), (4.0, 19.0, 0.5), (5.0, 20.0, 0.5), (8.0, 20.0, 0.5),
    ]  # fmt: skip


def test_pattern_takes_the_files_that_fit(tmp_path: Path) -> None:
    pieces(tmp_path, "5 20 8", "16 4 19")
    (tmp_path / "rides" / "notes.txt").write_text("not a record")
    event = RIDES.replace('"rides"', '"rides/ride-*.csv"')
    assert duty(tmp_path, event).events[0].count.maximum == pytest.approx(0.020)
    result = assess(load_case(tmp_path / "case.toml"))
    assert any("ride-1.csv" in line and "ride-2.csv" not in line for line in result.duty.events[0].provenance)  # type: ignore[union-attr]


@pytest.mark.parametrize("size", [1, 3, 100])
def test_beyond_counts_visits_across_blocks(size: int) -> None:
    signal = np.array([0.0, 1, 3, 4, 1, 0, 5, 5, 0, 2, 6, 1])
    watch = Beyond(1.0, 2.5, sample_rate=10.0)
    for start in range(0, signal.size, size):
        watch.feed(signal[start : start + size])
    assert (watch.visits, watch.samples, watch.total, watch.extent) == (3, 5, 12, 3.5)
    assert watch.describe() == "3 times, 5 of 12 samples, 0.5 s"


def test_blocks_watch_cycles(tmp_path: Path) -> None:
    event = duty(
        tmp_path,
        'blocks = [{ low = "-1 mm", high = "20 mm", cycles = 3 }, { low = "2 mm", high = "9 mm", cycles = 7 }]',
    ).events[0]
    assert event.off_seat.describe() == "3 times, 3 of 10 cycles"
    assert event.off_seat.share == pytest.approx(0.3)
