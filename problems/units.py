"""Quantities as the user writes them, "40 mm" or "150 m3/h", to SI and back for the eye.

Inside the program every number is SI; this is the only module that knows another unit. What a
quantity may be (above 0, a share, a range) is for the case file to say, not for this module.
"""

from __future__ import annotations

import math
import re
from collections.abc import Callable
from functools import cache
from typing import TYPE_CHECKING, Any

import numpy as np

if TYPE_CHECKING:
    from numpy.typing import ArrayLike, NDArray

# unit of an SI outcome -> suffix of its column in front.csv
_SUFFIX = {
    "": "",
    "1": "",
    "m": "_m",
    "m2": "_m2",
    "m3": "_m3",
    "m/s": "_m_s",
    "m3/s": "_m3_s",
    "kg": "_kg",
    "kg/s": "_kg_s",
    "kg/m3": "_kg_m3",
    "W": "_W",
    "W/m2": "_W_m2",
    "W/(m2 K)": "_W_m2K",
    "m2 K/W": "_m2K_W",
    "N": "_N",
    "Pa": "_Pa",
    "K": "_K",
    "delta K": "_K",
    "turn/s": "_per_s",
    "W/(m3/s)": "_W_per_m3_s",
    "kWh": "_kWh",
    "money": "",
}

# SI unit -> how it is shown: from this size on, the label, and shown = SI * factor + offset
_SHOWN: dict[str, tuple[tuple[float, str, float, float], ...]] = {
    "": ((0.0, "", 1.0, 0.0),),
    "1": ((0.0, "", 1.0, 0.0),),
    "m": ((0.0, "mm", 1e3, 0.0), (1.0, "m", 1.0, 0.0)),
    "m2": ((0.0, "m²", 1.0, 0.0),),
    "m3": ((0.0, "m³", 1.0, 0.0),),
    "m/s": ((0.0, "m/s", 1.0, 0.0),),
    "m3/s": ((0.0, "m³/h", 3600.0, 0.0),),
    "kg": ((0.0, "kg", 1.0, 0.0),),
    "kg/s": ((0.0, "kg/s", 1.0, 0.0),),
    "kg/m3": ((0.0, "kg/m³", 1.0, 0.0),),
    "W": ((0.0, "W", 1.0, 0.0), (1e4, "kW", 1e-3, 0.0)),
    "W/m2": ((0.0, "W/m²", 1.0, 0.0), (1e5, "kW/m²", 1e-3, 0.0)),
    "W/(m2 K)": ((0.0, "W/(m² K)", 1.0, 0.0),),
    "m2 K/W": ((0.0, "m² K/W", 1.0, 0.0),),
    "N": ((0.0, "N", 1.0, 0.0),),
    "Pa": ((0.0, "Pa", 1.0, 0.0), (1e4, "kPa", 1e-3, 0.0)),
    "K": ((0.0, "°C", 1.0, -273.15),),
    "delta K": ((0.0, "K", 1.0, 0.0),),
    "turn/s": ((0.0, "rpm", 60.0, 0.0),),
    "W/(m3/s)": ((0.0, "W/(m³/s)", 1.0, 0.0),),
    "kWh": ((0.0, "kWh", 1.0, 0.0), (1e4, "MWh", 1e-3, 0.0)),
    "money": ((0.0, "", 1.0, 0.0),),
}

_QUANTITY = re.compile(r"([+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d{1,3})?)\s*(.*)", re.DOTALL)
# only products and quotients of named units with one-digit powers, never an expression to work out
_FACTOR = r"[A-Za-z]{1,30}(?:\^?-?\d)?"
_PRODUCT = rf"{_FACTOR}(?:[*/ ]{_FACTOR}){{0,4}}"
_UNIT = re.compile(rf"{_PRODUCT}(?:/\({_PRODUCT}\))?(?:/{_FACTOR})?")
_MICRO = ("\u00b5", "\u03bc")  # the sign for micro and the Greek letter look alike
_SPELLING = {"²": "2", "³": "3", "°": "deg", "%": "percent", "·": "*", "**": "^"}
_SPELLING |= dict.fromkeys(_MICRO, "u")


class QuantityError(ValueError):
    """A text or number that is not a finite quantity of the wanted unit."""


def suffix(unit: str) -> str:
    """Column suffix of an SI unit: "m/s" -> "_m_s", a bare number -> ""."""
    return _SUFFIX[unit]


@cache
def _registry() -> Any:
    import pint

    return pint.UnitRegistry()


def _pint_unit(text: str) -> Any:
    for written, meant in _SPELLING.items():
        text = text.replace(written, meant)
    text = re.sub(r"\s*([*/()])\s*", r"\1", text)
    if not _UNIT.fullmatch(text):
        raise QuantityError(text)
    powers = re.sub(r"([A-Za-z])\^?(-?\d)", r"\1**\2", text)
    return _registry().parse_units(powers.replace(" ", "*"))


@cache
def _line(written: str, unit: str) -> tuple[float, float]:
    """Factor and offset that take a number in the unit `written` to the SI unit `unit`."""
    base = _registry().parse_units("") if unit in ("", "1", "money") else _pint_unit(unit)
    try:
        given = _pint_unit(written)
        offset, one = (_registry().Quantity(x, given).to(base).magnitude for x in (0.0, 1.0))
    except Exception as error:  # on odd text pint's parser raises whatever its parts raise
        raise QuantityError(written) from error
    return float(one - offset), float(offset)


def to_si(value: object, unit: str) -> float:
    """The number in the SI unit `unit` that `value` means.

    `value` is a text such as "40 mm", "25 degC", "150 m3/h", "6 %", or a bare number, which is
    SI already. `unit` is one of the SI units of the outcomes; "delta K" is a temperature
    difference, in which "5 degC" has no meaning.

    Raises QuantityError where `value` is anything else, is of another dimension or not finite.
    """
    if isinstance(value, int | float) and not isinstance(value, bool):
        return _finite(float(value) if abs(value) < 1e300 else math.inf, value)
    if not isinstance(value, str) or not (parts := _QUANTITY.fullmatch(value.strip())):
        raise QuantityError(value)
    number, written = float(parts[1]), parts[2].strip()
    if not written:
        return _finite(number, value)
    if unit == "delta K":
        factor, offset = _line(written, "K")
        if offset:
            raise QuantityError(value)
    else:
        factor, offset = _line(written, unit)
    return _finite(number * factor + offset, value)


def _finite(number: float, value: object) -> float:
    if not math.isfinite(number):
        raise QuantityError(value)
    return number


def shown(unit: str, size: float = 0.0) -> tuple[str, float, float]:
    """Label, factor and offset by which the SI unit `unit` is shown: shown = SI * factor + offset.

    `size` is the largest absolute value to be shown; it decides between mm and m, W and kW.
    """
    steps = _SHOWN[unit]
    fitting = [step for step in steps if step[0] <= abs(size)] or steps
    return fitting[-1][1:]


def format_number(value: float) -> str:
    """Four significant digits, plain up to a million, never an exponent that hides a zero."""
    if not math.isfinite(value):
        return str(value)
    if value and not 1e-4 <= abs(value) < 999_950:
        mantissa, power = f"{value:.3e}".split("e")
        return f"{mantissa.rstrip('0').rstrip('.')}e{int(power)}"
    digits = 3 - math.floor(math.log10(abs(value))) if value else 0
    text = f"{round(value, digits):.{max(digits, 0)}f}"
    return text.rstrip("0").rstrip(".") if "." in text else text


def format_value(value: float, unit: str) -> str:
    """A value in the SI unit `unit` as an engineer prints it: 0.04, "m" -> "40 mm"."""
    label, factor, offset = shown(unit, value)
    number = value * factor + offset
    return f"{format_number(round(number, 2) if offset else number)} {label}".rstrip()


def axis_unit(
    unit: str, values: ArrayLike
) -> tuple[str, Callable[[ArrayLike], NDArray[np.float64]]]:
    """Label for an axis that carries `values` (any shape, SI), and what takes SI to that label."""
    sizes = np.abs(np.asarray(values, dtype=float))
    sizes = sizes[np.isfinite(sizes)]
    label, factor, offset = shown(unit, float(sizes.max(initial=0.0)))
    return label, lambda si: np.asarray(si, dtype=float) * factor + offset
