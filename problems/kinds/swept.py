"""What a plate in a free stream and a stack of plates share: variables, film temperature, wires.

Turns a case into arrays of designs and walks along them with properties at the film temperature.
The balance of forces, heat and power of each kind is left to `plate` and `stack`.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, fields, is_dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from problems.case import Case, Span
from problems.convection import transition
from problems.convection.fluids import Fluid, Properties
from problems.convection.scatter import Scatter
from problems.convection.sweep import Surface, Sweep, one_wall_wired, sweep
from problems.problem import Variable
from problems.tables import Trip

Floats = NDArray[np.float64]
Settings = Mapping[str, Floats]

GRAVITY = 9.80665
_TOLERANCE = 0.02  # K, film temperature
_ROUNDS = 8
CHUNK = 4096  # designs at once: arrays of one walk stay in the processor's cache


@dataclass(frozen=True)
class Walked:
    """A walk at its own film temperature; arrays of shape (n,).

    `flux_density` is rho u of the nominal velocity [kg/m2s], `speed` that velocity at film
    density; `h` the mean coefficient; `units` the exponent of the approach to the wall
    temperature (NTU, 0 on a plate in a free stream); temperatures in K. `film_share` is the part of
    the difference between wall and stream that is left to the film by what fouls the wall.
    """

    surface: Surface
    sweep: Sweep
    film: Floats
    properties: Properties
    flux_density: Floats
    speed: Floats
    h: Floats
    units: Floats
    film_share: Floats


def spans(case: Case) -> dict[str, tuple[Span, str]]:
    """The quantities that a case may leave free, by variable name, each with its unit."""
    found = {"length": (case.plates.length, "m")}
    if case.plates.gap is not None:
        found["gap"] = (case.plates.gap, "m")
    found["velocity"] = (case.flow.velocity, "m/s")
    if case.trip is not None:
        share = case.trip.position_is_share
        found["trip_share" if share else "trip_position"] = (
            case.trip.position,
            "1" if share else "m",
        )
        found["trip_height"] = (case.trip.height, "m")
        if case.trip.spacing is not None:
            share = case.trip.spacing.is_share
            found["trip_pitch_share" if share else "trip_pitch"] = (
                case.trip.spacing,
                "1" if share else "m",
            )
    return found


_ONLY_WITH_WIRE = ("trip_share", "trip_position", "trip_pitch_share", "trip_pitch")
_MEANING = {
    "length": "plate length along the flow",
    "gap": "clear gap between plates",
    "velocity": "velocity of the stream",
    "trip_share": "trip wire from the leading edge, share of the length",
    "trip_position": "trip wire from the leading edge",
    "trip_height": "diameter of the trip wire",
    "trip_pitch_share": "from one trip wire to the next, share of the length",
    "trip_pitch": "from one trip wire to the next",
}


def variables(case: Case) -> tuple[Variable, ...]:
    """The free quantities of a case; a range over more than a factor 3 is searched by ratio."""
    return tuple(
        Variable(
            name=name,
            unit=unit,
            low=span.low,
            high=span.high,
            meaning=_MEANING[name],
            scale="log" if span.low > 0.0 and span.high > 3.0 * span.low else "linear",
            only_with="trip_height" if name in _ONLY_WITH_WIRE else None,
        )
        for name, (span, unit) in spans(case).items()
        if not span.fixed
    )


def settings(case: Case, designs: Floats) -> dict[str, Floats]:
    """Geometry and flow of every design in full, from rows of the free variables."""
    count = len(designs)
    free = iter(np.asarray(designs, dtype=float).T)
    values = {
        name: np.full(count, span.low) if span.fixed else np.ascontiguousarray(next(free))
        for name, (span, _) in spans(case).items()
    }
    for share, place in (("trip_share", "trip_position"), ("trip_pitch_share", "trip_pitch")):
        if share in values:
            values[place] = values.pop(share) * values["length"]
    for name in ("trip_height", "trip_position", "trip_pitch"):
        values.setdefault(name, np.zeros(count))
        values[name] = np.where(values["trip_height"] > 0.0, values[name], 0.0)
    values["width"] = np.full(count, case.plates.width)
    values["thickness"] = np.full(count, case.plates.thickness)
    return values


def free_stream_turbulence(case: Case) -> tuple[float, float]:
    """Turbulence level [%] and natural onset Re_x [-] of a case.

    A critical Reynolds number is taken as the onset; the turbulence that would give it then
    serves for wires too small to trip.
    """
    if case.fluid.critical_reynolds is not None:
        level = transition.equivalent_turbulence(case.fluid.critical_reynolds)
        return level, case.fluid.critical_reynolds
    level = float(case.fluid.turbulence or 0.0)
    return level, float(transition.onset_re_x(np.array([level]))[0])


# What may deviate from the case, design by design, beside the settings: see `sampled`
LAWS = ("laminar_friction", "laminar_heat", "turbulent_friction", "turbulent_heat")


def inlet_of(case: Case, given: Settings) -> Floats | float:
    """Temperature [K] of the stream as it arrives at each design."""
    return given.get("inlet", case.fluid.temperature)


def _stream_of(case: Case, given: Settings) -> tuple[Floats | float, Floats | float]:
    """Turbulence level [%] and natural onset Re_x [-] that each design meets."""
    level, natural = free_stream_turbulence(case)
    if "turbulence" in given:
        levels = given["turbulence"]
        return levels, transition.onset_re_x(levels) * given.get("onset_factor", 1.0)
    return level, natural * given["onset_factor"] if "onset_factor" in given else natural


def _scatter_of(given: Settings) -> Scatter | None:
    """Factors on the laws at each design, None where every law is taken as it is."""
    if not any(name in given for name in LAWS):
        return None
    ones = np.ones_like(given["length"])
    return Scatter(*(given.get(name, ones) for name in LAWS))


def walk(
    case: Case,
    fluid: Fluid,
    given: Settings,
    film_of: Callable[[Walked, Settings], Floats],
    start: Floats,
) -> Walked:
    """Walk along every design with properties at the film temperature that comes out of it.

    `film_of` gives the film temperature that a walk implies; from `start` the two are brought
    together to 20 mK by secant steps. Designs that have settled are not walked again.
    """
    film = np.clip(start, fluid.low, fluid.high)
    done = _walk_at(case, fluid, given, film)
    miss = film_of(done, given) - film
    ahead = miss
    for _ in range(_ROUNDS):
        active = np.flatnonzero(np.abs(ahead) > _TOLERANCE)
        if not active.size:
            break
        some = {name: values[active] for name, values in given.items()}
        moved = np.clip(film[active] + ahead[active], fluid.low, fluid.high)
        fresh = _walk_at(case, fluid, some, moved)
        fresh_miss = film_of(fresh, some) - moved
        change = moved - film[active]
        slope = (fresh_miss - miss[active]) / np.where(change == 0.0, 1.0, change)
        done = _updated(done, active, fresh)
        film[active], miss[active] = moved, fresh_miss
        ahead[active] = fresh_miss / np.clip(-slope, 0.5, 2.0)
        ahead[active] = np.where(change == 0.0, 0.0, ahead[active])
    return done


def _wired(
    case: Case, trip: Trip, plain: Surface, given: Settings, per_metre: Floats
) -> tuple[Surface, Sweep]:
    """The surface with its wires and the walk along it; with wires on one side, along both."""
    one = trip.walls == "one"
    surface = replace(
        plain,
        wire_x=per_metre * given["trip_position"],
        wire_k=per_metre * given["trip_height"],
        wire_spacing=per_metre * given["trip_pitch"],
        wires=trip.wires,
        facing=1 if one or trip.facing == "staggered" else 2,
        grit=trip.sort == "grit",
        drag_coefficient=given.get("wire_drag", trip.drag_coefficient),
        criterion=given.get("wire_criterion", 1.0),
    )
    walked = sweep(surface)
    if one and not (case.kind == "plate" and case.plates.faces == 1):
        walked = one_wall_wired(walked, sweep(plain), plain.flux)
    return surface, walked


def _updated(whole: Any, index: NDArray[np.intp], part: Any) -> Any:
    """`whole` with the designs at `index` taken from `part`, through nested dataclasses."""
    if isinstance(whole, np.ndarray):
        merged = whole.copy()
        merged[index] = part
        return merged
    if isinstance(whole, tuple):
        return tuple(_updated(old, index, new) for old, new in zip(whole, part, strict=True))
    if not is_dataclass(whole) or isinstance(whole, type):
        return whole
    names = [item.name for item in fields(whole)]
    changes = {name: _updated(getattr(whole, name), index, getattr(part, name)) for name in names}
    return replace(whole, **changes)


def _walk_at(case: Case, fluid: Fluid, given: Settings, film: Floats) -> Walked:
    """One walk with properties at the given film temperatures."""
    properties = fluid.at(film)
    gap = given.get("gap")
    if gap is None:
        flux_density = properties.rho * given["velocity"]
    else:
        flux_density = fluid.at(np.atleast_1d(inlet_of(case, given))).rho * given["velocity"]
    per_metre = flux_density / properties.mu
    level, natural = _stream_of(case, given)
    trip, rough = case.trip, case.plates.roughness > 0.0
    surface = Surface(
        re_l=per_metre * given["length"],
        pr=properties.pr,
        natural=natural,
        turbulence=level,
        re_d=None if gap is None else per_metre * 2.0 * gap,
        re_rough=per_metre * case.plates.roughness if rough else None,
        flux=case.plates.surface.flux is not None,
        scatter=_scatter_of(given),
    )
    if trip is None:
        walked = sweep(surface)
    else:
        surface, walked = _wired(case, trip, surface, given, per_metre)
    h = walked.stanton * flux_density * properties.cp
    film_share = 1.0 / (1.0 + h * given.get("fouling", 0.0))
    units = np.zeros_like(film)
    if gap is not None:
        units = 2.0 * walked.stanton * film_share * given["length"] / gap
    return Walked(
        surface=surface,
        sweep=walked,
        film=film,
        properties=properties,
        flux_density=flux_density,
        speed=flux_density / properties.rho,
        h=h,
        units=units,
        film_share=film_share,
    )
