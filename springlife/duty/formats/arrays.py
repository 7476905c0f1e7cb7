"""NumPy arrays and MATLAB files up to version 7: named arrays, one sample a row. Nothing is ever unpickled."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from springlife.duty.formats.table import Chunk, Column, Table, choose_pair
from springlife.errors import InputError

if TYPE_CHECKING:
    from springlife.duty.record import RecordSpec

CHUNK = 1 << 20  # samples
PICKLED = "holds pickled Python objects, which are never loaded; save plain arrays of numbers"


def read_npy(path: Path, spec: RecordSpec) -> Table:
    """Open a NumPy array: one column, columns by number, or the fields of a structured array; read by mapping."""
    columns = _columns_of(path, "", _mapped(path), unnamed=True)
    titles = tuple(Column.of(title) for title in columns)
    channel, time = choose_pair(path, titles, spec.channel, spec.time)

    def chunks() -> Iterator[Chunk]:
        found = list(_columns_of(path, "", _mapped(path), unnamed=True).values())
        yield from sliced(path, found, titles, channel, time)

    return table_of(titles, channel, time, chunks, "NumPy array")


def read_npz(path: Path, spec: RecordSpec) -> Table:
    """Open a NumPy archive: each array of it is a column."""
    import zipfile

    with zipfile.ZipFile(path) as archive:
        names = [name.removesuffix(".npy") for name in archive.namelist() if name.endswith(".npy")]
    if not names:
        raise InputError(f"{path}: is a ZIP archive or a spreadsheet; export the sheet as CSV, or unpack the archive")
    titles = tuple(Column.of(name) for name in names)
    channel, time = choose_pair(path, titles, spec.channel, spec.time)

    def chunks() -> Iterator[Chunk]:
        with np.load(path, allow_pickle=False) as archive:
            found: list[Any] = [None] * len(names)
            for at in {channel, channel if time is None else time}:
                try:
                    found[at] = vector(path, names[at], archive[names[at]])
                except ValueError as error:
                    if "allow_pickle" not in str(error):
                        raise
                    raise InputError(f"{path}, array {names[at]!r}: {PICKLED}") from error
            yield from sliced(path, found, titles, channel, time)

    return table_of(titles, channel, time, chunks, "NumPy archive")


def read_mat(path: Path, spec: RecordSpec) -> Table:
    """Open a MATLAB file of version 5 to 7: vectors, columns "m(:,2)" of matrices, fields "log.travel" of structs."""
    from scipy.io import loadmat

    wanted = [w for w in (spec.channel, spec.time) if w is not None]
    roots = [w.split(".")[0].split("(")[0] for w in wanted if isinstance(w, str)]
    by_name = len(roots) == len(wanted) and spec.channel is not None
    loaded = loadmat(path, simplify_cells=True, variable_names=roots if by_name else None)
    columns = _columns_of(path, "", {name: part for name, part in loaded.items() if not name.startswith("__")})
    if by_name and not set(wanted) <= set(columns):
        # A name is not there as written: read all, so that the message can list what is.
        everything = loadmat(path, simplify_cells=True)
        columns = _columns_of(path, "", {n: part for n, part in everything.items() if not n.startswith("__")})
    if not columns:
        raise InputError(f"{path}: has no array of numbers; save vectors, matrices or structs of them")
    titles = tuple(Column.of(title) if "(:," not in title else Column(title, title) for title in columns)
    channel, time = choose_pair(path, titles, spec.channel, spec.time)
    return table_of(
        titles, channel, time, lambda: sliced(path, list(columns.values()), titles, channel, time), "MATLAB file"
    )


def _mapped(path: Path) -> NDArray[Any]:
    try:
        array: NDArray[Any] = np.load(path, mmap_mode="r", allow_pickle=False)
    except ValueError as error:
        if "object" not in str(error).lower():
            raise
        raise InputError(f"{path}: {PICKLED}") from error
    return array


def _columns_of(path: Path, name: str, value: Any, unnamed: bool = False) -> dict[str, NDArray[Any]]:
    """Name the columns of numbers in an array, a struct or a structured array; text and the like are passed over."""
    if isinstance(value, Mapping):
        found: dict[str, NDArray[Any]] = {}
        for key, part in value.items():
            found |= _columns_of(path, f"{name}.{key}" if name else str(key), part)
        return found
    if not isinstance(value, np.ndarray) or value.ndim == 0:
        return {}
    if value.dtype.names:
        parts = {field: value[field] for field in value.dtype.names}
        return _columns_of(path, name, parts)
    if value.dtype.kind not in "iufM" and not unnamed:
        return {}
    if value.ndim == 1 or value.size == max(value.shape):
        return {name or "column 1": value.reshape(-1)}
    if value.ndim > 2:
        return {}
    if value.shape[1] > value.shape[0]:
        if not unnamed:
            return {}
        raise InputError(
            f"{path}: has {value.shape[0]} rows and {value.shape[1]} columns; save it with one row a sample"
        )
    count = value.shape[1]
    return {f"{name}(:,{j + 1})" if name else f"column {j + 1}": value[:, j] for j in range(count)}


def vector(path: Path, title: str, array: NDArray[Any]) -> NDArray[Any]:
    """Return an array of one column as one-dimensional."""
    if array.ndim == 0 or (array.ndim > 1 and array.size != max(array.shape)):
        raise InputError(f"{path}, array {title!r}: has shape {array.shape}; save one array a channel")
    return array.reshape(-1)


def check_numbers(path: Path, title: str, dtype: np.dtype[Any], is_time: bool) -> None:
    """Refuse what is no real number: text, objects, complex numbers, flags."""
    if dtype.kind not in ("iufM" if is_time else "iuf"):
        raise InputError(f"{path}, column {title!r}: holds {dtype}, not real numbers; choose another column")


def sliced(
    path: Path, arrays: list[Any], titles: tuple[Column, ...], channel: int, time: int | None
) -> Iterator[Chunk]:
    """Yield anything that slices like an array in pieces, the time column beside the channel."""
    values, times = arrays[channel], None if time is None else arrays[time]
    check_numbers(path, titles[channel].title, values.dtype, is_time=False)
    if times is not None and time is not None:
        check_numbers(path, titles[time].title, times.dtype, is_time=True)
        if len(times) != len(values):
            raise InputError(
                f"{path}, column {titles[channel].title!r}: has {len(values)} samples but the time column "
                f"{titles[time].title!r} has {len(times)}; choose the time column of that channel"
            )
    for start in range(0, len(values), CHUNK):
        stop = start + CHUNK
        yield Chunk(
            np.asarray(values[start:stop], dtype=np.float64),
            None if times is None else np.asarray(times[start:stop]),
            lambda i, start=start: f"sample {start + i + 1}",  # type: ignore[misc]
        )


def table_of(titles: tuple[Column, ...], channel: int, time: int | None, chunks: Any, step: str) -> Table:
    """Assemble the table of a format whose columns are arrays."""
    return Table(titles, titles[channel], None if time is None else titles[time], chunks, steps=(step,))
