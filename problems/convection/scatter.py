"""How far measurements scatter about the laws: one factor on each law, design by design.

A published law is right within some per cent; a study of what is uncertain multiplies it with a
factor drawn from that band. How the factors are drawn is not known here.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    from problems.convection.sweep import Laminar

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Scatter:
    """Factors [-] on local friction factors and Stanton numbers; shape (n,), 1 for the law itself.

    They act on what a layer gives, not on how it grows: the scatter of a law is stated for given
    Reynolds numbers.
    """

    laminar_friction: Floats
    laminar_heat: Floats
    turbulent_friction: Floats
    turbulent_heat: Floats

    def part(self, index: NDArray[np.intp]) -> Scatter:
        """The same for some of the designs, as columns of shape (k, 1) for use with stations."""
        return Scatter(
            self.laminar_friction[index, None],
            self.laminar_heat[index, None],
            self.turbulent_friction[index, None],
            self.turbulent_heat[index, None],
        )


class ScatteredLaminar:
    """A laminar layer under the factors of a `Scatter`; see `sweep.Laminar`."""

    def __init__(self, layer: Laminar, scatter: Scatter, flux: bool) -> None:
        self._layer = layer
        self._friction, self._heat = scatter.laminar_friction, scatter.laminar_heat
        self._sum = 1.0 / self._heat if flux else self._heat

    def friction(self, re_x: Floats) -> Floats:
        return self._layer.friction(re_x) * self._friction

    def stanton(self, re_x: Floats) -> Floats:
        return self._layer.stanton(re_x) * self._heat

    def friction_sum(self, re_x: Floats) -> Floats:
        return self._layer.friction_sum(re_x) * self._friction

    def heat_sum(self, re_x: Floats) -> Floats:
        return self._layer.heat_sum(re_x) * self._sum
