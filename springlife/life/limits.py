"""Thresholds of the findings, read from the data file; a case may set its own."""

from __future__ import annotations

import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from importlib.resources import files

from springlife.errors import InputError, nearest


@dataclass(frozen=True)
class Limit:
    """One threshold: its value, what it limits and where it comes from."""

    value: float
    meaning: str
    source: str
    provenance: str


def _load() -> dict[str, Limit]:
    text = files("springlife").joinpath("data/limits.toml").read_text(encoding="utf-8")
    return {key: Limit(**entry) for key, entry in tomllib.loads(text).items()}


LIMITS: dict[str, Limit] = _load()


def limit_values(overrides: Mapping[str, float]) -> dict[str, float]:
    """Return every threshold's value, those of the case in place of the data file's."""
    return {key: limit.value for key, limit in LIMITS.items()} | dict(overrides)


# Limits that are shares, and pairs of which the first must be the lower.
SHARES = {
    "clash_allowance", "lift_off_fraction", "one_cycle_share", "half_rate_change", "drift_share", "noise_range",
    "noise_share", "duration_mismatch", "rate_mismatch", "impact_share", "surge_power",
}  # fmt: skip
ORDERED = (
    ("index_least", "index_low"), ("index_low", "index_high"), ("index_high", "index_greatest"),
    ("tensile_low_MPa", "tensile_high_MPa"), ("slope_low", "slope_high"),
)  # fmt: skip


def check_limits(overrides: Mapping[str, float]) -> None:
    """Refuse limits that are unknown or that no check could use.

    Raises
    ------
    InputError
        An unknown name, a value that is not above zero (shares may be zero), a share of one or more, a yield factor
        under 1, or a
        lower limit that is not below its upper one.
    """
    for key, value in overrides.items():
        if key not in LIMITS:
            raise InputError(f"limits.{key} is not known; {nearest(key, LIMITS)}")
        if not (0 <= value < 1 if key in SHARES else value > 0):
            wanted = "a share from 0 to under 1" if key in SHARES else "above zero"
            raise InputError(f"limits.{key} is {value:g}; it must be {wanted}")
    if overrides.get("yield_factor", 1.0) < 1:
        raise InputError(f"limits.yield_factor is {overrides['yield_factor']:g}; it must be at least 1")
    values = limit_values(overrides)
    for low, high in ORDERED:
        if not values[low] < values[high]:
            raise InputError(f"limits.{low} is {values[low]:g}; it must be below {high}, {values[high]:g}")
