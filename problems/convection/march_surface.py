"""A second opinion on one swept wall: the boundary-layer equations marched along the plate.

Takes what `sweep` takes, uses its onset, intermittency and wires, and gives the same figures in the
same terms, from continuity, momentum and energy with the eddy viscosity of `eddy` instead of laws.

Range of validity: smooth walls, constant properties, both walls of a gap alike, Pr 0.5 to 100.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from problems.convection import flat_plate, passage, transition
from problems.convection.march_grid import Cells, Stretch, growth_for
from problems.convection.march_steps import Medium, State, advance
from problems.convection.march_wire import behind_wire
from problems.convection.similarity import FAR, Similarity
from problems.convection.sweep import Surface, Sweep, wire_steps

Floats = NDArray[np.float64]

CELLS, STATIONS = 120, 400  # within 0.2 % of the limit of fine grids
_SMOOTH = 100.0  # U k_s/nu up to which a wall is smooth (from memory)
_FIRST_PLUS = 0.35  # y+ to which the first cell reaches, at Pr 1
_START_CELLS = 12.0  # first cells to one thermal layer at the start
_EDGE = 16.0  # outer edge of the cells on one plate, in momentum thicknesses


@dataclass(frozen=True)
class Marched:
    """What the march gives at m stations of n designs; on nominal velocity, as in `Sweep`.

    Along the plate (n, m): `re_x`; local `cf` and `st` (on wall less bulk temperature, on one
    plate less the stream's); `re_theta` and `re_displacement` of one wall's layer on the velocity
    outside it; `core` that velocity, or the one in the middle of the gap; `kd` momentum factor (1
    on one plate); `drop` of pressure from the inlet, in rho U^2/2, wires included; `bulk`
    temperature, wall 0 and inlet 1, or inlet 0 in units of q/(rho cp U); `gamma` the share of
    turbulence in force. A wire's place occurs twice, ahead of it and behind. `length`, `drag` of
    the wires in rho U nu and `converged` are (n,).
    """

    re_x: Floats
    cf: Floats
    st: Floats
    re_theta: Floats
    re_displacement: Floats
    core: Floats
    kd: Floats
    drop: Floats
    bulk: Floats
    gamma: Floats
    length: Floats
    drag: Floats
    flux: bool
    converged: NDArray[np.bool_]

    @property
    def friction(self) -> Floats:
        """Mean friction factor over the length."""
        return self.summed(self.cf, -0.5)[:, -1] / self.length

    @property
    def stanton(self) -> Floats:
        """Mean Stanton number over the length; flux: one over the mean resistance."""
        if self.flux:
            return self.length / self.summed(1.0 / self.st, 0.5)[:, -1]
        return self.summed(self.st, -0.5)[:, -1] / self.length

    @property
    def wire_friction(self) -> Floats:
        """The wires' drag in the terms of `friction`."""
        return 2.0 * self.drag / self.length

    def summed(self, local: Floats, power: float) -> Floats:
        """Integral over Re_x (n, m) of what goes as x^power up to the first station."""
        root = np.sqrt(self.re_x)
        start = local[:, :1] * self.re_x[:, :1] / (1.0 + power)
        pieces = np.diff(root) * (local[:, 1:] * root[:, 1:] + local[:, :-1] * root[:, :-1])
        return np.hstack([start, start + np.cumsum(pieces, axis=1)])


def march_surface(
    surface: Surface, swept: Sweep, *, cells: int = CELLS, stations: int = STATIONS
) -> Marched:
    """March every design of `surface`, whose walk gave `swept` (onset and wires are taken from it).

    Raises ValueError for walls that are not smooth (U k_s/nu above 100).
    """
    if surface.re_rough is not None and np.any(surface.re_rough > _SMOOTH):
        raise ValueError(f"rough walls are not marched: U k_s/nu {surface.re_rough.max():.3g}")
    return _March(surface, swept, cells).along(stations)


class _March:
    """One batch of designs on its way along the plate."""

    def __init__(self, surface: Surface, swept: Sweep, cells: int) -> None:
        self._surface, self._onset, self._sustains = surface, swept.onset, swept.sustains
        half_gap = None if surface.re_d is None else 0.25 * surface.re_d
        self._medium = Medium(surface.pr, half_gap, surface.flux)
        self._breaks, self._drags = _wires(surface, swept)
        self._start = _start(surface, swept, self._breaks)
        self._rows: list[tuple[Floats, ...]] = []
        growth = growth_for(self._first_cell(swept), cells)
        self._shape = Cells.crowded(growth, cells)

    def _first_cell(self, swept: Sweep) -> Floats:
        """Width of the first cell over that of all, for the start and for turbulence."""
        surface = self._surface
        thermal = np.sqrt(self._start) / np.cbrt(np.maximum(surface.pr, 1.0))
        re_theta = np.maximum(swept.re_theta_end, 100.0)
        cf = flat_plate.turbulent_friction(re_theta)
        across = np.full_like(thermal, FAR) * np.sqrt(self._start)
        full = _EDGE * re_theta
        if surface.re_d is not None:
            across = full = 0.25 * surface.re_d
            developed = passage.developed_friction(surface.re_d, np.zeros_like(full))
            cf = np.maximum(cf, developed)
        plus = np.sqrt(0.5 * cf) * full * np.cbrt(np.maximum(surface.pr, 1.0))
        turbulent = np.where(self._onset.re_x < surface.re_l, _FIRST_PLUS / plus, 1.0)
        return np.minimum(turbulent, 3.0 * thermal / (_START_CELLS * across))

    def along(self, stations: int) -> Marched:
        """Start, then one stretch after the other with a wire between."""
        state = self._inlet()
        self._note(state)
        ends = [*self._breaks.T, self._surface.re_l]
        counts = _shares(stations, len(ends))
        for number, (end, count) in enumerate(zip(ends, counts, strict=True)):
            state = self._stretch(state, end, count, first=number == 0)
            if number < len(self._drags):
                state = behind_wire(self._medium, state, self._drags[number])
                self._note(state)
        return self._collect(state)

    def _stretch(self, state: State, end: Floats, count: int, first: bool) -> State:
        """March from `state` to `end` (n,) in `count` steps."""
        scale = state.x if first else np.minimum(0.02 * (end - state.x), 0.1 * self._onset.length)
        piece = Stretch(state.x, end, scale, self._onset.re_x, self._onset.length)
        before = None
        for x in piece.stations(count).T[1:]:
            gamma = self._gamma(x)
            cells = self._cells(state, x, gamma)
            before, state = state, advance(self._medium, cells, gamma, x, state, before)
            self._note(state)
        return state

    def _gamma(self, re_x: Floats) -> Floats:
        layer = transition.intermittency((re_x - self._onset.re_x) / self._onset.length)
        return np.asarray(layer * self._sustains)

    def _cells(self, state: State, re_x: Floats, gamma: Floats) -> Cells:
        """Cells for the next station: in a gap the same, on a plate they grow with the layer."""
        if self._medium.half_gap is not None:
            return state.cells
        edge = state.cells.faces[:, -1]
        theta = edge / _EDGE
        calm = 0.5 * flat_plate.BLASIUS**2 / theta
        full = 0.5 * flat_plate.turbulent_friction(np.maximum(theta, 20.0))
        return self._shape.scaled(edge + _EDGE * (re_x - state.x) * (calm + gamma * full))

    def _inlet(self) -> State:
        """The laminar layers of the similarity solution under a core that makes room for them."""
        x, exact = self._start, _similarity()
        core, half_gap = np.ones_like(x), self._medium.half_gap
        if half_gap is not None:
            core = 1.0 / (1.0 - exact.displacement * np.sqrt(x) / half_gap)
        scale = np.sqrt(x / core)
        width = half_gap if half_gap is not None else FAR / flat_plate.BLASIUS * 0.8 * scale
        cells = self._shape.scaled(width)
        eta = cells.faces / scale[:, None]
        stream = np.interp(eta, exact.eta, exact.stream) + np.maximum(eta - FAR, 0.0)
        stream = stream * (core * scale)[:, None]
        gradient = np.zeros_like(x)
        if half_gap is not None:
            stream *= (half_gap / stream[:, -1])[:, None]
            gradient = -0.5 * exact.displacement * core**3 / (np.sqrt(x) * half_gap)
        return State(
            x=x,
            cells=cells,
            velocity=np.diff(stream) / cells.width,
            stream=stream,
            temperature=_temperature(self._medium, exact, cells.centre / scale[:, None], scale),
            pressure=0.5 * (1.0 - core**2),
            gradient=gradient,
            gamma=np.zeros_like(x),
            converged=np.ones(x.shape, dtype=np.bool_),
        )

    def _note(self, state: State) -> None:
        """Keep what `Marched` tells of one station."""
        cells, medium = state.cells, self._medium
        core = medium.core(cells, state.velocity)
        share = state.velocity / core[:, None]
        theta = np.sum(cells.width * share * (1.0 - share), axis=1)
        displacement = np.sum(cells.width * (1.0 - share), axis=1)
        kd, bulk = np.ones_like(core), np.full_like(core, medium.outside)
        if medium.half_gap is not None:
            kd = state.momentum.sum(axis=1) / medium.half_gap
            bulk = state.heat.sum(axis=1) / state.stream[:, -1]
        if medium.flux:
            st = 1.0 / (cells.wall_value(state.temperature, -medium.pr) - bulk)
        else:
            st = cells.wall_slope(state.temperature) / (medium.pr * bulk)
        cf = 2.0 * cells.wall_slope(state.velocity)
        drop = -2.0 * state.pressure
        row = (state.x, cf, st, theta, displacement, core, kd, drop, bulk, state.gamma)
        self._rows.append(row)

    def _collect(self, state: State) -> Marched:
        re_x, cf, st, theta, displacement, core, kd, drop, bulk, gamma = (
            np.stack(column, axis=1) for column in zip(*self._rows, strict=True)
        )
        return Marched(
            re_x=re_x,
            cf=cf,
            st=st,
            re_theta=theta * core,
            re_displacement=displacement * core,
            core=core,
            kd=kd,
            drop=drop,
            bulk=bulk,
            gamma=gamma,
            length=self._surface.re_l,
            drag=sum(self._drags, np.zeros_like(state.x)),
            flux=self._medium.flux,
            converged=state.converged,
        )


def _similarity() -> Similarity:
    return Similarity(3000)


def _temperature(medium: Medium, exact: Similarity, eta: Floats, scale: Floats) -> Floats:
    """Temperature in cells at `eta` (n, c): one solution for every different Prandtl number."""
    found = np.empty_like(eta)
    solve = exact.excess if medium.flux else exact.temperature
    for pr in np.unique(medium.pr):
        rows = medium.pr == pr
        found[rows] = np.interp(eta[rows], exact.eta, solve(float(pr)))
    return found * (medium.pr * scale)[:, None] if medium.flux else found


def _wires(surface: Surface, swept: Sweep) -> tuple[Floats, list[Floats]]:
    """Ends of the stretches ahead of every wire (n, wires), and the wires' drag, in rho U nu.

    A wire behind the plate does nothing; the march stops at some place on the plate instead.
    """
    places, drags = [], []
    last = np.zeros_like(surface.re_l)
    for wire, (step, _) in wire_steps(swept.wires, swept.onset):
        on_plate = wire.re_x < surface.re_l
        behind = last + 1e-3 * surface.re_l
        least = np.where(last > 0.0, behind, 3e-4 * surface.re_l)
        place = np.where(on_plate, wire.re_x, last + 0.5 * (surface.re_l - last))
        last = np.minimum(np.maximum(place, least), last + 0.999 * (surface.re_l - last))
        places.append(last)
        drags.append(np.where(on_plate, step * wire.speed_up, 0.0))
    return np.stack(places, axis=1) if places else np.empty((surface.re_l.size, 0)), drags


def _start(surface: Surface, swept: Sweep, breaks: Floats) -> Floats:
    """Re_x (n,) where the march begins, while the layers are thin and laminar."""
    start = np.minimum(1e-3 * surface.re_l, 0.1 * swept.onset.re_x)
    if breaks.size:
        start = np.minimum(start, 0.3 * breaks[:, 0])
    if surface.re_d is not None:
        start = np.minimum(start, 1e-6 * surface.re_d**2)
    return start


def _shares(stations: int, stretches: int) -> list[int]:
    """Steps in every stretch: the last has half of them."""
    if stretches == 1:
        return [stations]
    ahead = stations // (2 * (stretches - 1))
    return [*[ahead] * (stretches - 1), stations - ahead * (stretches - 1)]
