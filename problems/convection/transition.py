"""Where a laminar layer turns turbulent: natural onset, length of transition, trip wires.

Pure functions on arrays. Turbulence levels are in percent, Reynolds numbers on the velocity outside
the layer. What the layer then does to friction and heat is the business of `sweep`.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from problems.convection.flat_plate import (
    BLASIUS,
    SHAPE_LAMINAR,
    THETA_OVER_DELTA,
    profile_mean_square,
    profile_velocity,
    smooth_step,
    turbulent_mean_square,
)

Floats = NDArray[np.float64]

QUIET_LIMIT = 2.8e6  # onset Re_x in a quiet stream, Schubauer and Skramstad 1948 (from memory)
WIRE_LOW, WIRE_DESIGN = 826.0, 900.0  # Gibbings 1959; Kraemer 1961 (both from memory)
GRIT_LOW, GRIT_DESIGN = (
    500.0,
    600.0,
)  # Re_k of three-dimensional grit, Braslow and Knox 1958 (memory)
GRIT_COVER = 0.3  # frontal share of a sparse strip of grit, over a wire as tall (our assumption)
_DRYDEN = 0.8  # k/delta* up to which the law for small wires is used
_WIRE_NONE = 600.0  # where the smooth weight begins: five sixths at 826, 1 from 900
HOLDS, FAILS = 320.0, 200.0  # Re_theta behind the wire, Preston 1958 (from memory)
FORCED_LENGTH = 2e4  # Re from an effective wire to full turbulence, Kraemer 1961 (from memory)
COMPLETE = 3.3433  # xi at which the intermittency is 0.99
_SOFT = 0.03  # width, in ln Re, of the rounded corner where one onset takes over from another


def onset_re_theta(turbulence: Floats) -> Floats:
    """Re_theta [-] at natural onset for free-stream turbulence [%] (leading edge to onset).

    163 + exp(6.91 - Tu), Abu-Ghannam and Shaw 1980; zero pressure gradient, Tu about 0.3 to 10 %.
    """
    return 163.0 + np.exp(6.91 - turbulence)


def onset_re_x(turbulence: Floats) -> Floats:
    """Re_x [-] at natural onset for free-stream turbulence [%], capped for quiet streams."""
    re_x = (onset_re_theta(turbulence) / BLASIUS) ** 2
    return _soft_least(re_x, np.full_like(re_x, QUIET_LIMIT))


def onset_second_opinions(turbulence: float) -> dict[str, float]:
    """Onset Re_x by two other published laws, for the reader and never mixed into the number."""
    mayle = 400.0 * turbulence ** (-5.0 / 8.0)
    if turbulence <= 1.3:
        langtry = 1173.51 - 589.428 * turbulence + 0.2196 / turbulence**2
    else:
        langtry = 331.50 * (turbulence - 0.5658) ** -0.671
    return {
        "Mayle 1991": (mayle / BLASIUS) ** 2,
        "Langtry and Menter 2009": (langtry / BLASIUS) ** 2,
    }


def equivalent_turbulence(critical_reynolds: float) -> float:
    """Free-stream turbulence [%] whose natural onset lies at the given Re_x, at most 10 %."""
    excess = max(BLASIUS * np.sqrt(min(critical_reynolds, QUIET_LIMIT)) - 163.0, np.exp(-3.09))
    return float(max(6.91 - np.log(excess), 0.0))


def length_scale(re_onset: Floats) -> Floats:
    """Length scale lambda of natural transition, in Re_x; Narasimha 1985: 9 Re_xt^0.75."""
    return 9.0 * re_onset**0.75


def intermittency(xi: Floats) -> Floats:
    """Share of time that the layer is turbulent; Dhawan and Narasimha 1958.

    `xi` is the distance from onset over the length scale; 0 ahead of onset.
    """
    return -np.expm1(-0.412 * np.maximum(xi, 0.0) ** 2)


def mixing_weight(xi: Floats) -> Floats:
    """Weight of the turbulent friction factor and Stanton number at `xi`: intermittency^1.3.

    The power is fitted to the measured friction through transition of two plates (T3A 6.1 %, T3A-
    12.1 % to 4 % root-mean-square) and to the marched equations; 1 is the usual choice.
    """
    return np.asarray(intermittency(xi) ** 1.3)


@dataclass(frozen=True)
class Wire:
    """A trip wire on each design; shape (n,), Reynolds numbers on the stream's nominal velocity.

    `re_x` is U x/nu of its place, `re_height` U k/nu of its diameter, `speed_up` the velocity
    outside the layer there over the nominal one, `re_theta` the laminar layer's there,
    `blockage` the wires' share of the gap (0 on a single plate), `drag_coefficient` on the mean
    square of the undisturbed profile over the wire's height, `on_plate` 1 on the plate, fading to
    0 over a tenth of its length behind its end; `criterion` multiplies the figures from which it
    trips. With `grit` it is a strip of three-dimensional
    roughness of that height instead: another criterion, and less drag for the same height.
    """

    re_x: Floats
    re_height: Floats
    speed_up: Floats
    re_theta: Floats
    blockage: Floats
    on_plate: Floats
    drag_coefficient: Floats | float
    grit: bool = False
    criterion: Floats | float = 1.0

    @property
    def reynolds(self) -> Floats:
        """Wire Reynolds number U k/nu [-] with the velocity outside the layer."""
        return self.re_height * self.speed_up

    @property
    def top_reynolds(self) -> Floats:
        """Re_k [-]: height and the undisturbed laminar velocity at that height."""
        return self.reynolds * profile_velocity(BLASIUS * self.height_over_theta)

    @property
    def margin(self) -> Floats:
        """Over the figure that is sure to trip: U k/nu over 900, of grit Re_k over 600 [-]."""
        if self.grit:
            return self.top_reynolds / GRIT_DESIGN
        return self.reynolds / WIRE_DESIGN

    @property
    def height_over_theta(self) -> Floats:
        """Wire diameter over the laminar momentum thickness at its place [-]."""
        return self.reynolds / self.re_theta

    @property
    def height_over_displacement(self) -> Floats:
        """Wire diameter over the laminar displacement thickness at its place [-]."""
        return self.height_over_theta / SHAPE_LAMINAR

    @property
    def squeeze(self) -> Floats:
        """Factor on the wire's drag for the faster flow past it in a gap (continuity)."""
        return (1.0 - np.minimum(self.blockage, 0.9)) ** -2

    def thickening(self, turbulent: Floats) -> Floats:
        """Step in Re_theta [-] across the wire: half its drag coefficient on the local flow.

        `turbulent`: intermittency of the layer that the wire stands in.
        """
        mean_square = profile_mean_square(BLASIUS * self.height_over_theta)
        if np.any(turbulent > 0.0):
            # a turbulent layer is thicker (1/5 power law from the edge) and fuller
            theta = 0.036 * self.re_x**0.8
            full = turbulent_mean_square(self.reynolds / theta * THETA_OVER_DELTA)
            mean_square = mean_square + turbulent * (full - mean_square)
        cover = GRIT_COVER if self.grit else 1.0
        step = 0.5 * self.drag_coefficient * cover * self.reynolds * mean_square
        return step * self.squeeze * self.on_plate

    def trips(self) -> Floats:
        """Smooth weight of the criterion U k/nu: 0 at 600, five sixths at 826, 1 from 900.

        Grit: of the criterion Re_k, 0 at 500 and 1 from 600.
        """
        if self.grit:
            reached = self.top_reynolds / self.criterion
            return smooth_step(reached, GRIT_LOW, GRIT_DESIGN) * self.on_plate
        return smooth_step(self.reynolds / self.criterion, _WIRE_NONE, WIRE_DESIGN) * self.on_plate

    def holds(self) -> Floats:
        """Smooth weight of the criterion Re_theta behind the wire: 0 at 200, 1 from 320."""
        behind = self.re_theta + self.thickening(np.zeros_like(self.re_theta))
        return smooth_step(behind, FAILS, HOLDS)

    def added_turbulence(self) -> Floats:
        """Turbulence [%] that a wire too small to trip acts like; Dryden 1958, 4.4 (k/delta*)^3.

        Levels off at k/delta* 0.8, the end of its range: else a taller wire that fails the criteria
        of `trips` or `holds` would be credited with transition at itself all the same. Grit too
        small to trip does next to nothing.
        """
        if self.grit:
            return np.zeros_like(self.re_x)
        ratio = self.height_over_displacement
        ratio = ratio / (1.0 + (ratio / _DRYDEN) ** 8) ** 0.125
        return 4.4 * ratio**3 * smooth_step(ratio, 0.1, 0.3) * self.on_plate


@dataclass(frozen=True)
class Onset:
    """Where transition begins and how long it takes, in Re_x; shape (n,).

    `natural` without wires, `re_x` with them; `length` is the scale of the intermittency;
    `forced` the weight (0 to 1) with which a wire itself sets the onset.
    """

    natural: Floats
    re_x: Floats
    length: Floats
    forced: Floats


def onset(natural: Floats, turbulence: Floats | float, wires: Sequence[Wire]) -> Onset:
    """Onset of transition from the natural one, the turbulence level [%] and wires in a row.

    A wire that trips and holds sets the onset where it stands. One too small moves it upstream,
    at most to itself: its equivalent turbulence is added to the stream's, root-sum-square (our
    assumption). A wire behind the onset changes nothing; its credit fades over the last tenth
    before it. Wires are taken in the order in which the flow meets them.
    """
    re_x, forced = natural, np.zeros_like(natural)
    for wire in wires:
        noisy = np.hypot(turbulence, wire.added_turbulence())
        early = natural * onset_re_x(noisy) / onset_re_x(np.atleast_1d(turbulence))
        moved = np.minimum(re_x, _soft_most(early, wire.re_x))
        ahead = 1.0 - smooth_step(wire.re_x / re_x, 0.9, 1.0)
        sets = wire.trips() * wire.holds() * ahead
        place = np.minimum(wire.re_x, re_x)
        re_x = moved * (place / moved) ** sets
        forced = 1.0 - (1.0 - forced) * (1.0 - sets)
    length = length_scale(re_x)
    length = length * (FORCED_LENGTH / COMPLETE / length) ** forced
    return Onset(natural, re_x, length, forced)


def _soft_least(first: Floats, second: Floats) -> Floats:
    """The lesser of two positive numbers, its corner rounded over some per cent."""
    return 1.0 / _soft_most(1.0 / first, 1.0 / second)


def _soft_most(first: Floats, second: Floats) -> Floats:
    """The greater of two positive numbers, its corner rounded over some per cent."""
    return np.exp(_SOFT * np.logaddexp(np.log(first) / _SOFT, np.log(second) / _SOFT))
