"""A second opinion on laminar flow between two plates: the boundary-layer equations, marched.

Continuity, momentum and energy from a uniform inlet stream, constant properties, many Prandtl
numbers at once. The fast laws fitted to it are in `entrance`; turbulence is not treated.
"""

from __future__ import annotations

from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline
from scipy.linalg import solve_banded

from problems.convection.similarity import FAR, Similarity

Floats = NDArray[np.float64]

# Inside this module lengths across the flow are in half gaps, velocities in mean velocities, and
# X = x nu / (u (s/2)^2) = 16 x+ runs along the flow; wall at 0, middle of the gap at 1.
_STRETCH = 16.0
_DEVELOPED = 0.3  # x* from which a temperature profile keeps its shape (next mode down by e^-100)


@dataclass(frozen=True)
class Developing:
    """Laminar flow developing between plates, at stations x+ = x/(D_h Re_D) of shape (m,).

    Friction factors are Fanning times Re_D, D_h twice the gap; `shear` local, `shear_mean` from
    the inlet, `apparent` from the pressure drop. `core` is the mid-gap velocity over the mean,
    `momentum` the momentum factor Kd, `theta` and `displacement` the momentum and displacement
    thicknesses of one wall's layer over the gap. `pr` has shape (k,), what belongs to heat (m, k):
    Nusselt numbers for uniform wall temperature, local and mean, and one over the Nusselt number
    for uniform wall flux, local and mean, all on D_h and wall less bulk temperature. `bulk` is the
    bulk temperature's distance from the wall's, inlet 1 (wall temperature); it is followed while
    the temperature profile still changes, up to x* = 0.3, and zero behind.
    """

    x_plus: Floats
    apparent: Floats
    shear: Floats
    shear_mean: Floats
    core: Floats
    momentum: Floats
    theta: Floats
    displacement: Floats
    pr: Floats
    nu_temperature: Floats
    nu_temperature_mean: Floats
    resistance_flux: Floats
    resistance_flux_mean: Floats
    bulk: Floats

    def at(self, name: str, x_plus: Floats) -> Floats:
        """Quantity `name` at other stations within the marched stretch, by cubic splines."""
        spline = CubicSpline(np.log(self.x_plus), getattr(self, name))
        return np.asarray(spline(np.log(x_plus)))


class _Grid:
    """Cells between wall and middle, growing from the wall; quantities live in cell centres."""

    def __init__(self, cells: int, growth: float = 7.0) -> None:
        share = np.linspace(0.0, 1.0, cells + 1)
        self.faces = np.expm1(growth * share) / np.expm1(growth)
        self.width = np.diff(self.faces)
        self.centre = 0.5 * (self.faces[1:] + self.faces[:-1])
        distance = np.diff(self.centre)
        self.conduct = 1.0 / distance  # inner faces
        self.lower = (self.centre[1:] - self.faces[1:-1]) / distance  # weight of the lower cell
        a, b = self.centre[:2]
        self.near, self.next = b / (a * (b - a)), a / (b * (b - a))

    def at_faces(self, values: Floats) -> Floats:
        """Cell values (..., n) at the inner faces (..., n - 1)."""
        return np.asarray(self.lower * values[..., :-1] + (1.0 - self.lower) * values[..., 1:])

    def wall_slope(self, values: Floats) -> Floats:
        """Slope at the wall of values (..., n) that are zero there, second order."""
        return np.asarray(self.near * values[..., 0] - self.next * values[..., 1])

    def wall_value(self, values: Floats) -> Floats:
        """Value at the wall of values (..., n) that fall from it with slope -1."""
        return np.asarray((self.wall_slope(values) + 1.0) / (self.near - self.next))


@dataclass(frozen=True)
class _State:
    """Fields at one station: X, cell velocities (n,), stream function at faces (n + 1,), pressure.

    `cold` and `warm`, (k, n): temperature over a wall at 0 with inlet 1, and over a wall that
    gives unit flux with inlet 0.
    """

    x: float
    velocity: Floats
    stream: Floats
    pressure: float
    gradient: float
    cold: Floats
    warm: Floats

    def carried(self, which: NDArray[np.bool_]) -> Floats:
        """Velocity times both temperatures for some Prandtl numbers, (2, k, n)."""
        return self.velocity * np.stack([self.cold[which], self.warm[which]])


@dataclass(frozen=True)
class _Backward:
    """Second-order backward difference along the flow over three stations, any spacing."""

    now: float
    last: float
    before: float

    @classmethod
    def over(cls, x: float, last: float, before: float) -> _Backward:
        step, span = x - last, x - before
        return cls(
            now=1.0 / step + 1.0 / span,
            last=-span / (step * (last - before)),
            before=step / (span * (last - before)),
        )

    def history(self, last: Floats, before: Floats) -> Floats:
        return self.last * last + self.before * before


def march(
    pr: Floats,
    *,
    cells: int = 500,
    step: float = 0.03,
    start: float = 1e-8,
    end: float | None = None,
) -> Developing:
    """March from x+ = `start` (similarity solution) to `end` in steps growing by e^`step`.

    `pr` (k,) from 0.5 upward; `end` defaults to x* = 0.3 of the highest Pr, at least x+ = 1. Fully
    implicit, second order along and across the flow. The velocity layer is 2e-3 of the half gap
    thick at 1e-8, the first of 500 cells 1.3e-5: temperature layers start in three cells at Pr 1e5
    and more at lower Pr, and what the start misses is forgotten along the way.
    Raises ArithmeticError if Newton's method does not converge.
    """
    pr = np.atleast_1d(np.asarray(pr, dtype=np.float64))
    end = max(1.0, _DEVELOPED * float(pr.max())) if end is None else end
    grid = _Grid(cells)
    stations = np.exp(np.arange(np.log(start), np.log(end) + step, step))
    similarity = Similarity()
    before = _inlet(grid, similarity, pr, _STRETCH * start * np.exp(-step))
    state = _inlet(grid, similarity, pr, _STRETCH * start)
    rows = [_measure(grid, pr, state)]
    for x_plus in stations[1:]:
        active = x_plus < _DEVELOPED * pr
        before, state = state, _advance(grid, pr, active, state, before, _STRETCH * x_plus)
        rows.append(_measure(grid, pr, state))
    return _collect(stations, pr, [np.array(column) for column in zip(*rows, strict=True)])


def extrapolated(pr: Floats, *, cells: int = 500, step: float = 0.03) -> Developing:
    """The march at two resolutions, Richardson-extrapolated to fourth order; as `march`."""
    coarse = march(pr, cells=cells, step=step)
    end = float(coarse.x_plus[-1])
    fine = march(pr, cells=2 * cells, step=0.5 * step, end=end)
    values = {}
    for name in (field.name for field in fields(Developing)):
        rough, sharp = getattr(coarse, name), getattr(fine, name)
        if name == "pr":
            values[name] = rough
        else:
            sharp = sharp[: 2 * len(rough) : 2]
            values[name] = sharp + (sharp - rough[: len(sharp)]) / 3.0
    return Developing(**values)


def _inlet(grid: _Grid, similarity: Similarity, pr: Floats, x: float) -> _State:
    """Two separate plate layers under a core that has made room for them."""
    root = np.sqrt(x)
    core = 1.0 / (1.0 - similarity.displacement * root)
    scale = root / np.sqrt(core)
    far = np.maximum(grid.faces / scale - FAR, 0.0)
    stream = core * scale * (np.interp(grid.faces / scale, similarity.eta, similarity.stream) + far)
    stream /= stream[-1]
    eta = grid.centre / scale
    cold = [np.interp(eta, similarity.eta, similarity.temperature(p)) for p in pr]
    warm = [scale * np.interp(eta, similarity.eta, similarity.excess(p)) for p in pr]
    return _State(
        x=x,
        velocity=np.diff(stream) / grid.width,
        stream=stream,
        pressure=0.5 * (1.0 - core**2),
        gradient=-0.5 * similarity.displacement * core**3 / root,
        cold=np.array(cold),
        warm=np.array(warm),
    )


def _advance(
    grid: _Grid, pr: Floats, active: NDArray[np.bool_], last: _State, before: _State, x: float
) -> _State:
    """The next station: velocity first, then all temperatures that still change shape."""
    slope = _Backward.over(x, last.x, before.x)
    velocity, stream, gradient = _momentum(grid, slope, last, before)
    pressure = (gradient - slope.last * last.pressure - slope.before * before.pressure) / slope.now
    across = -(slope.now * stream + slope.history(last.stream, before.stream))
    cold, warm = last.cold.copy(), last.warm.copy()
    if active.any():
        old = slope.history(last.carried(active), before.carried(active))
        cold[active], warm[active] = _energy(grid, pr[active], slope, velocity, across, old)
    return _State(x, velocity, stream, pressure, gradient, cold, warm)


def _momentum(
    grid: _Grid, slope: _Backward, last: _State, before: _State
) -> tuple[Floats, Floats, float]:
    """Velocity, stream function and pressure gradient at the next station, by Newton's method."""
    velocity, stream, gradient = last.velocity.copy(), last.stream.copy(), last.gradient
    square = slope.history(last.velocity**2, before.velocity**2)
    old_stream = slope.history(last.stream, before.stream)
    for _ in range(20):
        across = -(slope.now * stream + old_stream)
        bands, flux = _momentum_bands(grid, slope.now, velocity, across)
        residual = grid.width * (slope.now * velocity**2 + square + gradient) + np.diff(flux)
        known = np.zeros((2 * velocity.size, 2))
        known[0::2, 0] = -residual
        known[1::2, 0] = grid.width * velocity - np.diff(stream)
        known[0::2, 1] = -grid.width
        change, response = solve_banded((2, 2), bands, known).T
        rise = (1.0 - stream[-1] - change[-1]) / response[-1]  # the mass balance of the gap
        change = change + rise * response
        velocity, gradient = velocity + change[0::2], gradient + rise
        stream[1:] += change[1::2]
        if np.abs(change[0::2]).max() < 1e-9:
            return velocity, stream, gradient
    raise ArithmeticError(f"the momentum equation did not converge at x+ {last.x / _STRETCH:.3g}")


def _momentum_bands(
    grid: _Grid, now: float, velocity: Floats, across: Floats
) -> tuple[Floats, Floats]:
    """Newton's matrix, five bands for (velocity, stream) by cell, and momentum flux at faces."""
    inner, at_faces = across[1:-1], grid.at_faces(velocity)
    below = inner * grid.lower + grid.conduct  # d flux / d velocity below the face
    above = inner * (1.0 - grid.lower) - grid.conduct
    flux = np.zeros(velocity.size + 1)
    flux[1:-1] = inner * at_faces - grid.conduct * np.diff(velocity)
    flux[0] = -grid.wall_slope(velocity)
    bands = np.zeros((5, 2 * velocity.size))
    diagonal = 2.0 * now * grid.width * velocity
    diagonal[:-1] += below
    diagonal[1:] -= above
    diagonal[0] += grid.near
    bands[2, 0::2] = diagonal
    bands[0, 2::2] = above
    bands[0, 2] -= grid.next
    bands[4, 0:-2:2] = -below
    bands[1, 1:-1:2] = -now * at_faces
    bands[3, 1:-1:2] = now * at_faces
    bands[3, 0::2] = -grid.width  # continuity: stream rises by width times velocity
    bands[2, 1::2] = 1.0
    bands[4, 1:-2:2] = -1.0
    return bands, flux


def _energy(
    grid: _Grid, pr: Floats, slope: _Backward, velocity: Floats, across: Floats, old: Floats
) -> tuple[Floats, Floats]:
    """Temperatures at the next station, both wall conditions, all Pr in one tridiagonal solve.

    `old` (2, k, n) is what the backward difference keeps of velocity times temperature.
    """
    column = pr[:, None]
    below = column * across[1:-1] * grid.lower + grid.conduct
    above = column * across[1:-1] * (1.0 - grid.lower) - grid.conduct
    bands = np.zeros((3, *old.shape))
    bands[1] = column * slope.now * grid.width * velocity
    bands[1, :, :, :-1] += below
    bands[1, :, :, 1:] -= above
    bands[0, :, :, 1:] = above
    bands[2, :, :, :-1] = -below
    bands[1, 0, :, 0] += grid.near
    bands[0, 0, :, 1] -= grid.next
    known = -column * grid.width * old
    known[1, :, 0] += 1.0
    solved = solve_banded((1, 1), bands.reshape(3, -1), known.ravel()).reshape(old.shape)
    return solved[0], solved[1]


def _measure(grid: _Grid, pr: Floats, state: _State) -> tuple[float | Floats, ...]:
    """What is kept of one station, in the order that `_collect` reads."""
    carried = grid.width * state.velocity
    share = state.velocity / _middle(grid, state.velocity)
    cold_bulk = state.cold @ carried
    warm_bulk = state.warm @ carried
    ended = state.x / _STRETCH >= _DEVELOPED * pr
    return (
        -state.pressure / (2.0 * state.x / _STRETCH),
        8.0 * float(grid.wall_slope(state.velocity)),
        _middle(grid, state.velocity),
        float(carried @ state.velocity),
        0.5 * float(grid.width @ (share * (1.0 - share))),
        0.5 * float(grid.width @ (1.0 - share)),
        4.0 * grid.wall_slope(state.cold) / cold_bulk,
        0.25 * (grid.wall_value(state.warm) - warm_bulk),
        np.where(ended, 0.0, cold_bulk),
    )


def _middle(grid: _Grid, velocity: Floats) -> float:
    """Velocity in the middle of the gap: a parabola of zero slope there through two cells."""
    a, b = (1.0 - grid.centre[-2:]) ** 2
    return float((velocity[-1] * a - velocity[-2] * b) / (a - b))


def _collect(x_plus: Floats, pr: Floats, columns: list[Floats]) -> Developing:
    """Add the means to what was measured."""
    apparent, shear, core, momentum, theta, displacement, nu, resistance, bulk = columns
    return Developing(
        x_plus=x_plus,
        apparent=apparent,
        shear=shear,
        shear_mean=_mean(x_plus, shear, -0.5),
        core=core,
        momentum=momentum,
        theta=theta,
        displacement=displacement,
        pr=pr,
        nu_temperature=nu,
        nu_temperature_mean=_mean(x_plus, nu, -0.5),
        resistance_flux=resistance,
        resistance_flux_mean=_mean(x_plus, resistance, 0.5),
        bulk=bulk,
    )


def _mean(x: Floats, local: Floats, power: float) -> Floats:
    """Mean from 0 to x (m,) of `local` (m, ...), which goes as x^power up to the first station."""
    along = x.reshape(-1, *[1] * (local.ndim - 1))
    spline = CubicSpline(np.log(x), local * along)
    summed = np.asarray(spline.antiderivative()(np.log(x)))
    return np.asarray((summed + local[0] * x[0] / (1.0 + power)) / along)
