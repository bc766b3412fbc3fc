"""One step of the marched equations: velocity, pressure and temperature at the next station.

Continuity, momentum and energy in conservation form on cells that may move, implicit, for many
designs in one banded solve. Lengths in nu/U, velocities in the nominal velocity U, so that x is
Re_x. Grids are made in `march_grid`, the walk along the plate is in `march_surface`.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.linalg.lapack import dgbsv, dgtsv

from problems.convection.eddy import eddy_viscosity, turbulent_prandtl
from problems.convection.march_grid import Cells

Floats = NDArray[np.float64]

_TOLERANCE = 1e-6  # change of velocity, in U, at which Newton's method stops
_ROUNDS = 25


@dataclass(frozen=True)
class State:
    """Fields of n designs at one station: `x`, `pressure`, `gradient`, `gamma` (n,).

    `velocity` and `temperature` in cells (n, c), `stream` function at faces (n, c + 1);
    `converged` (n,). Temperature: wall 0 and inlet 1, or inlet 0 and unit flux from the wall.
    """

    x: Floats
    cells: Cells
    velocity: Floats
    stream: Floats
    temperature: Floats
    pressure: Floats
    gradient: Floats
    gamma: Floats
    converged: NDArray[np.bool_]

    @property
    def momentum(self) -> Floats:
        """Flow of momentum through every cell."""
        return self.cells.width * self.velocity**2

    @property
    def heat(self) -> Floats:
        """Flow of heat through every cell."""
        return self.cells.width * self.velocity * self.temperature


@dataclass(frozen=True)
class Medium:
    """What does not change along the march: `pr` and `half_gap` (n,), None for a free stream."""

    pr: Floats
    half_gap: Floats | None
    flux: bool

    @property
    def outside(self) -> float:
        """Temperature of the stream that the layer has not reached."""
        return 0.0 if self.flux else 1.0

    def core(self, cells: Cells, velocity: Floats) -> Floats:
        """Velocity outside the layer, or in the middle of the gap (n,)."""
        if self.half_gap is None:
            return np.ones(velocity.shape[0])
        return cells.middle(velocity)

    def eddy(self, cells: Cells, velocity: Floats, gamma: Floats) -> Floats:
        """Eddy over molecular viscosity at the inner faces, weighted by `gamma` (n,)."""
        if not np.any(gamma > 0.0):
            return np.zeros_like(cells.conduct)
        shear = np.maximum(cells.wall_slope(velocity), 1e-12)
        core = self.core(cells, velocity)[:, None]
        re_theta = np.sum(cells.width * velocity * (1.0 - velocity / core), axis=1)
        thickness = cells.reach(velocity, 0.99 * core[:, 0])
        return eddy_viscosity(
            cells.faces[:, 1:-1],
            np.diff(velocity) * cells.conduct,
            shear[:, None],
            (re_theta[:, None], thickness[:, None]),
            None if self.half_gap is None else self.half_gap[:, None],
            gamma[:, None],
        )


@dataclass(frozen=True)
class Backward:
    """Backward difference along the flow over two or three stations, any spacing; shape (n, 1)."""

    now: Floats
    last: Floats
    before: Floats

    @classmethod
    def over(cls, x: Floats, last: State, before: State | None) -> Backward:
        """Second order from three stations, first order where there is none before the last."""
        step = (x - last.x)[:, None]
        if before is None:
            return cls(1.0 / step, -1.0 / step, np.zeros_like(step))
        span = (x - before.x)[:, None]
        old = span - step
        return cls(1.0 / step + 1.0 / span, -span / (step * old), step / (span * old))

    def history(self, last: Floats, before: Floats | None) -> Floats:
        """The part of the difference that the stations behind give."""
        kept = self.last * last
        return kept if before is None else kept + self.before * before


def advance(
    medium: Medium, cells: Cells, gamma: Floats, x: Floats, last: State, before: State | None
) -> State:
    """The state at the stations `x` (n,) on `cells`; without `before` the step is first order."""
    slope = Backward.over(x, last, before)
    found = _momentum(medium, cells, gamma, slope, x, last, before)
    velocity, stream, gradient, eddy, converged = found
    behind = slope.history(last.pressure[:, None], _of(before, "pressure", column=True))
    pressure = (gradient - behind[:, 0]) / slope.now[:, 0]
    across = -(slope.now * stream + slope.history(last.stream, _of(before, "stream")))
    old = slope.history(last.heat, _of(before, "heat"))
    temperature = _energy(medium, cells, slope, velocity, across, old, eddy)
    return State(
        x, cells, velocity, stream, temperature, pressure, gradient, gamma,
        last.converged & converged,
    )  # fmt: skip


def _of(state: State | None, name: str, column: bool = False) -> Floats | None:
    """A field of a state that may be missing."""
    if state is None:
        return None
    values: Floats = getattr(state, name)
    return values[:, None] if column else values


def _momentum(
    medium: Medium,
    cells: Cells,
    gamma: Floats,
    slope: Backward,
    x: Floats,
    last: State,
    before: State | None,
) -> tuple[Floats, Floats, Floats, Floats, NDArray[np.bool_]]:
    """Velocity, stream function, pressure gradient, eddy viscosity, by Newton's method.

    The eddy viscosity's dependence on the velocity slope is in the Newton matrix, that on wall
    shear and thickness follows round by round.
    """
    velocity, stream, gradient = _guess(medium, cells, x, last, before)
    old_momentum = slope.history(last.momentum, _of(before, "momentum"))
    old_stream = slope.history(last.stream, _of(before, "stream"))
    worst = np.full(x.shape, np.inf)
    for _ in range(_ROUNDS):
        eddy = medium.eddy(cells, velocity, gamma)
        across = -(slope.now * stream + old_stream)
        bands, flux = _bands(medium, cells, slope.now, velocity, across, eddy)
        storage = slope.now * cells.width * velocity**2 + old_momentum
        residual = storage + cells.width * gradient[:, None] + np.diff(flux)
        known = np.zeros((*velocity.shape, 2, 2))
        known[:, :, 0, 0] = -residual
        known[:, :, 1, 0] = cells.width * velocity - np.diff(stream)
        known[:, :, 0, 1] = -cells.width
        change = _banded(bands, known.reshape(-1, 2)).reshape(known.shape)
        total = change[..., 0]
        if medium.half_gap is not None:  # the mass balance of the gap
            rise = (medium.half_gap - stream[:, -1] - total[:, -1, 1]) / change[:, -1, 1, 1]
            total = total + rise[:, None, None] * change[..., 1]
            gradient = gradient + rise
        velocity = velocity + total[..., 0]
        stream = np.hstack([stream[:, :1], stream[:, 1:] + total[..., 1]])
        worst = np.abs(total[..., 0]).max(axis=1)
        if worst.max() < _TOLERANCE:
            break
    eddy = medium.eddy(cells, velocity, gamma)
    return velocity, stream, gradient, eddy, worst < 100.0 * _TOLERANCE


def _guess(
    medium: Medium, cells: Cells, x: Floats, last: State, before: State | None
) -> tuple[Floats, Floats, Floats]:
    """Where Newton's method begins: carried on in a straight line."""
    if before is None:
        velocity, gradient = last.velocity, last.gradient
    else:
        ratio = (x - last.x) / (last.x - before.x)
        velocity = last.velocity + ratio[:, None] * (last.velocity - before.velocity)
        gradient = last.gradient + ratio * (last.gradient - before.gradient)
    stream = np.zeros_like(last.stream)
    np.cumsum(cells.width * velocity, axis=1, out=stream[:, 1:])
    return velocity.copy(), stream, gradient.copy()


def _bands(
    medium: Medium, cells: Cells, now: Floats, velocity: Floats, across: Floats, eddy: Floats
) -> tuple[Floats, Floats]:
    """Newton's matrix, five bands for (velocity, stream) by cell, and momentum flux at faces."""
    inner, at_faces = across[:, 1:-1], cells.at_faces(velocity)
    stiff = cells.conduct * (1.0 + 2.0 * eddy)  # stress goes with the slope squared
    below = inner * cells.lower + stiff  # d flux / d velocity below the face
    above = inner * (1.0 - cells.lower) - stiff
    flux = np.zeros_like(across)
    flux[:, 1:-1] = inner * at_faces - cells.conduct * (1.0 + eddy) * np.diff(velocity)
    flux[:, 0] = -cells.wall_slope(velocity)
    bands = np.zeros((7, *velocity.shape, 2))  # two rows more, as the solver wants them
    diagonal = 2.0 * now * cells.width * velocity
    diagonal[:, :-1] += below
    diagonal[:, 1:] -= above
    diagonal[:, 0] += cells.near
    bands[4, :, :, 0] = diagonal
    bands[2, :, 1:, 0] = above
    bands[2, :, 1, 0] -= cells.next
    bands[6, :, :-1, 0] = -below
    bands[3, :, :-1, 1] = -now * at_faces
    bands[5, :, :-1, 1] = now * at_faces
    if medium.half_gap is None:  # the stream flows in through the moving outer edge
        flux[:, -1] = across[:, -1]
        bands[3, :, -1, 1] = -now[:, 0]
    bands[5, :, :, 0] = -cells.width  # continuity: stream rises by width times velocity
    bands[4, :, :, 1] = 1.0
    bands[6, :, :-1, 1] = -1.0
    return bands, flux


def _banded(bands: Floats, known: Floats) -> Floats:
    """Solve with five bands (7, n, c, 2); designs stand behind each other, not coupled."""
    _, _, solved, info = dgbsv(
        2, 2, bands.reshape(7, -1), known, overwrite_ab=True, overwrite_b=True
    )
    if info != 0:
        raise ArithmeticError("the momentum equation of a marched design is singular")
    return np.asarray(solved)


def _energy(
    medium: Medium,
    cells: Cells,
    slope: Backward,
    velocity: Floats,
    across: Floats,
    old: Floats,
    eddy: Floats,
) -> Floats:
    """Temperature at the next station, all designs in one tridiagonal solve."""
    pr = medium.pr[:, None]
    inner = across[:, 1:-1]
    stiff = cells.conduct * conductivity(cells, velocity, pr, eddy)
    below = inner * cells.lower + stiff
    above = inner * (1.0 - cells.lower) - stiff
    upper, lower = np.zeros_like(velocity), np.zeros_like(velocity)
    upper[:, :-1] = above
    lower[:, :-1] = -below
    diagonal = slope.now * cells.width * velocity
    diagonal[:, :-1] += below
    diagonal[:, 1:] -= above
    known = -old
    if medium.flux:
        known[:, 0] += 1.0
    else:
        diagonal[:, 0] += cells.near / medium.pr
        upper[:, 0] -= cells.next / medium.pr
    if medium.half_gap is None:
        known[:, -1] -= across[:, -1] * medium.outside
    *_, solved, info = dgtsv(
        lower.ravel()[:-1], diagonal.ravel(), upper.ravel()[:-1], known.reshape(-1, 1)
    )
    if info != 0:
        raise ArithmeticError("the energy equation of a marched design is singular")
    return np.asarray(solved).reshape(velocity.shape)


def conductivity(cells: Cells, velocity: Floats, pr: Floats, eddy: Floats) -> Floats:
    """Conductivity at the inner faces over rho cp nu: molecular and eddy part."""
    if not np.any(eddy):
        return np.broadcast_to(1.0 / pr, eddy.shape)
    shear = np.maximum(cells.wall_slope(velocity), 1e-12)[:, None]
    return np.asarray(
        1.0 / pr + eddy / turbulent_prandtl(cells.faces[:, 1:-1] * np.sqrt(shear), pr)
    )
