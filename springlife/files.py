"""Files are written beside their place and renamed into it: whole or not at all, never over another unasked."""

from __future__ import annotations

import os
import tempfile
from collections.abc import Callable
from pathlib import Path

from springlife.errors import FileError


def write_file(path: str | Path, write: Callable[[Path], object], *, force: bool = False) -> Path:
    """Have ``write`` fill a temporary file beside ``path``, then rename it into place.

    Parameters
    ----------
    path : str or Path
        Where the file shall be; its folder must exist.
    write : callable
        Takes the temporary path, which has the same suffix.
    force : bool
        Write over a file that is already there.

    Raises
    ------
    FileError
        The file is there already, the folder is not, or the disk refuses.
    """
    path = Path(path)
    if path.is_dir():
        raise FileError(f"{path}: is a directory; name a file in it")
    if path.exists() and not force:
        raise FileError(f"{path}: is there already; choose another name or add --force")
    if not path.parent.is_dir():
        raise FileError(f"{path}: the folder {path.parent} does not exist; make it first")
    try:
        handle, name = tempfile.mkstemp(prefix=f".{path.stem}-", suffix=path.suffix, dir=path.parent)
    except OSError as error:
        raise FileError(f"{path}: cannot be written ({error.strerror}); choose another folder") from error
    os.close(handle)
    beside = Path(name)
    try:
        write(beside)
        beside.chmod(0o644)
        beside.replace(path)
    except OSError as error:
        raise FileError(f"{path}: cannot be written ({error.strerror or error}); choose another place") from error
    finally:
        beside.unlink(missing_ok=True)
    return path
