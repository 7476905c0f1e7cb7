"""The error family: every mistake a user can make ends in one of these.

A message is one sentence: the file, the key or column, the value seen, and what would be right.
Each class is also a builtin error, so ``except ValueError`` keeps working.
"""

from __future__ import annotations

TYPE_CHECKING = False  # see springlife/__init__.py
if TYPE_CHECKING:
    from collections.abc import Iterable


class SpringlifeError(Exception):
    """Base of all errors that this package raises on purpose."""


class InputError(SpringlifeError, ValueError):
    """A value, file content or argument that cannot be used as given."""


class FileError(SpringlifeError, OSError):
    """A file that is missing, unreadable, or already there."""

    def __str__(self) -> str:
        """Give the sentence alone; OSError would add its own framing."""
        return str(self.args[0]) if self.args else ""


class GapError(InputError):
    """A record with missing samples, or with time that jumps or goes back."""


class CriterionError(InputError):
    """A fatigue criterion that has no value for the strengths or stresses given."""


class MissingExtraError(SpringlifeError, ImportError):
    """A file format or feature whose optional library is not installed."""


def nearest(name: str, valid: Iterable[str]) -> str:
    """Say which valid name is closest, then list them all, as the tail of a message."""
    import difflib

    names = [str(v) for v in valid]
    close = difflib.get_close_matches(str(name), names, n=1, cutoff=0.6)
    listing = ", ".join(names)
    return f"did you mean {close[0]!r}? Valid: {listing}" if close else f"valid: {listing}"
