"""HDF5 files, MATLAB 7.3 among them: every dataset of numbers is a column, or several."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from springlife.duty.formats.arrays import sliced, table_of
from springlife.duty.formats.table import Chunk, Column, Table, choose_pair, need
from springlife.errors import InputError

if TYPE_CHECKING:
    from springlife.duty.record import RecordSpec

WIDEST = 256  # columns of one dataset; more are taken for samples


@dataclass(frozen=True)
class _Source:
    """Where a column lies: a dataset, and in it a field, a column or a row."""

    dataset: str
    field: str | None = None
    column: int | None = None
    row: int | None = None


@dataclass
class _Slices:
    """A column that reads from the file only what is asked for."""

    dataset: Any
    source: _Source

    @property
    def dtype(self) -> np.dtype[Any]:
        dtype: np.dtype[Any] = self.dataset.dtype
        return dtype[self.source.field] if self.source.field else dtype

    def __len__(self) -> int:
        return int(self.dataset.shape[0 if self.source.row is None else 1])

    def __getitem__(self, part: slice) -> NDArray[Any]:
        source = self.source
        if source.field:
            return np.asarray(self.dataset.fields(source.field)[part])
        if source.column is not None:
            return np.asarray(self.dataset[part, source.column])
        return np.asarray(self.dataset[part] if source.row is None else self.dataset[source.row, part])


def read_hdf5(path: Path, spec: RecordSpec) -> Table:
    """Open an HDF5 file: a channel is a dataset's path, or the last part of it when that is unique.

    Further, "run/log.travel" is a field of a compound dataset and "run/all(:,2)" the second column of a matrix.
    The unit is the dataset's attribute ``unit`` or ``units``.
    """
    h5py = need("h5py", "HDF5", path)
    found: dict[Column, _Source] = {}
    with h5py.File(path, "r") as file:

        def visit(name: str, item: Any) -> None:
            if isinstance(item, h5py.Dataset) and not name.startswith("#"):
                found.update(_columns(name, item))

        file.visititems(visit)
    if not found:
        raise InputError(f"{path}: has no dataset of numbers; save each channel as a dataset")
    titles = tuple(found)
    asked = [w.lstrip("/") if isinstance(w, str) else w for w in (spec.channel, spec.time)]
    channel, time = choose_pair(path, titles, *asked)

    def chunks() -> Iterator[Chunk]:
        with h5py.File(path, "r") as file:
            arrays = [_Slices(file[source.dataset], source) for source in found.values()]
            yield from sliced(path, arrays, titles, channel, time)

    return table_of(titles, channel, time, chunks, f"HDF5, {titles[channel].title}")


def _columns(name: str, dataset: Any) -> dict[Column, _Source]:
    """Name the columns of one dataset; text, images and flags have none."""
    unit, short, shape = _unit(dataset), name.rsplit("/", 1)[-1], dataset.shape
    matlab = dataset.attrs.get("MATLAB_class")
    if not shape or (matlab is not None and bytes(matlab) in (b"char", b"cell", b"logical")):
        return {}
    if dataset.dtype.names and len(shape) == 1:
        return {
            Column(f"{name}.{field}", field, unit): _Source(name, field=field)
            for field in dataset.dtype.names
            if dataset.dtype[field].kind in "iuf"
        }
    if dataset.dtype.kind not in "iuf" or len(shape) > 2:
        return {}
    if len(shape) == 1:
        return {Column(name, short, unit): _Source(name)}
    if 1 in shape:
        return {Column(name, short, unit): _Source(name, row=0) if shape[0] == 1 else _Source(name, column=0)}
    # MATLAB writes its columns as rows.
    sideways = matlab is not None
    count = shape[0 if sideways else 1]
    if count > WIDEST:
        return {}
    return {
        Column(f"{name}(:,{j + 1})", f"{short}(:,{j + 1})", unit): _Source(name, row=j)
        if sideways
        else _Source(name, column=j)
        for j in range(count)
    }


def _unit(dataset: Any) -> str | None:
    for key in dataset.attrs:
        if key.casefold() in ("unit", "units"):
            value = dataset.attrs[key]
            value = value.item() if isinstance(value, np.ndarray) and value.size == 1 else value
            text = value.decode("utf-8", "replace") if isinstance(value, bytes) else str(value)
            return text.strip() or None
    return None
