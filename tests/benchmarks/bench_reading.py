"""Reading a record against raw readers of the same columns: ratios in one run, on one core and on all.

    python tests/benchmarks/bench_reading.py [rows]

"blocks" is what an assessment pays: units, checks of every value and of the clock included. The raw readers
convert the same two columns (time, travel) of three to floats and check nothing. What loads once is loaded
before; from 200 MB on that includes the compiled kernel.
"""

from __future__ import annotations

import os
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np

from springlife.duty.record import RecordSpec, open_record, summarise

ROUNDS = 3
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


def measure(folder: Path, rows: int) -> dict[str, float]:
    """Time each reader; the least of a few rounds, taken in turn."""
    csv = folder / "x.csv"
    readers: dict[str, Callable[[], int]] = {
        "pandas, C engine, chunks": lambda: pandas_chunks(csv),
        "Arrow, streaming": lambda: arrow_stream(csv),
        "Arrow, whole file": lambda: arrow_whole(csv),
        "blocks": lambda: ours(csv),
        "blocks without time": lambda: ours(csv, time_column=False),
        "blocks and summary": lambda: ours(csv, summary=True),
        "blocks from Parquet": lambda: ours(folder / "x.parquet"),
        "Parquet, raw": lambda: parquet_raw(folder / "x.parquet"),
        "blocks from NumPy": lambda: ours(folder / "x.npy"),
    }
    best = dict.fromkeys(readers, np.inf)
    for _ in range(ROUNDS):
        for name, reader in readers.items():
            start = time.perf_counter()
            assert reader() == rows, name
            best[name] = min(best[name], time.perf_counter() - start)
    return best


def child(folder: str, rows: str, cores: str) -> None:
    """Measure in this process on the given number of cores."""
    import pyarrow as pa

    if cores == "1":
        os.sched_setaffinity(0, {min(os.sched_getaffinity(0))})
        pa.set_cpu_count(1)
    best = measure(Path(folder), int(rows))
    base = best["pandas, C engine, chunks"]
    print(f"{int(rows):.0e} rows, {cores} core(s); pandas in chunks takes {base:.2f} s here and is 1.00")
    for name, seconds in best.items():
        print(f"  {name:28s} {seconds / base:5.2f}   {int(rows) / seconds / 1e6:6.1f} M rows/s")


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
    else:
        main(int(float(sys.argv[1])) if len(sys.argv) > 1 else 1_000_000)
