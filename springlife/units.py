"""Text with units, for people: "4.5 mm" -> 0.0045 and back. Pint lives here and nowhere else.

Inside the program every quantity is a float in SI (m, N, Pa, s, kg, K). Text enters through
:func:`parse` and leaves through :func:`show`.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from functools import cache
from typing import TYPE_CHECKING, Any

from springlife.errors import InputError

if TYPE_CHECKING:
    import pint

# What each kind of quantity is measured in inside the program, and an example for messages.
KINDS: dict[str, tuple[str, str]] = {
    "length": ("m", "4.5 mm"),
    "force": ("N", "120 N"),
    "stress": ("Pa", "241 MPa"),
    "rate": ("N/m", "8.4 N/mm"),
    "time": ("s", "2.5 h"),
    "frequency": ("Hz", "500 Hz"),
    "temperature": ("K", "20 degC"),
    "mass": ("kg", "0.3 kg"),
    "density": ("kg/m^3", "7850 kg/m^3"),
    "velocity": ("m/s", "2 m/s"),
    "angle": ("rad", "30 degree"),
    "number": ("", "1.5"),
}

# Sizes in SI outside which nothing of a spring lies; what is refused here overflows nowhere else.
SMALLEST, GREATEST = 1e-15, 1e15
_NUMBER = r"[+-]?(?:\d+(?:\.\d*)?|\.\d+)(?:[eE][+-]?\d+)?"
_QUANTITY = re.compile(rf"\s*(?P<number>{_NUMBER})(?:\s*/\s*(?P<divisor>\d+))?\s*(?P<unit>[^\d\s].*?)?\s*")
# Units are words, products, quotients and small whole powers: nothing that could cost time to evaluate.
_UNIT = re.compile(r"[A-Za-zµμ°%Ω]+(?:\^?-?[1-4])?(?:\s*[*/·]\s*[A-Za-zµμ°]+(?:\^?-?[1-4])?){0,3}")
# "rpm" counts turns as a frequency does; Pint would make it an angular speed, 2 pi larger.
_SPELLING = {"°C": "degC", "°F": "degF", "°": "degree", "·": "*", "μ": "µ", "rpm": "1/minute"}


@cache
def _registry() -> pint.UnitRegistry[Any]:
    """Load Pint once, when the first quantity with a unit is read."""
    import pint

    registry: pint.UnitRegistry[Any] = pint.UnitRegistry(autoconvert_offset_to_baseunit=True)
    registry.define("kpsi = 1000 psi")
    registry.define("Mpsi = 1e6 psi")
    return registry


@cache
def _unit(text: str) -> Any:
    """Look a unit up; the message says what a unit looks like."""
    spelled = text.strip()
    if not _UNIT.fullmatch(spelled) or len(spelled) > 40:
        raise InputError(f"{text!r} is not a unit; write one such as 'mm', 'N/mm', 'MPa' or 'lbf/in'")
    for sign, word in _SPELLING.items():
        spelled = spelled.replace(sign, word)
    spelled = re.sub(r"(?<=[A-Za-zµ])\^?(-?[1-4])", r"**\1", spelled)
    registry = _registry()
    try:
        return registry.Unit(spelled)
    except Exception as error:  # Pint raises a family of its own, plus tokenizer errors
        raise InputError(f"unit {text!r} is not known; write one such as 'mm', 'N/mm', 'MPa' or 'lbf/in'") from error


def is_unit(text: str) -> bool:
    """Tell whether a word is a physical unit ("h", "km") rather than a counting word ("start")."""
    try:
        _unit(text)
    except InputError:
        return False
    return True


def factor(unit: str, kind: str) -> tuple[float, float]:
    """Return ``(scale, offset)`` that turn a number in ``unit`` into SI: ``si = scale * x + offset``.

    Raises
    ------
    InputError
        When the unit is unknown or measures something other than ``kind``.
    """
    si, example = KINDS[kind]
    found = _unit(unit)
    target = _unit(si) if si else _registry().dimensionless
    if found.dimensionality != target.dimensionality:
        raise InputError(f"unit {unit!r} is not a {kind}; write one such as {example!r}")
    registry = _registry()
    offset = float(registry.Quantity(0.0, found).to(target).magnitude)
    one = float(registry.Quantity(1.0, found).to(target).magnitude)
    return one - offset if offset else one, offset


def split(text: str) -> tuple[float, str]:
    """Split ``"7/16 in"`` into its number and its unit text (empty when there is none).

    Raises
    ------
    InputError
        When the text does not start with one finite number.
    """
    if not isinstance(text, str):
        raise InputError(f'{text!r} has no unit; write it as text with its unit, such as "{text} mm"')
    if re.match(r"\s*[+-]?\d+,\d", text):
        raise InputError(f"{text!r} has a decimal comma; write a decimal point")
    match = _QUANTITY.fullmatch(text)
    if not match:
        raise InputError(f"{text!r} is not a number with a unit; write one such as '4.5 mm'")
    number = float(match["number"])
    if match["divisor"]:
        if int(match["divisor"]) == 0:
            raise InputError(f"{text!r} divides by zero")
        divisor = float(match["divisor"])
        number = number / divisor if math.isfinite(divisor) else math.inf
    if not math.isfinite(number):
        raise InputError(f"{text!r} is not finite")
    return number, (match["unit"] or "").strip()


def parse(text: str, kind: str) -> float:
    """Turn text with a unit into a float in SI.

    Parameters
    ----------
    text : str
        Number and unit, such as ``"4.5 mm"``, ``"7/16 in"`` or ``"20 degC"``.
    kind : str
        One of :data:`KINDS`.

    Raises
    ------
    InputError
        No unit, an unknown unit, a unit of another kind, or a number that is not finite.
    """
    number, unit = split(text)
    example = KINDS[kind][1]
    if kind == "number":
        if unit:
            raise InputError(f"{text!r} should be a plain number such as {example!r}")
        return number
    if not unit:
        raise InputError(f"{text!r} has no unit; write a {kind} such as {example!r}")
    scale, offset = factor(unit, kind)
    value = number * scale + offset
    if value and not SMALLEST <= abs(value) <= GREATEST:
        raise InputError(f"{text!r} is beyond any {kind} of a spring; check its digits and unit")
    return value


def convert(value: float, unit: str, kind: str) -> float:
    """Give an SI value in ``unit``."""
    scale, offset = factor(unit, kind)
    return (value - offset) / scale


def show(value: float | None, unit: str, kind: str, digits: int = 4) -> str:
    """Write an SI value in ``unit`` with the given significant digits; ``None`` reads "unlimited"."""
    if value is None:
        return "unlimited"
    return f"{significant(convert(value, unit, kind), digits)} {unit}"


def significant(number: float, digits: int = 4) -> str:
    """Round to significant digits without an exponent until the number needs one.

    >>> significant(12345.6), significant(0.0123456), significant(1.5e9)
    ('12350', '0.01235', '1.5e9')
    """
    if number == 0:
        return "0"
    if not math.isfinite(number):
        return str(number)
    rounded = float(f"{number:.{digits}g}")
    magnitude = math.floor(math.log10(abs(rounded)))
    if -4 <= magnitude < 7:
        places = max(0, digits - 1 - magnitude)
        text = f"{rounded:.{places}f}"
        return text.rstrip("0").rstrip(".") if "." in text else text
    mantissa, exponent = f"{rounded:.{digits - 1}e}".split("e")
    return f"{mantissa.rstrip('0').rstrip('.')}e{int(exponent)}"


def ratio(amount: str, per: str) -> float:
    """Return how many ``per`` make up ``amount``: ``ratio("8000 h", "2.5 h")`` is 3200.

    Either both are physical quantities of one dimension, or both use the same counting word
    ("1 start", "20000 starts").

    Raises
    ------
    InputError
        When the two cannot be compared, or ``per`` is zero.
    """
    (top, top_unit), (bottom, bottom_unit) = split(amount), split(per)
    if bottom == 0:
        raise InputError(f"{per!r} is zero; one pass must be greater than zero")
    for text, number in ((amount, top), (per, bottom)):
        if number and not SMALLEST <= abs(number) <= GREATEST:
            raise InputError(f"{text!r} is beyond any duty; check its digits and unit")
    if _word(top_unit) == _word(bottom_unit):
        return top / bottom
    if not (is_unit(top_unit) and is_unit(bottom_unit)):
        raise InputError(f"{amount!r} cannot be counted in {per!r}; use one unit or counting word for both")
    registry = _registry()
    above, below = registry.Quantity(top, _unit(top_unit)), registry.Quantity(bottom, _unit(bottom_unit))
    if above.dimensionality != below.dimensionality:
        raise InputError(f"{amount!r} cannot be converted to {per!r}; use units of one kind for both")
    return float((above / below).to("").magnitude)


def _word(unit: str) -> str:
    """Singular and plural of a counting word are one word."""
    if unit.endswith(("sses", "ches", "shes")):
        return unit[:-2]
    return unit[:-1] if len(unit) > 3 and unit.endswith("s") and not unit.endswith("ss") else unit


@dataclass(frozen=True)
class UnitSystem:
    """The units in which a person reads results: those of the drawing."""

    name: str
    units: dict[str, str]

    def __call__(self, value: float | None, kind: str, digits: int = 4) -> str:
        """Write an SI value of one kind with its unit."""
        return show(value, self.units[kind], kind, digits)

    def number(self, value: float, kind: str, digits: int = 4) -> str:
        """Write an SI value without its unit, for table columns that name it once."""
        return significant(convert(value, self.units[kind], kind), digits)


_COMMON = {"time": "h", "frequency": "Hz", "velocity": "m/s"}
METRIC = UnitSystem(
    "metric",
    {
        "length": "mm", "force": "N", "stress": "MPa", "rate": "N/mm", "mass": "g", "temperature": "degC", **_COMMON
    },
)  # fmt: skip
INCH = UnitSystem(
    "inch",
    {
        "length": "in", "force": "lbf", "stress": "kpsi", "rate": "lbf/in", "mass": "lb", "temperature": "degF",
        **_COMMON,
    },
)  # fmt: skip


def system_of(length: str) -> UnitSystem:
    """Choose the system of a length written in a drawing: inches and feet read as inch units."""
    return INCH if split(length)[1] in {"in", "inch", "inches", "ft", "foot", "mil", "thou"} else METRIC
