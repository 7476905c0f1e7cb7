"""springlife: fatigue life of helical compression springs under recorded or specified duty.

The public names load their modules on first use, so importing the package costs next to nothing.
"""

from __future__ import annotations

TYPE_CHECKING = False  # typing itself costs as much as the rest of this file
if TYPE_CHECKING:
    from typing import Any

__version__ = "0.1.0"

_PUBLIC = {
    "HelicalSpring": "springlife.spring.helical",
    "grade": "springlife.spring.grade",
    "count": "springlife.duty.counting",
    "Count": "springlife.duty.counting",
    "load_case": "springlife.life.case",
    "assess": "springlife.life.assess",
    "compare": "springlife.life.compare",
    "SpringlifeError": "springlife.errors",
}

__all__ = ["__version__", *sorted(_PUBLIC)]


def __getattr__(name: str) -> Any:
    """Import the module that holds a public name when the name is first asked for."""
    if name not in _PUBLIC:
        raise AttributeError(f"module 'springlife' has no attribute {name!r}")
    import importlib

    return getattr(importlib.import_module(_PUBLIC[name]), name)


def __dir__() -> list[str]:
    """List the public names without importing them."""
    return list(__all__)
