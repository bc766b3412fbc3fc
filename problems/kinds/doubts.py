"""What is uncertain of a plate or a stack: what the case states, or what is usual without a word.

Turns the table [uncertain] into `Uncertain` inputs. What each changes in an evaluation is in
`sampled`.
"""

from __future__ import annotations

from collections.abc import Iterator

from problems.case import Case
from problems.spreads import MEANINGS, Spread
from problems.uncertain import Uncertain

_UNITS = {"inlet": "K", "gap": "m", "wire": "m", "wire_place": "m", "fouling": "m2 K/W"}
IN_CASE = "as stated"


def _share(half: float) -> Spread:
    return Spread("plus_minus", -half, half, True, "normal")


# what is taken where the case has no table [uncertain], with the reason
_USUAL: dict[str, tuple[Spread, str]] = {
    "onset": (
        Spread("factor", 1.0 / 1.5, 1.5, True, "log-uniform"),
        "laws of onset are good to a factor 1.5 either way (common practice)",
    ),
    "laminar_heat": (_share(0.10), "real inlets and streams (common practice)"),
    "turbulent_heat": (
        _share(0.11),
        "air data within 11 % (Lienhard 2020), taken for other fluids too",
    ),
    "laminar_friction": (_share(0.08), "5 to 10 % (common practice)"),
    "turbulent_friction": (_share(0.08), "5 to 10 % (common practice)"),
    "gap": (
        Spread("plus_minus", -1e-4, 1e-4, False, "uniform"),
        "ISO 2768-1 medium, 0.5 to 6 mm (from memory)",
    ),
    "wire": (
        Spread("plus_minus", -0.05, 0.05, True, "uniform"),
        "wire as bought (common practice)",
    ),
    "wire_place": (
        Spread("plus_minus", -2e-3, 2e-3, False, "uniform"),
        "mounted by hand (common practice)",
    ),
    "wire_drag": (
        Spread("factor", 0.6, 1.2, True, "uniform"),
        "0.6 to 1.2 about 1.0 (from memory)",
    ),
    "wire_criterion": (_share(0.10), "826 and 900 are published (from memory)"),
    "fan_efficiency": (_share(0.05), "efficiency as stated or tested (common practice)"),
}


def doubts(case: Case) -> tuple[Uncertain, ...]:
    """The uncertain inputs of a case, those that are exact left out."""
    return tuple(found for found in _all(case) if not found.exact)


def taken_as_exact(case: Case) -> tuple[str, ...]:
    """What could be uncertain of a case and is taken as exact, by key."""
    uncertain = {found.name for found in doubts(case)}
    return tuple(key for key in _sensible(case) if key not in uncertain)


def _all(case: Case) -> Iterator[Uncertain]:
    table = case.uncertain
    stated = {} if table is None else table.stated
    usual = table is None or table.others == "usual"
    for key in _sensible(case):
        if key in stated:
            yield _input(case, key, stated[key], IN_CASE, False)
        elif usual and key in _USUAL:
            yield _input(case, key, *_USUAL[key], True)


def _sensible(case: Case) -> tuple[str, ...]:
    """The keys that mean something for a case."""
    absent = set()
    if case.plates.gap is None:
        absent.add("gap")
    if case.trip is None:
        absent |= {key for key in MEANINGS if key.startswith("wire")}
    if case.fluid.turbulence is None:
        absent.add("turbulence")
    return tuple(key for key in MEANINGS if key not in absent)


def _input(case: Case, key: str, spread: Spread, source: str, usual: bool) -> Uncertain:
    """The input that a spread means for the case."""
    nominal = _nominal(case, key)
    low, high = spread.low, spread.high
    unit = _UNITS.get(key, "1")
    if spread.form == "plus_minus" and not spread.relative:
        unit = "delta K" if unit == "K" else unit
        return Uncertain(
            key, unit, MEANINGS[key], "change", 0.0, low, high, spread.shape, source, usual
        )
    if spread.form == "range":
        return Uncertain(
            key, unit, MEANINGS[key], "value", nominal, low, high, spread.shape, source, usual
        )
    if spread.form == "plus_minus":
        low, high = 1.0 + low, 1.0 + high
    return Uncertain(key, "1", MEANINGS[key], "factor", 1.0, low, high, spread.shape, source, usual)


def _nominal(case: Case, key: str) -> float:
    """What the case has where a range of absolute values may be stated."""
    drag = 1.0 if case.trip is None else case.trip.drag_coefficient
    return {
        "turbulence": 0.01 * (case.fluid.turbulence or 0.0),
        "inlet": case.fluid.temperature,
        "wire_drag": drag,
        "fan_efficiency": case.fan.efficiency,
    }.get(key, 0.0)
