"""Reading a record against raw readers of the same columns: ratios in one run, on one core and on all.

    python tests/benchmarks/bench_reading.py [rows]

"blocks" is what an assessment pays: units, checks of every value and of the clock included. The raw readers
convert the same two columns (time, travel) of three to floats and check nothing. "damage" adds the summary, the
rainflow count and the damage of its cycles by a straight S-N line. What loads once is loaded before, the compiled
loops of counting too. All are timed in turn, and each ratio is the median over the rounds.

"one record in a fresh process" is what a single assessment pays: there counting decides by itself what to load.
"""

from __future__ import annotations

import os
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path
from statistics import median

import numpy as np

from springlife.duty.counting import Tally
from springlife.duty.record import RecordSpec, SummaryAccumulator, open_record, summarise

ROUNDS = 7
COLUMNS = ["t", "travel"]


def write(folder: Path, rows: int) -> None:
    """Write the same record as CSV, Parquet and NumPy: 1 kHz, a random walk in mm with four decimals."""
    import pyarrow as pa
    import pyarrow.csv as arrow_csv
    import pyarrow.parquet as pq

    rng = np.random.default_rng(1)
    t, travel = np.arange(rows) / 1000.0, rng.normal(size=rows).cumsum().round(4)
    table = pa.table({"t": t, "travel": travel, "load": rng.normal(size=rows).round(3)})
    arrow_csv.write_csv(table, folder / "x.csv", arrow_csv.WriteOptions(quoting_header="none"))
    pq.write_table(table, folder / "x.parquet")
    np.save(folder / "x.npy", np.column_stack([t, travel]))


def ours(path: Path, *, time_column: bool = True, summary: bool = False) -> int:
    """Read through open_record."""
    channel, clock = (2, 1) if path.suffix == ".npy" else (COLUMNS[1], COLUMNS[0])
    spec = RecordSpec(path, channel=channel, time=clock if time_column else None, unit="mm")
    recording = open_record(spec)
    return summarise(recording).samples if summary else sum(block.size for block in recording.blocks())


def damage(path: Path) -> int:
    """Read, summarise, count, and add up the damage of ranges in m by N = S^-5."""
    recording = open_record(RecordSpec(path, channel=COLUMNS[1], time=COLUMNS[0], unit="mm"))
    gathered, tally = SummaryAccumulator(recording), Tally(nan="split")
    for block in recording.blocks():
        gathered.feed(block)
        tally.feed(block)
    cycles = tally.result().table()
    assert np.sum(cycles.count * (cycles.high - cycles.low) ** 5.0) > 0
    return gathered.result().samples


def pandas_chunks(path: Path) -> int:
    """Read with the C engine of pandas in chunks of a million rows."""
    import pandas as pd

    chunks = pd.read_csv(path, usecols=COLUMNS, chunksize=1_000_000)
    return sum(len(chunk[COLUMNS].to_numpy()) for chunk in chunks)


def arrow_stream(path: Path) -> int:
    """Read with Arrow's streaming reader."""
    import pyarrow as pa
    import pyarrow.csv as arrow_csv

    convert = arrow_csv.ConvertOptions(include_columns=COLUMNS, column_types={name: pa.float64() for name in COLUMNS})
    batches = arrow_csv.open_csv(path, convert_options=convert)
    return sum(len(batch[0].to_numpy() + batch[1].to_numpy()) for batch in batches)


def arrow_whole(path: Path) -> int:
    """Read with Arrow at once: the whole file and its columns in memory."""
    import pyarrow as pa
    import pyarrow.csv as arrow_csv

    convert = arrow_csv.ConvertOptions(include_columns=COLUMNS, column_types={name: pa.float64() for name in COLUMNS})
    table = arrow_csv.read_csv(path, convert_options=convert)
    return len(table["t"].to_numpy() + table["travel"].to_numpy())


def parquet_raw(path: Path) -> int:
    """Read two Parquet columns at once."""
    import pyarrow.parquet as pq

    table = pq.read_table(path, columns=COLUMNS)
    return len(table["t"].to_numpy() + table["travel"].to_numpy())


def measure(folder: Path, rows: int) -> dict[str, list[float]]:
    """Time each reader in turn, round by round."""
    csv = folder / "x.csv"
    readers: dict[str, Callable[[], int]] = {
        "pandas, C engine, chunks": lambda: pandas_chunks(csv),
        "blocks": lambda: ours(csv),
        "damage": lambda: damage(csv),
        "blocks without time": lambda: ours(csv, time_column=False),
        "blocks and summary": lambda: ours(csv, summary=True),
        "Arrow, streaming": lambda: arrow_stream(csv),
        "Arrow, whole file": lambda: arrow_whole(csv),
        "blocks from Parquet": lambda: ours(folder / "x.parquet"),
        "Parquet, raw": lambda: parquet_raw(folder / "x.parquet"),
        "blocks from NumPy": lambda: ours(folder / "x.npy"),
    }
    took: dict[str, list[float]] = {name: [] for name in readers}
    for number in range(ROUNDS + 1):
        for name, reader in readers.items():
            start = time.perf_counter()
            assert reader() == rows, name
            if number:  # the first round loads and warms
                took[name].append(time.perf_counter() - start)
    return took


def once(folder: str) -> None:
    """Print the time from CSV to damage over reading alone, for the first record that this process counts."""
    csv = Path(folder) / "x.csv"
    ours(csv)  # loads Arrow
    start = time.perf_counter()
    ours(csv)
    middle = time.perf_counter()
    damage(csv)
    print((time.perf_counter() - middle) / (middle - start))


def child(folder: str, rows: str, cores: str) -> None:
    """Measure in this process on the given number of cores."""
    import pyarrow as pa

    import springlife.duty.kernels  # noqa: F401 - loaded, whatever the length

    if cores == "1":
        os.sched_setaffinity(0, {min(os.sched_getaffinity(0))})
        pa.set_cpu_count(1)
    took = measure(Path(folder), int(rows))
    base = took["pandas, C engine, chunks"]
    print(f"{int(rows):.0e} rows, {cores} core(s); pandas in chunks takes {median(base):.2f} s here and is 1.00")
    for name, seconds in took.items():
        print(f"  {name:28s} {ratio(seconds, base):5.2f}   {int(rows) / median(seconds) / 1e6:6.1f} M rows/s")
    print(f"  from CSV to damage over reading alone: {ratio(took['damage'], took['blocks']):.2f}")
    command = [sys.executable, __file__, "--once", folder]  # inherits the cores
    fresh = [float(subprocess.run(command, check=True, capture_output=True).stdout) for _ in range(ROUNDS)]
    print(f"  the same, one record in a fresh process: {median(fresh):.2f}, all: {np.sort(fresh).round(2)}")


def ratio(some: list[float], others: list[float]) -> float:
    """Return the median of the ratios of times taken in one round."""
    return median(a / b for a, b in zip(some, others, strict=True))


def main(rows: int) -> None:
    """Write the fixtures, then measure in fresh processes."""
    with tempfile.TemporaryDirectory() as folder:
        write(Path(folder), rows)
        print(f"CSV of {(Path(folder) / 'x.csv').stat().st_size / 1e6:.0f} MB")
        for cores in ("1", str(os.cpu_count())):
            subprocess.run([sys.executable, __file__, "--child", folder, str(rows), cores], check=True)


if __name__ == "__main__":
    if sys.argv[1:2] == ["--child"]:
        child(*sys.argv[2:])
    elif sys.argv[1:2] == ["--once"]:
        once(*sys.argv[2:])
    else:
        main(int(float(sys.argv[1])) if len(sys.argv) > 1 else 1_000_000)
