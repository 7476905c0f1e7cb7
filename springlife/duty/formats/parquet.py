"""Parquet files: one column read row group by row group."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from springlife.duty.formats.arrays import CHUNK
from springlife.duty.formats.table import Chunk, Column, Table, choose_pair
from springlife.errors import InputError

if TYPE_CHECKING:
    from springlife.duty.record import RecordSpec


def read_parquet(path: Path, spec: RecordSpec) -> Table:
    """Open a Parquet file; the unit is the field's metadata ``unit`` or ``units``."""
    import pyarrow.parquet as pq

    with pq.ParquetFile(path) as file:
        schema = file.schema_arrow
    columns = tuple(Column.of(field.name, _unit(field)) for field in schema)
    channel, time = choose_pair(path, columns, spec.channel, spec.time)
    names = list(dict.fromkeys(schema.field(at).name for at in (channel, time) if at is not None))
    if any(schema.names.count(name) > 1 for name in names):
        raise InputError(f"{path}: two columns are named {names[0]!r}; give each its own name")
    for at in (channel, time):
        if at is not None:
            _check(path, schema.field(at), is_time=at == time)

    def chunks() -> Iterator[Chunk]:
        with pq.ParquetFile(path) as file:
            start = 0
            for batch in file.iter_batches(batch_size=CHUNK, columns=names):
                values = _floats(batch[names[0]])
                times = None if time is None else _times(batch[names[1]])
                yield Chunk(values, times, lambda i, start=start: f"row {start + i + 1}")  # type: ignore[misc]
                start += batch.num_rows

    return Table(
        columns,
        columns[channel],
        None if time is None else columns[time],
        chunks,
        steps=(f"Parquet, {len(columns)} columns",),
    )


def _check(path: Path, field: Any, is_time: bool) -> None:
    """Refuse what is no plain number: nested values, decimals, text, flags."""
    import pyarrow.types as types

    plain = types.is_integer(field.type) or types.is_floating(field.type)
    if not (plain or (is_time and types.is_timestamp(field.type))):
        raise InputError(
            f"{path}, column {field.name!r}: holds {field.type}; save it as float64 or choose another column"
        )


def _floats(column: Any) -> Any:
    import pyarrow as pa

    return np.asarray(column.cast(pa.float64(), safe=False).to_numpy(zero_copy_only=False), dtype=np.float64)


def _times(column: Any) -> Any:
    import pyarrow.types as types

    if types.is_timestamp(column.type):
        return column.to_numpy(zero_copy_only=False).astype("datetime64[ns]")
    return _floats(column)


def _unit(field: Any) -> str | None:
    for key, value in (field.metadata or {}).items():
        if key.lower() in (b"unit", b"units"):
            return str(value.decode("utf-8", "replace")).strip() or None
    return None
