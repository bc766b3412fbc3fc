"""Where fluid properties come from: CoolProp, asked for one fluid in one phase at one pressure.

Knows which names and states CoolProp has and says clearly what is missing. Making tables of
the answers, and keeping them, is left to `fluids`.

Sources: CoolProp (Bell et al. 2014, Ind. Eng. Chem. Res. 53, 2498-2508) and the reference
equations it carries (IAPWS for water, Lemmon for dry air, ASHRAE RP-1485 for humid air).
"""

from __future__ import annotations

import contextlib
import difflib
import re
from collections.abc import Callable, Iterable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

OWN_NAMES = ("air", "humid air", "water")
_MARGIN = 0.05  # K that a source keeps away from boiling, condensing and freezing
_HUMID_AIR = (130.0 + _MARGIN, 623.15 - _MARGIN)  # K, bounds of CoolProp's humid air
_TOUCH = 1e-3  # K, where the bound itself is a state but some releases refuse it

# CoolProp's symbols in the order of a source's rows, and what they stand for
SYMBOLS = {
    "D": "density",
    "V": "viscosity",
    "L": "thermal conductivity",
    "C": "heat capacity",
    "A": "speed of sound",
}


class FluidError(ValueError):
    """A fluid, or a state of it, without properties.

    `key` names the input at fault ("name", "pressure", "temperature", "humidity", "altitude"),
    `value` is what was given, `allowed` says in words what can be had.
    """

    def __init__(self, key: str, value: object, allowed: str) -> None:
        self.key, self.value, self.allowed = key, value, allowed
        super().__init__(f"fluid {key} = {value!r}: {allowed}")


@dataclass(frozen=True)
class Source:
    """Where a table comes from: `sample` takes temperatures (n,) to the rows of `SYMBOLS`.

    An incompressible liquid has no row for the speed of sound. `floor` and `ceiling` [K] bound
    the temperatures at which `sample` may be asked.
    """

    name: str
    pressure: float
    phase: str
    floor: float
    ceiling: float
    sample: Callable[[Floats], Floats]
    saturation_temperature: float | None = None
    freezing_point: float | None = None
    dew_point: float | None = None
    humidity_ratio: float | None = None


def source_of(name: str, pressure: float, reference: float, humidity: float | None) -> Source:
    """The source for a fluid in the phase that it has at the `reference` temperature."""
    if humidity is not None:
        found = _humid_air(pressure, reference, humidity)
    elif _is_liquid(name):
        found = _incompressible("INCOMP::" + name[8:], pressure)
    else:
        check_name(name)
        found = _pure(name, pressure, reference)
    if not found.floor - 0.1 <= reference <= found.ceiling + 0.1:
        span = f"from {found.floor:.2f} K to {found.ceiling:.2f} K"
        raise FluidError("temperature", reference, f"{name} at {pressure:g} Pa is known {span}")
    return found


def _rows(symbols: Iterable[str], pressure: float, name: str) -> Callable[[Floats], Floats]:
    """A sampler of those properties, as `Source.sample`."""
    from CoolProp import CoolProp

    def row(symbol: str, temperature: Floats) -> Floats:
        try:
            found = CoolProp.PropsSI(symbol, "T", temperature, "P", pressure, name)
        except ValueError as error:
            raise FluidError("name", name, _no(symbol, pressure)) from error
        return _complete(np.asarray(found), symbol, temperature, pressure, name)

    return lambda temperature: np.stack([row(symbol, temperature) for symbol in symbols])


def _complete(row: Floats, symbol: str, temperature: Floats, pressure: float, name: str) -> Floats:
    """The row itself; raises FluidError where a value is missing or no more than a filler."""
    missing = ~(np.isfinite(row) & (row > 0.0))
    if missing.any():
        where = f" and {temperature[missing][0]:.2f} K"
        raise FluidError("name", name, _no(symbol, pressure, where))
    return row


def _no(symbol: str, pressure: float, where: str = "") -> str:
    return f"CoolProp has no {SYMBOLS[symbol]} for it at {pressure:g} Pa{where}; choose another"


def _pure(name: str, pressure: float, reference: float) -> Source:
    """A pure or pseudo-pure fluid, liquid or gas, from its equation of state."""
    from CoolProp import CoolProp

    most = CoolProp.PropsSI("pmax", name)
    if pressure > most:
        raise FluidError("pressure", pressure, f"{name} is known up to {most:g} Pa")
    floor, ceiling = CoolProp.PropsSI("Tmin", name) + _TOUCH, CoolProp.PropsSI("Tmax", name)
    phase, saturation = _phase(name, pressure, reference)
    freezing = None
    if phase == "liquid":
        freezing = _freezing(name, pressure)
        floor = max(floor, freezing + _TOUCH)
    if saturation is not None and phase == "liquid":
        ceiling = saturation - _MARGIN
    elif saturation is not None:
        floor = max(floor, saturation + _MARGIN)
    sample = _rows(SYMBOLS, pressure, name)
    return Source(name, pressure, phase, floor, ceiling, sample, saturation, freezing)


def _phase(name: str, pressure: float, reference: float) -> tuple[str, float | None]:
    """Phase of a pure fluid at a temperature, and the temperature [K] where that phase ends."""
    from CoolProp import CoolProp

    if pressure >= CoolProp.PropsSI("pcrit", name):
        return ("liquid" if reference < CoolProp.PropsSI("Tcrit", name) else "gas"), None
    if pressure <= CoolProp.PropsSI("ptriple", name):
        return "gas", None
    boiling, dew = (float(CoolProp.PropsSI("T", "P", pressure, "Q", q, name)) for q in (0, 1))
    if boiling - 1e-6 <= reference <= dew + 1e-6:
        where = f"{name} at {pressure:g} Pa boils between {boiling:.2f} K and {dew:.2f} K"
        raise FluidError("temperature", reference, f"{where}: stay clear of it")
    return ("liquid", boiling) if reference < boiling else ("gas", dew)


def _freezing(name: str, pressure: float) -> float:
    """Melting temperature [K] of a pure fluid; its triple point where no melting line is known."""
    from CoolProp import CoolProp

    state = CoolProp.AbstractState("HEOS", name.removeprefix("HEOS::"))
    with contextlib.suppress(ValueError):
        if state.has_melting_line():
            return float(state.melting_line(CoolProp.iT, CoolProp.iP, pressure))
    return float(CoolProp.PropsSI("Ttriple", name))


def _incompressible(name: str, pressure: float) -> Source:
    """One of CoolProp's incompressible liquids and solutions: oils, brines, glycols."""
    from CoolProp import CoolProp

    _check_liquid(name)
    floor, ceiling = CoolProp.PropsSI("Tmin", name), CoolProp.PropsSI("Tmax", name)
    freezing = None
    with contextlib.suppress(ValueError):
        freezing = float(CoolProp.PropsSI("T_freeze", "T", ceiling, "P", 1e9, name))
        floor = max(floor, freezing + _MARGIN)
    saturation = _boiling(name, pressure, floor, ceiling)
    if saturation is not None:
        ceiling = saturation - _MARGIN
    sample = _rows([symbol for symbol in SYMBOLS if symbol != "A"], pressure, name)
    return Source(name, pressure, "liquid", floor, ceiling, sample, saturation, freezing)


def _boiling(name: str, pressure: float, floor: float, ceiling: float) -> float | None:
    """Where the vapour pressure of an incompressible liquid reaches `pressure`, by bisection."""
    from CoolProp import CoolProp

    def boils(temperature: float) -> bool:
        with contextlib.suppress(ValueError):
            return bool(CoolProp.PropsSI("P", "T", temperature, "Q", 0, name) > pressure)
        return False

    if not boils(ceiling):
        return None
    for _ in range(40):
        middle = 0.5 * (floor + ceiling)
        floor, ceiling = (floor, middle) if boils(middle) else (middle, ceiling)
    return ceiling


def _humid_air(pressure: float, reference: float, humidity: float) -> Source:
    """Humid air of one humidity ratio: that of the relative `humidity` at `reference`."""
    floor, ceiling = _HUMID_AIR
    if not floor <= reference <= ceiling:
        allowed = f"humid air is known from {floor:.2f} K to {ceiling:.2f} K"
        raise FluidError("temperature", reference, allowed)
    ratio, dew_point = _moisture(pressure, reference, humidity)
    if dew_point is not None:
        floor = max(floor, dew_point + _TOUCH)
    return Source(
        "humid air",
        pressure,
        "gas",
        floor,
        ceiling,
        lambda temperature: _humid_rows(temperature, pressure, ratio),
        dew_point=dew_point,
        humidity_ratio=ratio,
    )


def _moisture(pressure: float, reference: float, humidity: float) -> tuple[float, float | None]:
    """Humidity ratio [kg/kg dry air] and dew point [K]; no dew point without moisture."""
    from CoolProp import CoolProp

    try:
        ratio, dew_point = (
            float(CoolProp.HAPropsSI(symbol, "T", reference, "P", pressure, "R", humidity))
            for symbol in ("W", "Tdp")
        )
    except ValueError as error:
        where = f"CoolProp has no such humid air at {reference:g} K and {pressure:g} Pa"
        raise FluidError("humidity", humidity, f"{where}: {error}") from error
    return ratio, dew_point if ratio > 0.0 else None


def _humid_rows(temperature: Floats, pressure: float, ratio: float) -> Floats:
    """As `Source.sample`; per mass of the moist mixture, speed of sound of an ideal gas."""
    from CoolProp import CoolProp

    volume, mu, k, cp = (
        _complete(
            np.asarray(CoolProp.HAPropsSI(symbol, "T", temperature, "P", pressure, "W", ratio)),
            like,
            temperature,
            pressure,
            "humid air",
        )
        for symbol, like in (("Vha", "D"), ("M", "V"), ("K", "L"), ("cp_ha", "C"))
    )
    cv = cp - pressure * volume / temperature
    return np.stack([1.0 / volume, mu, k, cp, np.sqrt(cp / cv * pressure * volume)])


# Names


def check_name(name: str) -> None:
    """Raises FluidError for a fluid that CoolProp does not know, with the nearest that it does.

    Whether it has properties at the case's temperatures is seen only when a table is built.
    """
    if name.casefold() in OWN_NAMES:
        return
    if _is_liquid(name):
        return _check_liquid("INCOMP::" + name[8:])
    from CoolProp import CoolProp

    if not re.search("::|&", name.removeprefix("HEOS::")):
        with contextlib.suppress(ValueError):
            CoolProp.PropsSI("Tcrit", name)
            return
    raise FluidError("name", name, _nearest(name))


def _is_liquid(name: str) -> bool:
    return name.casefold().startswith("incomp::")


def _check_liquid(name: str) -> None:
    """Raises FluidError for an unknown incompressible liquid, or a fraction it does not have."""
    from CoolProp import CoolProp

    bare, fraction = _split(name)
    pure, solutions = _liquids()
    if bare in pure and fraction is None:
        return
    if bare not in solutions:
        raise FluidError("name", name, _nearest(name))
    least, most = (CoolProp.PropsSI(f"fraction_{s}", f"INCOMP::{bare}") for s in ("min", "max"))
    if fraction is None or not least <= fraction <= most:
        example = f"INCOMP::{bare}[{0.5 * (least + most):g}]"
        wanted = f"a solution: give its fraction, {least:g} to {most:g}, as in {example}"
        raise FluidError("name", name, wanted)


def _split(name: str) -> tuple[str, float | None]:
    """Bare name and fraction of "INCOMP::NAME[0.3]" or "INCOMP::NAME-30%"."""
    bare = name.removeprefix("INCOMP::")
    found = re.fullmatch(r"(.+)\[([\d.]+)\]|(.+)-([\d.]+)%", bare)
    with contextlib.suppress(ValueError):
        if found and found[1]:
            return found[1], float(found[2])
        if found:
            return found[3], float(found[4]) / 100.0
    return bare, None


def _liquids() -> tuple[list[str], list[str]]:
    """Names of CoolProp's incompressible liquids: pure, and solutions that need a fraction."""
    from CoolProp import CoolProp

    pure = CoolProp.get_global_param_string("incompressible_list_pure")
    solutions = CoolProp.get_global_param_string("incompressible_list_solution")
    return pure.split(","), solutions.split(",")


def _nearest(name: str) -> str:
    """What may be given instead of an unknown name."""
    from CoolProp import CoolProp

    pure, solutions = _liquids()
    known = {liquid.casefold(): f"INCOMP::{liquid}" for liquid in pure + solutions}
    for fluid in CoolProp.FluidsList():
        known |= {alias.casefold(): fluid for alias in (*CoolProp.get_aliases(fluid), fluid)}
    known |= {own: own for own in OWN_NAMES}
    bare = _split(name.rpartition("::")[2])[0].casefold()
    near = difflib.get_close_matches(bare, list(known), n=5, cutoff=0.6)
    hint = f"; nearest: {', '.join(dict.fromkeys(known[n] for n in near))}" if near else ""
    return f"must be {', '.join(OWN_NAMES)} or a fluid that CoolProp knows{hint}"
