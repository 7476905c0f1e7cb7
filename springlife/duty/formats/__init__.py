"""One reader a file format. To add one: write a function in a file of this folder and a line in READERS.

A reader takes the path and the :class:`springlife.duty.record.RecordSpec` and returns a
:class:`springlife.duty.formats.table.Table`: which columns the file has, which were chosen, and a function
that streams their raw samples. Scaling, units, gaps and provenance are the record's business.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from contextlib import contextmanager
from dataclasses import dataclass, replace
from functools import partial
from pathlib import Path
from typing import TYPE_CHECKING

from springlife.duty.formats.arrays import read_mat, read_npy, read_npz
from springlife.duty.formats.hdf5 import read_hdf5
from springlife.duty.formats.loggers import read_mdf, read_tdms
from springlife.duty.formats.parquet import read_parquet
from springlife.duty.formats.table import Chunk, Table
from springlife.duty.formats.text import read_text
from springlife.duty.formats.wav import read_wav
from springlife.errors import InputError, SpringlifeError

if TYPE_CHECKING:
    from springlife.duty.record import RecordSpec


@dataclass(frozen=True)
class Format:
    """A binary format: the bytes its files begin with, the endings people give them, and its reader."""

    begins: tuple[bytes, ...]
    endings: tuple[str, ...]
    read: Callable[[Path, RecordSpec], Table]


# Files that begin like none of these are read as text tables.
READERS: dict[str, Format] = {
    "Parquet": Format((b"PAR1",), (".parquet", ".pq"), read_parquet),
    "a NumPy array": Format((b"\x93NUMPY",), (".npy",), read_npy),
    "a NumPy archive": Format((b"PK\x03\x04", b"PK\x05\x06"), (".npz",), read_npz),
    "a MATLAB file": Format((b"MATLAB 5.0",), (".mat",), read_mat),
    "HDF5": Format((b"\x89HDF\r\n\x1a\n", b"MATLAB 7.3"), (".h5", ".hdf5", ".hdf"), read_hdf5),
    "ASAM MDF": Format((b"MDF     ",), (".mf4", ".mdf"), read_mdf),
    "TDMS": Format((b"TDSm",), (".tdms",), read_tdms),
    "WAV": Format((b"RIFF",), (".wav",), read_wav),
}


def open_table(path: Path, spec: RecordSpec) -> Table:
    """Open a file with the reader of its format, which its first bytes tell; the ending must not say otherwise.

    Raises
    ------
    InputError
        The file is not what it claims to be, is damaged, or lacks what was asked for.
    """
    with path.open("rb") as file:
        head = file.read(16)
    for name, kind in READERS.items():
        if head.startswith(kind.begins):
            with _foreign(path, name):
                table = kind.read(path, spec)
            return replace(table, chunks=partial(_guarded, path, name, table))
    claimed = next((name for name, kind in READERS.items() if path.suffix.lower() in kind.endings), None)
    if claimed:
        raise InputError(
            f"{path}: ends in {path.suffix} but does not begin like {claimed}; the file is damaged or misnamed"
        )
    return read_text(path, spec)


def _guarded(path: Path, name: str, table: Table) -> Iterator[Chunk]:
    with _foreign(path, name):
        yield from table.chunks()


@contextmanager
def _foreign(path: Path, name: str) -> Iterator[None]:
    """Turn whatever a library says about a damaged file into one sentence; our own errors and the disk's pass."""
    try:
        yield
    except SpringlifeError:
        raise
    except Exception as error:
        if isinstance(error, OSError) and error.errno is not None:
            raise
        reason = " ".join((str(error) or type(error).__name__).split())[:160]
        raise InputError(
            f"{path}: cannot be read as {name} ({reason}); the file may be damaged or cut short"
        ) from error
