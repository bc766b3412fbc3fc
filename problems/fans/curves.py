"""Fan curves as tested: interpolated between the points and never beyond, many fans at once.

Pressure and power over volume flow, the stable side of each curve, and the affinity laws. Where a
curve meets a system is for `duty`; how the points are read from a file is for `catalogue`.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from problems.problem import Bools, Floats

Ints = NDArray[np.intp]

LEFT_SAMPLES = 32  # readings of each curve left of its peak, to find a second duty point there
BEST_SAMPLES = 24  # readings between two tested points, to find the best efficiency


@dataclass(frozen=True)
class Fan:
    """One fan as its data sheet gives it, in SI; speeds in revolutions per second.

    `flow`, `pressure` (static) and `power` hold the tested points, flow rising. `electrical` tells
    whether the power is what motor and drive take in; else it is what the shaft takes.
    """

    name: str
    speed: float
    density: float
    flow: tuple[float, ...]
    pressure: tuple[float, ...]
    power: tuple[float, ...]
    lowest_speed: float
    highest_speed: float
    electrical: bool = False
    sort: str = ""
    size: float | None = None
    outlet_area: float | None = None
    price: float | None = None

    @property
    def peak(self) -> int:
        """Index of the tested point from which the pressure only falls: the stable side."""
        return peak_of(self.pressure)


def peak_of(pressure: Sequence[float]) -> int:
    """Index of the point from which `pressure` only falls; the last one where it never does."""
    rises = [i for i in range(1, len(pressure)) if pressure[i] >= pressure[i - 1]]
    return rises[-1] if rises else 0


def affinity(
    flow: Floats, pressure: Floats, power: Floats, speed_ratio: Floats, density_ratio: Floats
) -> tuple[Floats, Floats, Floats]:
    """Flow, pressure and shaft power of the same fan at another speed and density.

    q ~ n, dp ~ n^2 rho, P ~ n^3 rho: the fan laws of the open standards. Valid for geometrically
    unchanged flow at low Mach number (fan pressure below about 2 kPa: common practice); the small
    loss of efficiency at low Reynolds number is not in them.
    """
    squared = speed_ratio**2 * density_ratio
    return flow * speed_ratio, pressure * squared, power * squared * speed_ratio


@dataclass(frozen=True)
class Curves:
    """The curves of A arrangements (a fan, or several alike in parallel), padded to K points.

    `fan` (A,) is the place of the fan in the sequence given, `count` (A,) how many stand in
    parallel. Flow is that of all of them, power that of one. `knots` (A, K) are the tested flows,
    the last one repeated; `pressure_terms` and `power_terms` (4, A, K - 1) the polynomials in the
    flow since the knot, constant first. The other fields are of shape (A,): `last` segment that
    counts, `peak_knot` and `peak` flow from which the pressure only falls, `end` of the tested
    flows, `best` flow of best efficiency, `dip_pressure` the least pressure left of the peak.
    `left_flow` and `left_pressure` (A, LEFT_SAMPLES) are readings left of the peak.
    """

    fan: Ints
    count: Floats
    knots: Floats
    knot_pressure: Floats
    pressure_terms: Floats
    power_terms: Floats
    last: Ints
    peak_knot: Ints
    peak: Floats
    end: Floats
    end_pressure: Floats
    best: Floats
    best_efficiency: Floats
    left_flow: Floats
    left_pressure: Floats
    density: Floats
    speed: Floats
    lowest_speed: Floats
    highest_speed: Floats
    electrical: Bools

    def __len__(self) -> int:
        return len(self.fan)

    @property
    def every(self) -> Ints:
        """Every arrangement as a column (A, 1), to stand against designs of shape (n,)."""
        return np.arange(len(self))[:, np.newaxis]

    @property
    def untested_left(self) -> Bools:
        """Where no point was tested left of the highest pressure, nor at no flow, shape (A,)."""
        return np.asarray((self.peak_knot == 0) & (self.peak > 0.0))

    @property
    def dip_pressure(self) -> Floats:
        """Least pressure [Pa] left of the peak, shape (A,)."""
        return np.asarray(self.left_pressure.min(axis=1))

    @property
    def dip_ratio(self) -> Floats:
        """Least pressure over flow squared left of the peak, shape (A,), infinite at no flow."""
        with np.errstate(divide="ignore"):
            ratio: Floats = self.left_pressure / self.left_flow**2
        return np.asarray(ratio.min(axis=1))

    def pressure(self, row: Ints, flow: Floats) -> Floats:
        """Static pressure [Pa] of arrangement `row` at `flow` [m3/s], clipped to the tested flows.

        `row` and `flow` broadcast: `every` against (n,) gives (A, n), (n,) against (n,) gives (n,).
        """
        return self._read(self.pressure_terms, row, flow)

    def power(self, row: Ints, flow: Floats) -> Floats:
        """Power [W] of one fan, as tested, shapes as for `pressure`."""
        return self._read(self.power_terms, row, flow)

    def _read(self, terms: Floats, row: Ints, flow: Floats) -> Floats:
        flow = np.clip(flow, self.knots[row, 0], self.end[row])
        segment = self.segment(row, flow)
        return self.read_in(terms, row, segment, flow - self.knots[row, segment])

    def segment(self, row: Ints, flow: Floats) -> Ints:
        """The stretch between two tested points in which `flow` lies, shapes as for `pressure`."""
        inner = sum(flow >= self.knots[row, k] for k in range(1, self.knots.shape[1]))
        return np.minimum(np.asarray(inner, dtype=np.intp), self.last[row])

    def read_in(self, terms: Floats, row: Ints, segment: Ints, past: Floats) -> Floats:
        """A polynomial of `terms` in a known `segment`, `past` [m3/s] its first point."""
        place = row * terms.shape[2] + segment
        c0, c1, c2, c3 = (term.ravel().take(place) for term in terms)
        value: Floats = ((c3 * past + c2) * past + c1) * past + c0
        return value

    def least_flow(self, margin: float) -> Floats:
        """Least flow [m3/s] at the tested speed that keeps `margin` to the peak, shape (A,).

        `margin` is the share of the flow that may be lost before the peak is reached.
        """
        return np.asarray(self.peak / (1.0 - margin))

    def at_speed(self, speed: Floats) -> Curves:
        """The same arrangements as if tested at `speed` [1/s], shape (A,) or a number."""
        r = np.broadcast_to(speed, self.speed.shape) / self.speed
        steps = np.array([r**-k for k in range(4)])[:, :, np.newaxis]
        return replace(
            self,
            knots=self.knots * r[:, np.newaxis],
            knot_pressure=self.knot_pressure * r[:, np.newaxis] ** 2,
            pressure_terms=self.pressure_terms * steps * r[:, np.newaxis] ** 2,
            power_terms=self.power_terms * steps * r[:, np.newaxis] ** 3,
            peak=self.peak * r,
            end=self.end * r,
            end_pressure=self.end_pressure * r**2,
            best=self.best * r,
            left_flow=self.left_flow * r[:, np.newaxis],
            left_pressure=self.left_pressure * r[:, np.newaxis] ** 2,
            speed=self.speed * r,
        )


def curves(fans: Sequence[Fan], parallel: Iterable[int] = (1,)) -> Curves:
    """The curves of every fan, alone and as many alike in parallel as `parallel` says.

    Between tested points the interpolation keeps the shape of the data: no overshoot, extremes
    only at tested points (Fritsch and Carlson 1980, as in `scipy.interpolate.PchipInterpolator`).
    """
    single = _packed(fans)
    sets = [_in_parallel(single, count) for count in parallel]
    return Curves(**{name: _joined(sets, name) for name in Curves.__dataclass_fields__})


def _joined(sets: Sequence[Curves], name: str) -> Any:
    axis = 1 if name.endswith("_terms") else 0
    return np.concatenate([getattr(one, name) for one in sets], axis=axis)


def _in_parallel(single: Curves, count: int) -> Curves:
    """`count` fans alike side by side: as much more flow at the same pressure."""
    steps = float(count) ** -np.arange(4.0)[:, np.newaxis, np.newaxis]
    return replace(
        single,
        count=single.count * count,
        knots=single.knots * count,
        pressure_terms=single.pressure_terms * steps,
        power_terms=single.power_terms * steps,
        peak=single.peak * count,
        end=single.end * count,
        best=single.best * count,
        left_flow=single.left_flow * count,
    )


def _packed(fans: Sequence[Fan]) -> Curves:
    points = max(len(fan.flow) for fan in fans)
    knots, pressure = (
        _padded([f.flow for f in fans], points),
        _padded([f.pressure for f in fans], points),
    )
    rows = np.arange(len(fans))
    peak_knot = np.array([fan.peak for fan in fans])
    left = knots[:, :1] + (knots[rows, peak_knot] - knots[:, 0])[:, np.newaxis] * np.linspace(
        0.0, 1.0, LEFT_SAMPLES
    )
    made = Curves(
        fan=rows,
        count=np.ones(len(fans)),
        knots=knots,
        knot_pressure=pressure,
        pressure_terms=_terms([(f.flow, f.pressure) for f in fans], points),
        power_terms=_terms([(f.flow, f.power) for f in fans], points),
        last=np.array([len(fan.flow) - 2 for fan in fans]),
        peak_knot=peak_knot,
        peak=knots[rows, peak_knot],
        end=knots[:, -1],
        end_pressure=pressure[:, -1],
        best=knots[:, -1],
        best_efficiency=np.zeros(len(fans)),
        left_flow=left,
        left_pressure=np.zeros_like(left),
        density=np.array([fan.density for fan in fans]),
        speed=np.array([fan.speed for fan in fans]),
        lowest_speed=np.array([fan.lowest_speed for fan in fans]),
        highest_speed=np.array([fan.highest_speed for fan in fans]),
        electrical=np.array([fan.electrical for fan in fans]),
    )
    best, efficiency = _best(made)
    seen = made.pressure(made.every, left)
    return replace(made, best=best, best_efficiency=efficiency, left_pressure=seen)


def _padded(lists: Sequence[Sequence[float]], length: int) -> Floats:
    """Lists of numbers as rows of one length, each filled up with its last number."""
    return np.array([[*row, *[row[-1]] * (length - len(row))] for row in lists], dtype=float)


def _terms(curves: Sequence[tuple[Sequence[float], Sequence[float]]], points: int) -> Floats:
    """Polynomials of every curve, constant first, shape (4, A, points - 1)."""
    from scipy.interpolate import PchipInterpolator

    terms = np.zeros((4, len(curves), points - 1))
    for row, (x, y) in enumerate(curves):
        terms[:, row, : len(x) - 1] = PchipInterpolator(x, y).c[::-1]
    return terms


def _best(made: Curves) -> tuple[Floats, Floats]:
    """Flow and value of the best static efficiency on each tested curve, shape (A,) both."""
    part = np.linspace(0.0, 1.0, BEST_SAMPLES, endpoint=False)
    widths = np.diff(made.knots, axis=1)
    flow = (made.knots[:, :-1, np.newaxis] + widths[:, :, np.newaxis] * part).reshape(len(made), -1)
    flow = np.concatenate([flow, made.end[:, np.newaxis]], axis=1)
    efficiency = flow * made.pressure(made.every, flow) / made.power(made.every, flow)
    place = np.argmax(efficiency, axis=1)
    rows = np.arange(len(made))
    return flow[rows, place], efficiency[rows, place]
