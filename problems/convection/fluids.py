"""Fluid properties from tables: density, viscosity, conductivity, heat capacity over temperature.

A table is built once per case, at one pressure, and kept in the user's cache. What CoolProp is
asked for it is the business of `fluid_sources`; which temperature to take, of whoever asks here.
"""

from __future__ import annotations

import contextlib
import hashlib
import math
import os
import tempfile
import zipfile
import zlib
from dataclasses import dataclass
from functools import cached_property
from importlib.metadata import version
from pathlib import Path

import numpy as np
from numpy.typing import ArrayLike, NDArray

from problems.convection.fluid_sources import FluidError, Source, check_name, source_of

__all__ = [
    "CACHE_VARIABLE",
    "Fluid",
    "FluidError",
    "Properties",
    "check_name",
    "fluid",
    "standard_pressure",
]

Floats = NDArray[np.float64]

CACHE_VARIABLE = "PLATEWRIGHT_CACHE"  # another folder for the tables; empty: keep none
_FORMAT = 1  # of the cached file; goes into its name

_ROWS = 6  # of a table: rho, mu, k, cp, beta, reciprocal of the speed of sound
_LINE = 1e-6  # relative error of the straight line between two nodes
_LEAST_NODES, _MOST_NODES = 1024, 32768
_SAMPLING = 2e-5  # relative error of a spline through the samples, at half the final number
_LEAST_SAMPLES, _MOST_SAMPLES = 32, 8192
_MOST_KEPT = 200  # tables in the cache; the oldest go first
_WORST = 5e-4  # relative; a table that would be worse is refused
_STEP = 5.0  # K; the ends of a table stand on multiples of it so that near cases share one


@dataclass(frozen=True)
class Properties:
    """Properties at given temperatures; all arrays have the shape of the temperature.

    rho [kg/m3], mu [Pa s], k [W/(m K)], cp [J/(kg K)], nu [m2/s], pr [-].
    """

    rho: Floats
    mu: Floats
    k: Floats
    cp: Floats
    nu: Floats
    pr: Floats


@dataclass(frozen=True, eq=False)
class Fluid:
    """Properties of one fluid at one `pressure` [Pa] between `low` and `high` [K].

    Outside that span every method gives the value at the nearer end; `low` and `high` tell which
    temperatures those are (for humid air `low` is no lower than the dew point). `phase` is "gas"
    or "liquid". `saturation_temperature` [K] is where the phase ends at this pressure (boiling of
    a liquid, condensing of a gas), `freezing_point` [K] where a liquid freezes; `dew_point` [K]
    and `humidity_ratio` [kg/kg dry air] belong to humid air. Each is None where it does not apply
    or is not known. `values` is the table, shape (6, nodes), rows as in `_ROWS`, even spacing.
    """

    name: str
    pressure: float
    phase: str
    low: float
    high: float
    values: Floats
    saturation_temperature: float | None = None
    freezing_point: float | None = None
    dew_point: float | None = None
    humidity_ratio: float | None = None

    def at(self, temperature: ArrayLike) -> Properties:
        """Properties at `temperature` [K], any shape; continuous, linear between nodes."""
        node, part = self._locate(temperature)
        rho, mu, k, cp = (self._between(row, node, part) for row in range(4))
        return Properties(rho, mu, k, cp, mu / rho, mu * cp / k)

    def expansion(self, temperature: ArrayLike) -> Floats:
        """Thermal expansion coefficient -(d rho/d T)/rho [1/K] at `temperature` [K]."""
        return self._between(4, *self._locate(temperature))

    def sound_speed(self, temperature: ArrayLike) -> Floats:
        """Speed of sound [m/s] at `temperature` [K]; infinite for an incompressible liquid."""
        slowness = self._between(5, *self._locate(temperature))
        with np.errstate(divide="ignore"):
            return np.asarray(1.0 / slowness)

    @cached_property
    def _rises(self) -> Floats:
        return np.diff(self.values, axis=1, append=self.values[:, -1:])

    def _locate(self, temperature: ArrayLike) -> tuple[NDArray[np.intp], Floats]:
        """Node at or below each temperature, and how far it lies towards the next (0 to 1)."""
        last = self.values.shape[1] - 1
        place = np.asarray(temperature, dtype=np.float64) - self.low
        place = np.clip(place * (last / (self.high - self.low)), 0.0, last)
        node = place.astype(np.intp)
        return node, place - node

    def _between(self, row: int, node: NDArray[np.intp], part: Floats) -> Floats:
        # mode="clip" only because it is the quick one: node is already inside
        start: Floats = self.values[row].take(node, mode="clip")
        rise: Floats = self._rises[row].take(node, mode="clip")
        return start + rise * part


def fluid(
    name: str,
    pressure: float,
    low: float,
    high: float,
    humidity: float | None = None,
    reference_temperature: float | None = None,
) -> Fluid:
    """Property table of `name` at `pressure` [Pa] for temperatures `low` to `high` [K].

    `name` is "air" (dry), "humid air", "water", a pure or pseudo-pure fluid by its name in
    CoolProp, or one of its liquids as "INCOMP::NAME" or "INCOMP::NAME[0.3]" (fraction in the
    basis CoolProp keeps for it). `reference_temperature` [K], the inlet's (`low` if not given),
    decides between liquid and gas, and `humidity` is the relative humidity [0 to 1] there; the
    humidity ratio it fixes holds for the whole table.

    The span is widened a little and clipped to where CoolProp has this phase: short of boiling
    or condensing, above freezing, and for humid air above the dew point.

    Raises FluidError for an unknown fluid, or a state or property CoolProp does not have.
    """
    reference = low if reference_temperature is None else reference_temperature
    name = " ".join(name.split())
    _check(name, pressure, low, high, humidity, reference)
    margin = max(_STEP, 0.05 * (high - low))
    start = _STEP * math.floor((min(low, reference) - margin) / _STEP)
    stop = _STEP * math.ceil((max(high, reference) + margin) / _STEP)
    key = _key(name, pressure, start, stop, humidity, reference)
    known = _load(key)
    if known is None:
        known = _build(source_of(name, pressure, reference, humidity), start, stop)
        _keep(key, known)
    return known


def standard_pressure(altitude: ArrayLike) -> Floats:
    """Pressure [Pa] of the standard atmosphere at `altitude` [m] above sea level.

    ISO 2533:1975 (from memory; the same as the U.S. Standard Atmosphere 1976 up to 20 km).
    Raises FluidError outside -2000 m to 20000 m.
    """
    z = np.asarray(altitude, dtype=np.float64)
    if not np.all((z >= -2000.0) & (z <= 20000.0)):
        raise FluidError("altitude", altitude, "must lie between -2000 m and 20000 m")
    height = 6356766.0 * z / (6356766.0 + z)  # geopotential
    g_over_r = 9.80665 / 287.05287
    below = np.minimum(height, 11000.0)
    troposphere = 101325.0 * (1.0 - 0.0065 * below / 288.15) ** (g_over_r / 0.0065)
    stratosphere = np.exp(-g_over_r / 216.65 * np.maximum(height - 11000.0, 0.0))
    return np.asarray(troposphere * stratosphere)


def _check(
    name: str,
    pressure: float,
    low: float,
    high: float,
    humidity: float | None,
    reference: float,
) -> None:
    if not (math.isfinite(pressure) and pressure > 0.0):
        raise FluidError("pressure", pressure, "must be above 0 Pa")
    for temperature in (low, high, reference):
        if not (math.isfinite(temperature) and temperature > 0.0):
            raise FluidError("temperature", temperature, "must be above 0 K")
    if low > high:
        raise FluidError("temperature", low, f"must not be above the high end, {high:g} K")
    if (name.lower() == "humid air") != (humidity is not None):
        raise FluidError("humidity", humidity, "must be given for humid air, and only for it")
    if humidity is not None and not 0.0 <= humidity <= 1.0:
        raise FluidError("humidity", humidity, "relative humidity must lie between 0 and 1")


# Building a table


def _build(source: Source, low: float, high: float) -> Fluid:
    from scipy.interpolate import CubicSpline

    low, high = max(low, source.floor), min(high, source.ceiling)
    if not low < high:
        span = f"from {source.floor:.2f} K to {source.ceiling:.2f} K"
        raise FluidError("temperature", low, f"{source.name} is known {span}")
    spline = CubicSpline(*_sampled(source, low, high), axis=1)
    nodes = _nodes(spline(spline.x), spline(spline.x, 2), high - low)
    temperature = np.linspace(low, high, nodes)
    rows = spline(temperature)
    values = np.zeros((_ROWS, nodes))
    values[:4] = rows[:4]
    values[4] = -spline(temperature, 1)[0] / rows[0]
    if len(rows) > 4:
        values[5] = 1.0 / rows[4]
    return Fluid(
        source.name,
        source.pressure,
        source.phase,
        low,
        high,
        values,
        source.saturation_temperature,
        source.freezing_point,
        source.dew_point,
        source.humidity_ratio,
    )


def _sampled(source: Source, low: float, high: float) -> tuple[Floats, Floats]:
    """Temperatures (n,) and rows (m, n), as dense as a cubic spline through them needs."""
    from scipy.interpolate import CubicSpline

    temperature = np.linspace(low, high, _LEAST_SAMPLES + 1)
    rows = source.sample(temperature)
    error = np.inf
    while error > _SAMPLING and len(temperature) < _MOST_SAMPLES:
        middle = 0.5 * (temperature[1:] + temperature[:-1])
        new = source.sample(middle)
        error = float(np.max(np.abs(CubicSpline(temperature, rows, axis=1)(middle) / new - 1.0)))
        places = np.arange(1, len(temperature))
        temperature = np.insert(temperature, places, middle)
        rows = np.insert(rows, places, new, axis=1)
    if error > _WORST:
        span = f"changes too sharply between {low:g} K and {high:g} K for a table"
        raise FluidError("name", source.name, f"{span} (error {error:.1e}); narrow the range")
    return temperature, rows


def _nodes(rows: Floats, bend: Floats, span: float) -> int:
    """Number of nodes at which straight lines miss a curve of that `bend` by `_LINE`."""
    worst = float(np.max(np.abs(bend) / np.abs(rows)))
    needed = span * math.sqrt(worst / (8.0 * _LINE))
    return math.ceil(min(max(needed, _LEAST_NODES), _MOST_NODES)) + 1


# The cache


def _key(*facts: str | float | None) -> str:
    """All that a table depends on, as text."""
    made = (_FORMAT, version("CoolProp"), _LINE, _SAMPLING, _LEAST_NODES, _MOST_NODES)
    return repr((*made, *(f if f is None or isinstance(f, str) else float(f) for f in facts)))


def _place(key: str) -> Path | None:
    """The file that keeps the table of `key`; None where no cache is wanted."""
    folder = os.environ.get(CACHE_VARIABLE)
    if folder == "":
        return None
    if folder is None:
        from platformdirs import user_cache_path

        folder = str(user_cache_path("platewright", appauthor=False))
    digest = hashlib.sha256(key.encode()).hexdigest()[:24]
    return Path(folder).expanduser() / f"fluid-{digest}.npz"


def _optional(value: float) -> float | None:
    return None if math.isnan(value) else float(value)


def _load(key: str) -> Fluid | None:
    """The table kept for `key`, or None if there is none that can be trusted."""
    place = _place(key)
    if place is None:
        return None
    try:
        with place.open("rb") as file, np.load(file, allow_pickle=False) as kept:
            texts, numbers, values = kept["texts"], kept["numbers"], kept["values"]
        stated, name, phase = (str(text) for text in texts)
        pressure, low, high, *facts = (float(number) for number in numbers)
        saturation, freezing, dew, ratio = (_optional(fact) for fact in facts)
    except (OSError, ValueError, KeyError, TypeError, EOFError, zipfile.BadZipFile, zlib.error):
        return None
    sound = values.ndim == 2 and len(values) == _ROWS and values.dtype == np.float64
    if not (stated == key and sound and low < high and np.isfinite(values).all()):
        return None
    return Fluid(name, pressure, phase, low, high, values, saturation, freezing, dew, ratio)


def _keep(key: str, made: Fluid) -> None:
    """Keep a table for next time; without a word where the folder cannot be written."""
    place = _place(key)
    if place is None:
        return
    facts = (made.saturation_temperature, made.freezing_point, made.dew_point, made.humidity_ratio)
    numbers = [made.pressure, made.low, made.high]
    numbers += [math.nan if fact is None else fact for fact in facts]
    try:
        place.parent.mkdir(parents=True, exist_ok=True)
        handle, draft = tempfile.mkstemp(dir=place.parent, suffix=".part")
    except OSError:
        return
    try:
        with os.fdopen(handle, "wb") as file:
            np.savez(
                file,
                texts=np.array([key, made.name, made.phase]),
                numbers=np.array(numbers),
                values=made.values,
            )
        os.replace(draft, place)
        _thin(place.parent)
    except OSError:
        with contextlib.suppress(OSError):
            os.unlink(draft)


def _thin(folder: Path) -> None:
    by_age = sorted(folder.glob("fluid-*.npz"), key=lambda kept: kept.stat().st_mtime)
    for old in by_age[:-_MOST_KEPT]:
        old.unlink(missing_ok=True)
