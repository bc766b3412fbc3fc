"""What a wire does to a marched layer: a jump outward that carries the wire's drag.

The profile is stretched away from the wall, streamtubes keep their temperature. How large the drag
is comes from `transition`, through `sweep`.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from problems.convection.march_grid import Cells, hermite_by_rows
from problems.convection.march_steps import Medium, State

Floats = NDArray[np.float64]

_FULLEST = 0.9  # of the core velocity: where it has come to the middle the layer stretches no more


def behind_wire(medium: Medium, state: State, drag: Floats) -> State:
    """The state behind a wire whose drag on one wall is `drag` (n,), in rho U nu; 0 for none.

    One plate: every length of the layer grows alike, until momentum thickness has grown by the
    drag. In a gap the core follows Bernoulli's equation, the gap's momentum balance sets the
    stretch; where layers that fill the gap cannot take up the drag, the rest is loss of pressure.
    """
    if medium.half_gap is None:
        return _on_plate(medium, state, drag)
    return _in_gap(medium, state, medium.half_gap, drag)


def _on_plate(medium: Medium, state: State, drag: Floats) -> State:
    theta = np.sum(state.cells.width * state.velocity * (1.0 - state.velocity), axis=1)
    scale = 1.0 + drag / theta
    cells, stream = state.cells.scaled(scale), state.stream * scale[:, None]
    return replace(state, cells=cells, stream=stream, temperature=_carried(medium, state, stream))


def _carried(medium: Medium, state: State, stream: Floats) -> Floats:
    """Temperatures in cells between faces of other values of the stream function."""
    heat = np.zeros_like(state.stream)
    np.cumsum(np.diff(state.stream) * state.temperature, axis=1, out=heat[:, 1:])
    cells = state.cells
    at_wall = cells.wall_value(state.temperature, np.full_like(medium.pr, -1.0) * medium.pr)
    if not medium.flux:
        at_wall = np.zeros_like(at_wall)
    outside = np.full_like(at_wall, medium.outside)
    if medium.half_gap is not None:
        outside = cells.middle(state.temperature)
    inner = cells.at_faces(state.temperature)
    slope = np.hstack([at_wall[:, None], inner, outside[:, None]])
    moved = hermite_by_rows(stream, state.stream, heat, slope)
    return np.diff(moved) / np.diff(stream)


def _in_gap(medium: Medium, state: State, half_gap: Floats, drag: Floats) -> State:
    gap = _Gap(state.cells, state.velocity, state.stream, half_gap)
    most = np.maximum(half_gap / gap.fullest, 1.0)
    scale = gap.stretch(drag, most)
    stream, velocity, momentum = gap.stretched(scale)
    loss = (drag + momentum - gap.momentum[:, -1]) / half_gap
    struck = drag > 0.0
    moved = replace(
        state,
        velocity=np.where(struck[:, None], velocity, state.velocity),
        stream=np.where(struck[:, None], stream, state.stream),
        pressure=state.pressure - np.where(struck, loss, 0.0),
    )
    temperature = _carried(medium, state, moved.stream)
    return replace(moved, temperature=np.where(struck[:, None], temperature, state.temperature))


class _Gap:
    """A profile between plates that can be stretched away from the wall."""

    def __init__(self, cells: Cells, velocity: Floats, stream: Floats, half_gap: Floats) -> None:
        self._cells, self._half_gap, self._stream = cells, half_gap, stream
        self.core = cells.middle(velocity)
        self.fullest = cells.reach(velocity, _FULLEST * self.core)
        at_faces = [np.zeros_like(half_gap)[:, None], cells.at_faces(velocity), self.core[:, None]]
        self._at_faces = np.hstack(at_faces)
        self.momentum = np.zeros_like(stream)
        np.cumsum(cells.width * velocity**2, axis=1, out=self.momentum[:, 1:])

    def _up_to(self, y: Floats, table: Floats, power: int) -> Floats:
        """Stream function or momentum from the wall to y (n, k)."""
        return hermite_by_rows(y, self._cells.faces, table, self._at_faces**power)

    def _faster(self, scale: Floats) -> Floats:
        """Core velocity over that before, from the mass balance."""
        seen = (self._half_gap / scale)[:, None]
        return np.asarray(self._half_gap / (scale * self._up_to(seen, self._stream, 1)[:, 0]))

    def _drag(self, scale: Floats) -> Floats:
        """Drag that stretching by `scale` (n,) stands for."""
        faster = self._faster(scale)
        seen = (self._half_gap / scale)[:, None]
        momentum = faster**2 * scale * self._up_to(seen, self.momentum, 2)[:, 0]
        drop = 0.5 * self.core**2 * (faster**2 - 1.0)
        return np.asarray(self._half_gap * drop + self.momentum[:, -1] - momentum)

    def stretch(self, drag: Floats, most: Floats) -> Floats:
        """Stretch (n,), from 1 to `most`, that stands for `drag`, by bisection."""
        low, high = np.zeros_like(drag), np.log(most)
        for _ in range(40):
            middle = 0.5 * (low + high)
            short = self._drag(np.exp(middle)) < drag
            low, high = np.where(short, middle, low), np.where(short, high, middle)
        return np.exp(high)

    def stretched(self, scale: Floats) -> tuple[Floats, Floats, Floats]:
        """Stream function, cell velocities and momentum (n,) behind."""
        faster = self._faster(scale)
        column = (faster * scale)[:, None]
        stream = column * self._up_to(self._cells.faces / scale[:, None], self._stream, 1)
        velocity = np.diff(stream) / self._cells.width
        momentum = np.sum(self._cells.width * velocity**2, axis=1)
        return stream, velocity, momentum
