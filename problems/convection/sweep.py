"""One walk along the plate: laminar, transitional, turbulent, merged.

Joins the laws of `flat_plate`, `transition`, `entrance` and `passage` into means and local values,
in Reynolds numbers only. Temperatures, watts and pascals are left to the kinds.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import cache
from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from problems.convection import entrance, flat_plate, passage, transition
from problems.convection.scatter import Scatter, ScatteredLaminar
from problems.convection.transition import Onset, Wire

Floats = NDArray[np.float64]

_XI_END = 4.5  # intermittency there is 0.9998: the layer counts as turbulent
_IN_TRANSITION, _IN_TURBULENCE = 7, 7  # Gauss points in each stretch
_THINNEST = 20.0  # Re_theta below which no layer is turbulent; asked for only where none is
_MERGED_LAMINAR = 0.0025  # Re_x over Re_D^2 where laminar layers have met


@dataclass(frozen=True)
class Surface:
    """One swept wall of each design, in Reynolds numbers on the nominal velocity; shape (n,).

    `re_l` on the length; `re_d` on hydraulic diameter, None for a plate in a free stream; `pr`;
    `re_rough` U k_s/nu, None if smooth; `natural` the onset Re_x without a wire; `turbulence` in
    percent; `wire_x`, `wire_k` U x/nu and U k/nu of a wire, None without; `wires` of them stand
    in a row `wire_spacing` apart, `facing` of them (0 to 2) in one section of the gap; `grit`
    makes them strips of grit; `flux` is for uniform wall flux instead of wall temperature;
    `scatter` multiplies the laws, `criterion` the figures from which a wire trips.
    """

    re_l: Floats
    pr: Floats
    natural: Floats | float
    turbulence: Floats | float
    re_d: Floats | None = None
    re_rough: Floats | None = None
    wire_x: Floats | None = None
    wire_k: Floats | None = None
    wire_spacing: Floats | None = None
    wires: int = 1
    facing: int = 2
    grit: bool = False
    drag_coefficient: Floats | float = 1.0
    flux: bool = False
    scatter: Scatter | None = None
    criterion: Floats | float = 1.0

    def part(self, index: NDArray[np.intp]) -> Surface:
        """The same for some of the designs, as columns of shape (k, 1) for use with stations."""
        return replace(
            self,
            re_l=self.re_l[index, None],
            pr=self.pr[index, None],
            re_d=None if self.re_d is None else self.re_d[index, None],
            re_rough=None if self.re_rough is None else self.re_rough[index, None],
            wire_x=None,
            wire_k=None,
            wire_spacing=None,
            scatter=None if self.scatter is None else self.scatter.part(index),
        )


@dataclass(frozen=True)
class Sweep:
    """What the walk gives; shape (n,). Friction factors and Stanton numbers on nominal velocity.

    `friction` and `stanton` are means over the length (flux: one over the mean resistance),
    `least_stanton` the worst spot, `outlet_stanton` the last; `wall_high` is the highest value
    along the plate of (T_wall - T_inlet) rho cp u / q for uniform flux; `wire_friction` is the
    wire's drag in the same terms as `friction`; `momentum_factor` is the outlet's;
    `turbulent_share` is of the length; `evenness` is least over mean local flux, for uniform flux
    mean over highest excess of the wall temperature over the inlet's.
    """

    friction: Floats
    stanton: Floats
    least_stanton: Floats
    outlet_stanton: Floats
    wall_high: Floats
    wire_friction: Floats
    momentum_factor: Floats
    turbulent_share: Floats
    onset: Onset
    sustains: Floats
    wires: tuple[Wire, ...]
    re_theta_end: Floats
    evenness: Floats

    @property
    def wire(self) -> Wire | None:
        """The first wire that the flow meets."""
        return self.wires[0] if self.wires else None

    @property
    def behind_wires(self) -> Floats:
        """Re_theta behind the last wire, were the layer laminar up to it."""
        last = self.wires[-1]
        return last.re_theta + last.thickening(np.zeros_like(last.re_theta))


class Laminar(Protocol):
    """A laminar layer: local values and their sums from the leading edge, at Re_x."""

    def friction(self, re_x: Floats) -> Floats:
        """Local friction factor."""

    def stanton(self, re_x: Floats) -> Floats:
        """Local Stanton number."""

    def friction_sum(self, re_x: Floats) -> Floats:
        """Integral of the friction factor over Re_x."""

    def heat_sum(self, re_x: Floats) -> Floats:
        """Integral of the Stanton number over Re_x (flux: of one over it)."""


class PlateLaminar:
    """Laminar layer on a plate in a free stream."""

    def __init__(self, surface: Surface) -> None:
        self._flux = surface.flux
        constant = flat_plate.laminar_heat_constant(surface.pr, surface.flux)
        self._stanton = constant / surface.pr

    def friction(self, re_x: Floats) -> Floats:
        return flat_plate.laminar_friction(re_x)

    def stanton(self, re_x: Floats) -> Floats:
        return self._stanton / np.sqrt(re_x)

    def friction_sum(self, re_x: Floats) -> Floats:
        return 2.0 * flat_plate.laminar_re_theta(re_x)

    def heat_sum(self, re_x: Floats) -> Floats:
        if self._flux:
            return re_x**1.5 / (1.5 * self._stanton)
        return 2.0 * self._stanton * np.sqrt(re_x)


class PassageLaminar:
    """Laminar flow developing between two plates."""

    def __init__(self, surface: Surface) -> None:
        if surface.re_d is None:
            raise ValueError("a passage needs its Reynolds number on hydraulic diameter")
        self._flux = surface.flux
        self._re_d = surface.re_d
        self._peclet = surface.re_d * surface.pr
        self._root_pr = np.sqrt(surface.pr)
        make = entrance.resistance_flux if surface.flux else entrance.nusselt_temperature
        self._heat = make(surface.pr)

    def friction(self, re_x: Floats) -> Floats:
        return entrance.shear_local(np.sqrt(re_x) / self._re_d) / self._re_d

    def stanton(self, re_x: Floats) -> Floats:
        local = self._heat.local(np.sqrt(re_x) / (self._re_d * self._root_pr))
        return 1.0 / (local * self._peclet) if self._flux else local / self._peclet

    def friction_sum(self, re_x: Floats) -> Floats:
        return re_x * entrance.shear_mean(np.sqrt(re_x) / self._re_d) / self._re_d

    def heat_sum(self, re_x: Floats) -> Floats:
        mean = self._heat.mean(np.sqrt(re_x) / (self._re_d * self._root_pr))
        return re_x * (mean * self._peclet if self._flux else mean / self._peclet)


def sweep(surface: Surface) -> Sweep:
    """Walk along every plate; see `Surface` and `Sweep` for shapes and units."""
    laminar = laminar_layer(surface)
    sustains = np.ones_like(surface.re_l)
    natural = np.full_like(surface.re_l, surface.natural)
    if surface.re_d is not None:
        sustains = passage.sustains(surface.re_d)
        # merged layers in a passage that sustains turbulence do not stay laminar
        natural = 1.0 / (1.0 / natural + 1.0 / (_MERGED_LAMINAR * surface.re_d**2))
    wires = _wires(surface)
    onset = transition.onset(natural, surface.turbulence, wires)
    lasting = sustains == 0.0  # a layer that cannot become turbulent is laminar to the end
    ahead = np.where(lasting, surface.re_l, np.minimum(onset.re_x, surface.re_l))
    totals = _Totals(surface, laminar, ahead)
    steps = wire_steps(wires, onset)
    re_theta = laminar_growth(surface, wires, steps, ahead)
    gamma_end = np.zeros_like(surface.re_l)
    index = np.flatnonzero(ahead < surface.re_l)
    if index.size:
        gamma_end[index], re_theta[index] = _behind_onset(
            surface, onset, sustains, re_theta, index, totals
        )
    wire_drag = sum((2.0 * full * wire.speed_up for wire, (full, _) in steps), 0.0 * ahead)
    return Sweep(
        friction=totals.friction / surface.re_l,
        stanton=surface.re_l / totals.heat if surface.flux else totals.heat / surface.re_l,
        least_stanton=totals.least,
        outlet_stanton=totals.last,
        wall_high=totals.wall_high,
        wire_friction=wire_drag / surface.re_l,
        momentum_factor=_momentum(surface, gamma_end, re_theta),
        turbulent_share=totals.turbulent / surface.re_l,
        onset=onset,
        sustains=sustains,
        wires=wires,
        re_theta_end=re_theta,
        evenness=totals.evenness(),
    )


def wire_steps(wires: tuple[Wire, ...], onset: Onset) -> list[tuple[Wire, tuple[Floats, Floats]]]:
    """For each wire its step in Re_theta, and the part of it that a laminar layer carries on."""
    found = []
    for wire in wires:
        inside = transition.intermittency((wire.re_x - onset.re_x) / onset.length)
        step = wire.thickening(inside)
        found.append((wire, (step, step * (1.0 - inside))))
    return found


def one_wall_wired(wired: Sweep, plain: Sweep, flux: bool) -> Sweep:
    """A gap with wires on one of its walls: each wall by its own walk, joined by their means."""
    if flux:
        stanton = 2.0 / (1.0 / wired.stanton + 1.0 / plain.stanton)
    else:
        stanton = 0.5 * (wired.stanton + plain.stanton)
    worst = np.minimum(wired.evenness * wired.stanton, plain.evenness * plain.stanton)
    return replace(
        wired,
        friction=0.5 * (wired.friction + plain.friction),
        stanton=stanton,
        least_stanton=np.minimum(wired.least_stanton, plain.least_stanton),
        outlet_stanton=0.5 * (wired.outlet_stanton + plain.outlet_stanton),
        wall_high=np.maximum(wired.wall_high, plain.wall_high),
        wire_friction=0.5 * wired.wire_friction,
        momentum_factor=0.5 * (wired.momentum_factor + plain.momentum_factor),
        turbulent_share=0.5 * (wired.turbulent_share + plain.turbulent_share),
        evenness=worst / stanton,
    )


class _Totals:
    """Sums over the length and extremes along it, begun with the laminar part."""

    def __init__(self, surface: Surface, laminar: Laminar, ahead: Floats) -> None:
        self._surface = surface
        self.friction = laminar.friction_sum(ahead)
        self.heat = laminar.heat_sum(ahead)
        self.turbulent = np.zeros_like(ahead)
        self.least = laminar.stanton(ahead)
        self.last = self.least.copy()
        self.wall_high = np.zeros_like(ahead)
        if surface.flux:
            self.wall_high = self._wall(surface, ahead, self.least)
        self.least_flux = self.least * self._left(surface, self.heat)

    @staticmethod
    def _wall(surface: Surface, re_x: Floats, stanton: Floats) -> Floats:
        """Wall above inlet temperature times rho cp u / q."""
        excess = 1.0 / stanton
        return excess if surface.re_d is None else excess + 4.0 * re_x / surface.re_d

    @staticmethod
    def _left(surface: Surface, heat: Floats) -> Floats:
        """Share left of the temperature difference between wall and stream, uniform wall."""
        if surface.re_d is None or surface.flux:
            return np.ones_like(heat)
        return np.exp(-4.0 * heat / surface.re_d)

    def evenness(self) -> Floats:
        """Least over mean flux; for uniform flux mean over highest excess of the wall."""
        surface = self._surface
        if surface.flux:
            stream = 0.0 if surface.re_d is None else 2.0 * surface.re_l / surface.re_d
            return (self.heat / surface.re_l + stream) / self.wall_high
        if surface.re_d is None:
            return self.least_flux * surface.re_l / self.heat
        taken = 0.25 * surface.re_d * -np.expm1(-4.0 * self.heat / surface.re_d)
        return self.least_flux * surface.re_l / taken

    def add(
        self,
        index: NDArray[np.intp],
        columns: Surface,
        stations: tuple[Floats, Floats, Floats, Floats, Floats],
    ) -> None:
        """Add a stretch: stations (k, m) of Re_x, run, cf, St and intermittency.

        `run` (k, m) is the length of the stretch as seen from each station; the stations are the
        Gauss points and the end.
        """
        re_x, run, cf, stanton, gamma = stations
        nodes, weights, collect = _gauss(re_x.shape[1] - 1)
        weight = run * np.append(weights, 0.0)
        self.friction[index] += np.sum(weight * cf, axis=1)
        heat = 1.0 / stanton if columns.flux else stanton
        before = self.heat[index, None]
        inside = before + (run * heat)[:, : nodes.size] @ collect.T
        self.heat[index] += np.sum(weight * heat, axis=1)
        so_far = np.hstack([inside, self.heat[index, None]])
        flux = (stanton * self._left(columns, so_far)).min(axis=1)
        self.least_flux[index] = np.minimum(self.least_flux[index], flux)
        self.turbulent[index] += np.sum(weight * gamma, axis=1)
        self.least[index] = np.minimum(self.least[index], stanton.min(axis=1))
        self.last[index] = stanton[:, -1]
        if columns.flux:
            wall = self._wall(columns, re_x, stanton).max(axis=1)
            self.wall_high[index] = np.maximum(self.wall_high[index], wall)


def laminar_layer(surface: Surface) -> Laminar:
    """The laminar layer on this sort of surface."""
    layer = PlateLaminar(surface) if surface.re_d is None else PassageLaminar(surface)
    if surface.scatter is None:
        return layer
    return ScatteredLaminar(layer, surface.scatter, surface.flux)


def laminar_thickness(re_x: Floats, re_d: Floats | None) -> Floats:
    """Re_theta [-] of the laminar layer at Re_x; between plates at most the parabola's.

    The thinning of a layer under an accelerating core and the faster core nearly cancel in
    Re_theta (Thwaites' method, 5 % at a core 20 % faster), so the plate's value serves until the
    layers meet; the parabola has theta = s/15, Re_theta = 0.05 Re_D.
    """
    plate = flat_plate.laminar_re_theta(re_x)
    if re_d is None:
        return plate
    return plate / (1.0 + (plate / (0.05 * re_d)) ** 4) ** 0.25


def _wires(surface: Surface) -> tuple[Wire, ...]:
    """The wires in the order in which the flow meets them, each with what it meets."""
    if surface.wire_x is None or surface.wire_k is None:
        return ()
    found: list[Wire] = []
    for number in range(surface.wires):
        spacing = 0.0 if surface.wire_spacing is None else surface.wire_spacing
        found.append(_wire(surface, surface.wire_x + number * spacing, found))
    return tuple(found)


def _wire(surface: Surface, place: Floats, ahead: list[Wire]) -> Wire:
    """The wire at `place` (in Re_x), behind those `ahead`, whose steps the layer carries on."""
    re_x = np.maximum(place, 1e-6 * surface.re_l)
    re_d, wire_k = surface.re_d, np.asarray(surface.wire_k)
    speed_up, blockage = np.ones_like(re_x), np.zeros_like(re_x)
    if re_d is not None:
        speed_up = entrance.core_velocity(np.sqrt(re_x) / re_d)
        blockage = 2.0 * surface.facing * wire_k / re_d
    calm = np.zeros_like(re_x)
    steps = [(wire, (calm, wire.thickening(calm))) for wire in ahead]
    behind_end = flat_plate.smooth_step(re_x / surface.re_l, 1.0, 1.1)
    return Wire(
        re_x=re_x,
        re_height=wire_k,
        speed_up=speed_up,
        re_theta=laminar_growth(surface, tuple(ahead), steps, re_x),
        blockage=blockage,
        on_plate=1.0 - behind_end,
        drag_coefficient=surface.drag_coefficient,
        grit=surface.grit,
        criterion=surface.criterion,
    )


def laminar_growth(
    surface: Surface,
    wires: tuple[Wire, ...],
    steps: list[tuple[Wire, tuple[Floats, Floats]]],
    re_x: Floats,
) -> Floats:
    """Re_theta of the laminar layer at `re_x`, with the steps of the wires carried along.

    Between wires the momentum integral of a laminar layer: Re_theta^2 grows by 0.441 Re_x.
    """
    if not wires:
        return laminar_thickness(re_x, surface.re_d)
    place = np.minimum(wires[0].re_x, re_x)
    re_theta = laminar_thickness(place, surface.re_d)
    for number, (_, (_, carried)) in enumerate(steps):
        re_theta = re_theta + carried
        after = re_x if number + 1 == len(wires) else np.minimum(wires[number + 1].re_x, re_x)
        re_theta = np.sqrt(re_theta**2 + flat_plate.BLASIUS**2 * np.maximum(after - place, 0.0))
        place = np.maximum(after, place)
    return re_theta


def _momentum(surface: Surface, gamma: Floats, re_theta: Floats) -> Floats:
    """Momentum factor at the outlet, laminar and turbulent mixed by its intermittency."""
    re_d = surface.re_d
    if re_d is None:
        return np.ones_like(surface.re_l)
    momentum = entrance.momentum_factor(np.sqrt(surface.re_l) / re_d)
    index = np.flatnonzero(gamma > 0.0)
    some, thickness = re_d[index], re_theta[index]
    fanning = passage.developed_friction(some, np.zeros_like(some))
    full = passage.turbulent_momentum_factor(thickness, some, fanning)
    momentum[index] += gamma[index] * (full - momentum[index])
    return momentum


def _behind_onset(
    surface: Surface,
    onset: Onset,
    sustains: Floats,
    re_theta: Floats,
    index: NDArray[np.intp],
    totals: _Totals,
) -> tuple[Floats, Floats]:
    """Add the transitional and the turbulent stretch; outlet intermittency and Re_theta."""
    columns = surface.part(index)
    re_t, length = onset.re_x[index, None], onset.length[index, None]
    weight = sustains[index, None]
    fractions, weights, collect = _gauss(_IN_TRANSITION)
    xi_end = np.minimum((columns.re_l - re_t) / length, _XI_END)
    gamma = transition.mixing_weight(xi_end * _and_outlet(fractions, 1.0))
    run = length * xi_end
    re_x = re_t + run * _and_outlet(fractions, 1.0)
    inside = slice(0, fractions.size)
    thickness, end = _grow(
        re_x[:, inside], gamma[:, inside], re_theta[index, None], run, collect, weights
    )
    thickness = np.hstack([thickness, end])
    gamma *= weight
    cf, stanton = mixed(columns, laminar_layer(columns), re_x, thickness, gamma)
    run_here = np.broadcast_to(run, re_x.shape)
    totals.add(index, columns, (re_x, run_here, cf, stanton, gamma))
    gamma_end, re_e = gamma[:, -1].copy(), re_x[:, -1]
    grown = xi_end[:, 0] >= _XI_END
    for chosen in (grown & (weight[:, 0] == 1.0), grown & (weight[:, 0] < 1.0)):
        rows = np.flatnonzero(chosen)
        if rows.size:
            end[rows] = _turbulent_stretch(
                surface, sustains, index[rows], re_e[rows], end[rows], totals
            )
            gamma_end[rows] = weight[rows, 0]
    return gamma_end, end[:, 0]


def _turbulent_stretch(
    surface: Surface,
    sustains: Floats,
    index: NDArray[np.intp],
    start: Floats,
    re_theta: Floats,
    totals: _Totals,
) -> Floats:
    """Add the stretch from `start` to the end, stations spread evenly in ln Re_theta.

    The designs either all keep up their turbulence in full, or none does: only where they do not
    has the laminar flow a share in it. Returns Re_theta at the end, (k, 1).
    """
    columns = surface.part(index)
    start, weight = start[:, None], sustains[index, None]
    last = flat_plate.turbulent_growth(re_theta, columns.re_l - start)
    fractions, _, _ = _gauss(_IN_TURBULENCE)
    spread = np.log(last / re_theta)
    thickness = re_theta * np.exp(spread * _and_outlet(fractions, 1.0))
    re_x = start + flat_plate.turbulent_run(thickness) - flat_plate.turbulent_run(re_theta)
    run = 2.0 / flat_plate.turbulent_friction(thickness) * thickness * spread
    if weight[0, 0] == 1.0:
        cf, stanton = turbulent(columns, re_x, thickness)
    else:
        cf, stanton = mixed(columns, laminar_layer(columns), re_x, thickness, weight)
    gamma = np.broadcast_to(weight, re_x.shape)
    totals.add(index, columns, (re_x, run, cf, stanton, gamma))
    return last


def _and_outlet(values: Floats, outlet: float) -> Floats:
    """Values at the Gauss points and at the end of the stretch."""
    return np.append(values, outlet)


def _grow(
    re_x: Floats,
    gamma: Floats,
    start: Floats,
    run: Floats,
    collect: Floats,
    weights: Floats,
) -> tuple[Floats, Floats]:
    """Re_theta at the stations and at the end of transition, d Re_theta / d Re_x = cf/2.

    Picard iteration on Gauss points; the turbulent cf depends on Re_theta so weakly that four
    rounds leave 1e-4.
    """
    calm = 0.5 * (1.0 - gamma) * flat_plate.laminar_friction(re_x)
    thickness = start + (run * 0.5 * flat_plate.turbulent_friction(start * 1.5) * gamma) @ collect.T
    for _ in range(4):
        growth = calm + 0.5 * gamma * flat_plate.turbulent_friction(thickness)
        thickness = start + run * (growth @ collect.T)
    growth = calm + 0.5 * gamma * flat_plate.turbulent_friction(thickness)
    return thickness, start + run * (growth @ weights)[:, None]


def mixed(
    surface: Surface, laminar: Laminar, re_x: Floats, re_theta: Floats, gamma: Floats
) -> tuple[Floats, Floats]:
    """Local cf and St at stations (k, m): laminar and turbulent mixed by intermittency."""
    cf, stanton = laminar.friction(re_x), laminar.stanton(re_x)
    cf_full, stanton_full = turbulent(surface, re_x, re_theta)
    return cf + gamma * (cf_full - cf), stanton + gamma * (stanton_full - stanton)


def turbulent(surface: Surface, re_x: Floats, re_theta: Floats) -> tuple[Floats, Floats]:
    """Local cf and St of the turbulent layer, in a passage joined to developed flow."""
    cf, stanton = _turbulent(surface, re_x, re_theta)
    scatter = surface.scatter
    if scatter is None:
        return cf, stanton
    return cf * scatter.turbulent_friction, stanton * scatter.turbulent_heat


def _turbulent(surface: Surface, re_x: Floats, re_theta: Floats) -> tuple[Floats, Floats]:
    """The same as the laws have it, without their scatter."""
    re_theta = np.maximum(re_theta, _THINNEST)
    cf = flat_plate.turbulent_friction(re_theta)
    stanton = flat_plate.turbulent_stanton(cf, surface.pr)
    if surface.re_rough is not None:
        cf, share = flat_plate.rough_friction(cf, re_x, surface.re_rough)
        rough = flat_plate.rough_stanton(cf, surface.pr, surface.re_rough)
        stanton = stanton + share * np.maximum(rough - stanton, 0.0)
    if surface.re_d is None:
        return cf, stanton
    re_d = surface.re_d
    relative = np.zeros_like(re_d) if surface.re_rough is None else surface.re_rough / re_d
    speed_up = passage.core_speed_up(re_theta, re_d)
    cf, stanton = cf * speed_up**2, stanton * speed_up
    share = passage.merged(re_theta, re_d)
    developed = passage.developed_nusselt(re_d, surface.pr, relative) / (re_d * surface.pr)
    developed = developed * passage.local_entrance(re_x / re_d)
    cf = cf + share * (passage.developed_friction(re_d, relative) - cf)
    return cf, stanton + share * (developed - stanton)


@cache
def _gauss(points: int) -> tuple[Floats, Floats, Floats]:
    """Gauss points on 0..1, weights, and the matrix of integrals from 0 to each point."""
    nodes, weights = np.polynomial.legendre.leggauss(points)
    nodes, weights = 0.5 * (nodes + 1.0), 0.5 * weights
    powers = np.arange(points)
    fit = np.linalg.inv(nodes[:, None] ** powers)
    collect = (nodes[:, None] ** (powers + 1) / (powers + 1)) @ fit
    return nodes, weights, collect
