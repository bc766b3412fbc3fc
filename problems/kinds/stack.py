"""Kind `stack`: parallel plates with fluid between them, all gaps alike, fed from a plenum.

Every gap is swept on both faces and carries a wire on both. The stack count is a real number while
searching: one plate with its gap, repeated over the height.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from problems.case import Case
from problems.convection import passage
from problems.convection.fluids import Fluid
from problems.kinds.plate import wall_under_flux
from problems.kinds.swept import Settings, Walked, walk

Floats = NDArray[np.float64]


def complete(case: Case, given: dict[str, Floats]) -> dict[str, Floats]:
    """The settings with height and count, of which the case gives one."""
    pitch = given["gap"] + given["thickness"]
    if case.plates.count is not None:
        count = np.full_like(pitch, float(case.plates.count))
        return {**given, "count": count, "height": count * pitch}
    height = np.full_like(pitch, float(case.plates.height or 0.0))
    return {**given, "height": height, "count": height / pitch}


def balance(case: Case, fluid: Fluid, given: Settings) -> tuple[Walked, dict[str, Floats]]:
    """Walk along the gaps and balance heat, force, pressure and power; outcomes by name."""
    inlet, wall = case.fluid.temperature, case.plates.surface.temperature
    flux = case.plates.surface.flux or 0.0

    def film_of(walked: Walked, some: Settings) -> Floats:
        if wall is not None:
            units = np.maximum(walked.units, 1e-12)
            below = (wall - inlet) * -np.expm1(-units) / units
            return wall - 0.5 * below
        return inlet + 0.5 * _rise(walked, some, flux) + 0.5 * flux / walked.h

    start = np.full_like(given["gap"], inlet if wall is None else wall - 0.4 * (wall - inlet))
    walked = walk(case, fluid, given, film_of, start)
    if wall is not None:
        outlet = wall - (wall - inlet) * np.exp(-walked.units)
        hottest, outlet_wall = np.full_like(outlet, wall), np.full_like(outlet, wall)
    else:
        outlet = inlet + _rise(walked, given, flux)
        hottest = wall_under_flux(walked, inlet, flux)
        local = walked.sweep.outlet_stanton * walked.flux_density * walked.properties.cp
        outlet_wall = outlet + flux / local
    passages = given["count"] * given["width"]
    mass_flow = walked.flux_density * given["gap"] * passages
    flow_rate = given["velocity"] * given["gap"] * passages
    area = 2.0 * passages * given["length"]
    dynamic = 0.5 * walked.flux_density * walked.speed
    drops = _drops(case, fluid, given, walked, np.clip(outlet, fluid.low, fluid.high))
    pressure_drop = sum(drops.values(), np.zeros_like(outlet))
    return walked, {
        "heat": mass_flow * walked.properties.cp * (outlet - inlet),
        "drag": (walked.sweep.friction + walked.sweep.wire_friction) * dynamic * area,
        "wire_drag": walked.sweep.wire_friction * dynamic * area,
        "fan_power": np.maximum(pressure_drop, 0.0) * flow_rate / case.fan.efficiency,
        "hottest_wall": hottest,
        "plate_area": area,
        "pressure_drop": pressure_drop,
        **drops,
        "flow_rate": flow_rate,
        "mass_flow": mass_flow,
        "outlet_temperature": outlet,
        "approach": np.abs(outlet_wall - outlet),
        "gap_reynolds": np.asarray(walked.surface.re_d),
        "volume": given["length"] * given["width"] * given["height"],
    }


def _rise(walked: Walked, given: Settings, flux: float) -> Floats:
    """Temperature rise [K] of the fluid over the length under a uniform flux on both faces."""
    capacity = walked.flux_density * walked.properties.cp * given["gap"]
    return 2.0 * flux * given["length"] / capacity


def _drops(
    case: Case, fluid: Fluid, given: Settings, walked: Walked, outlet: Floats
) -> dict[str, Floats]:
    """The parts of the static pressure drop [Pa], plenum to plenum."""
    inlet_rho = fluid.at(np.array([case.fluid.temperature])).rho
    outlet_rho = fluid.at(outlet).rho
    square = walked.flux_density**2
    dynamic = 0.5 * square / walked.properties.rho
    walls = 2.0 * given["length"] / given["gap"]
    porosity = given["gap"] / (given["gap"] + given["thickness"])
    momentum = walked.sweep.momentum_factor
    ends = case.plates.ends
    recovered = passage.exit_recovery(porosity, momentum, ends)
    return {
        "entrance_drop": 0.5 * square / inlet_rho * passage.entrance_loss(porosity, ends),
        "shear_drop": walked.sweep.friction * dynamic * walls,
        "development_drop": 2.0 * dynamic * (momentum - 1.0),
        "heating_drop": square * (1.0 / outlet_rho - 1.0 / inlet_rho),
        "wire_drop": walked.sweep.wire_friction * dynamic * walls,
        "exit_drop": -0.5 * square / outlet_rho * recovered,
    }
