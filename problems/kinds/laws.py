"""The laws that the kinds use, with their sources and ranges, and which designs lie outside.

One list: what `check` prints, what `point` judges and what a run records all come from here.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from problems.convection.passage import BAND_LOW
from problems.convection.sweep import Surface, Sweep
from problems.problem import Bools, Law

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Walk:
    """A walk along the plates with what it was asked; arrays of shape (n,)."""

    surface: Surface
    sweep: Sweep

    @property
    def turbulent(self) -> Bools:
        """Designs with a stretch of turbulent or transitional layer that the passage keeps."""
        share = self.sweep.turbulent_share
        return share > 1e-3

    @property
    def wired(self) -> Bools:
        """Designs whose wire stands on the plate ahead of the natural onset."""
        wire = self.sweep.wire
        if wire is None:
            return np.zeros(self.surface.re_l.shape, dtype=bool)
        ahead = wire.re_x < np.minimum(self.sweep.onset.natural, self.surface.re_l)
        return ahead & (wire.re_height > 1.0)


Outside = Callable[[Walk], Bools]
Ranges = tuple[tuple[Law, Outside], ...]


def _laminar_heat(walk: Walk) -> Bools:
    return (walk.surface.pr < 0.5) | (walk.surface.pr > 1e4)


def _laminar_layer(walk: Walk) -> Bools:
    return walk.surface.re_l < 1e3


def _turbulent_friction(walk: Walk) -> Bools:
    return walk.turbulent & (walk.sweep.re_theta_end > 5e4)


def _turbulent_heat(walk: Walk) -> Bools:
    pr = walk.surface.pr
    return walk.turbulent & ((pr < 0.5) | (pr > 257.0) | (walk.surface.re_l > 1e8))


def _onset(walk: Walk) -> Bools:
    level = np.asarray(walk.surface.turbulence)
    return ((level < 0.3) | (level > 10.0)) & (walk.sweep.onset.natural < walk.surface.re_l)


def _wire(walk: Walk) -> Bools:
    wire = walk.sweep.wire
    if wire is None:
        return walk.wired
    return walk.wired & (wire.blockage > 0.5)


def _entrance(walk: Walk) -> Bools:
    if walk.surface.re_d is None:
        return np.zeros(walk.surface.re_l.shape, dtype=bool)
    return (walk.surface.re_d < 50.0) | (walk.surface.pr < 0.5) | (walk.surface.pr > 1e5)


def _developed(walk: Walk) -> Bools:
    re_d, pr = walk.surface.re_d, walk.surface.pr
    if re_d is None:
        return np.zeros(pr.shape, dtype=bool)
    return walk.turbulent & ((re_d > 5e6) | (pr < 0.5) | (pr > 2000.0))


def _band(walk: Walk) -> Bools:
    re_d = walk.surface.re_d
    if re_d is None:
        return np.zeros(walk.surface.pr.shape, dtype=bool)
    return walk.turbulent & (re_d < BAND_LOW)


def _roughness(walk: Walk) -> Bools:
    rough = walk.surface.re_rough
    if rough is None:
        return np.zeros(walk.surface.pr.shape, dtype=bool)
    short = walk.surface.re_l / np.maximum(rough, 1e-9) < 100.0
    return walk.turbulent & (short | (walk.surface.pr > 6.0))


_COMMON: Ranges = (
    (
        Law("laminar friction", "Blasius 1908", "Re_x from 1e3, no pressure gradient"),
        _laminar_layer,
    ),
    (
        Law(
            "laminar heat",
            "form of Churchill and Ozoe 1973, constants from the similarity solution",
            "Pr 0.5 to 1e4",
        ),
        _laminar_heat,
    ),
    (
        Law(
            "natural onset",
            "Abu-Ghannam and Shaw 1980; quiet streams Schubauer and Skramstad 1948",
            "turbulence 0.3 to 10 %; the onset Re_x is good to a factor 1.5 either way",
        ),
        _onset,
    ),
    (
        Law(
            "length of transition",
            "Dhawan and Narasimha 1958, Narasimha 1985",
            "no pressure gradient",
        ),
        lambda walk: np.zeros(walk.surface.pr.shape, dtype=bool),
    ),
    (
        Law("turbulent friction", "Karman and Schoenherr", "Re_theta up to 5e4"),
        _turbulent_friction,
    ),
    (
        Law("turbulent heat", "Lienhard 2020", "Pr 0.5 to 257, Re_x to 1e8"),
        _turbulent_heat,
    ),
)

_WIRE: tuple[Law, Outside] = (
    Law(
        "trip wire",
        "Gibbings 1959, Kraemer 1961, Preston 1958; too small a wire Dryden 1958",
        "round wire across the flow, at most half of the gap taken by wires",
    ),
    _wire,
)

_GRIT: tuple[Law, Outside] = (
    Law(
        "strip of grit",
        "Braslow and Knox 1958 (Re_k 600), Preston 1958; drag 0.3 of a wire's is assumed",
        "sparse three-dimensional grit, under half of the gap",
    ),
    _wire,
)

_ROUGH: tuple[Law, Outside] = (
    Law(
        "rough turbulent wall",
        "Prandtl and Schlichting; Haaland 1983; Dipprey and Sabersky 1963; Norris 1970",
        "sand roughness, length over 100 times its height, Pr 0.7 to 6",
    ),
    _roughness,
)

_PASSAGE: Ranges = (
    (
        Law(
            "laminar entrance between plates",
            "boundary-layer equations marched; limits: Blasius and developed flow",
            "uniform inlet stream, Re_D from 50, Pr 0.5 to 1e5",
        ),
        _entrance,
    ),
    (
        Law(
            "developed turbulent flow between plates",
            "Petukhov at two thirds of Re (Jones 1976), Gnielinski 1976",
            "Re_D 2300 to 5e6, Pr 0.5 to 2000",
        ),
        _developed,
    ),
    (
        Law("transitional band", "Gnielinski 2013", "Re_D 2300 to 4000, linear between"),
        _band,
    ),
)

_ENDS: tuple[Law, Outside] = (
    Law(
        "entrance and exit of a stack",
        "Kays 1950",
        "flow that fills the ducts before and behind the stack",
    ),
    lambda walk: np.zeros(walk.surface.pr.shape, dtype=bool),
)


def in_use(*, passage: bool, trip: str | None, rough: bool, ends: bool) -> Ranges:
    """The laws that a problem with these features uses, each with the test of its range.

    `trip` is None, "wire" or "grit".
    """
    chosen = _COMMON
    if trip is not None:
        chosen = (*chosen, _GRIT if trip == "grit" else _WIRE)
    if rough:
        chosen = (*chosen, _ROUGH)
    if passage:
        chosen = chosen + _PASSAGE
    return (*chosen, _ENDS) if ends else chosen
