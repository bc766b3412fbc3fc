"""Kind `plate`: one plate in a free stream, one face or both swept.

There is no duct: the fan power is drag times velocity over efficiency, the power that the stream
loses to the plate.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from problems.case import Case
from problems.convection.fluids import Fluid
from problems.kinds.swept import Settings, Walked, inlet_of, walk

Floats = NDArray[np.float64]

NOTE = (
    "One plate in a free stream has no duct: its fan power is drag times velocity over efficiency, "
    "the power that the stream loses to the plate. A fan that moves the whole stream draws more."
)


def balance(case: Case, fluid: Fluid, given: Settings) -> tuple[Walked, dict[str, Floats]]:
    """Walk along the plates and balance heat, force and power; outcomes by name, shape (n,)."""
    wall, flux = case.plates.surface.temperature, 0.0
    if wall is None:
        flux = case.plates.surface.flux or 0.0

    def film_of(walked: Walked, some: Settings) -> Floats:
        arriving = inlet_of(case, some)
        if wall is not None:
            return arriving + 0.5 * walked.film_share * (wall - arriving)
        return arriving + 0.5 * flux / walked.h

    inlet = inlet_of(case, given)
    start = np.full_like(given["length"], inlet if wall is None else 0.5 * (inlet + wall))
    walked = walk(case, fluid, given, film_of, start)
    area = case.plates.faces * given["width"] * given["length"]
    dynamic = 0.5 * walked.flux_density * walked.speed
    wire_drag = walked.sweep.wire_friction * dynamic * area
    drag = walked.sweep.friction * dynamic * area + wire_drag
    if wall is None:
        heat_flux = np.full_like(area, flux)
        coldest, hottest = walls_under_flux(walked, given, inlet, flux)
    else:
        heat_flux = walked.h * walked.film_share * (wall - inlet)
        coldest = hottest = np.full_like(area, wall)
    return walked, {
        "heat": heat_flux * area,
        "drag": drag,
        "wire_drag": wire_drag,
        "fan_power": drag * given["velocity"] / case.fan.efficiency / given.get("efficiency", 1.0),
        "hottest_wall": hottest,
        "coldest_wall": coldest,
        "plate_area": area,
    }


def walls_under_flux(
    walked: Walked, given: Settings, inlet: Floats | float, flux: float
) -> tuple[Floats, Floats]:
    """Lowest and highest wall temperature [K] under a uniform flux [W/m2] (negative: cooled).

    At the leading edge, where the layer begins, the wall has the temperature of the stream.
    """
    rise = flux / (walked.flux_density * walked.properties.cp)
    clean = inlet + flux * given.get("fouling", 0.0)  # what fouls a wall adds to its temperature
    far, edge = clean + rise * walked.sweep.wall_high, np.full_like(walked.h, clean)
    return (edge, far) if flux > 0.0 else (far, edge)
