"""What a design looks like: curves along the plate and a side view to scale, as plain numbers.

Drawing them is left to `optim`.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from problems.case import Case
from problems.convection.along import Along, along
from problems.problem import Curve, Floats, Profile, Region, Shape, Sketch

if TYPE_CHECKING:
    from problems.kinds.statement import Batch

_EDGES = (0.02, 0.98)  # intermittency at which the layer counts as transitional, turbulent


def profile(case: Case, batch: Batch) -> Profile:
    """Curves along the plate of the one design in `batch`."""
    walked = batch.walked
    local = along(walked.surface, walked.sweep)
    metre = float(batch.settings["length"][0]) / float(walked.surface.re_l[0])
    x = local.re_x * metre
    capacity = float(walked.flux_density[0] * walked.properties.cp[0])
    h = local.stanton * capacity
    dynamic = float(0.5 * walked.flux_density[0] * walked.speed[0])
    wall, bulk = _temperatures(case, batch, x, h, capacity)
    theta = local.re_theta * metre
    layer = theta * local.thickness
    thick = "distance from the wall at 99 % of the outer velocity"
    if "gap" in batch.settings:
        half = 0.5 * float(batch.settings["gap"][0])
        layer, theta = np.minimum(layer, half), np.minimum(theta, 2.0 / 15.0 * half)  # parabola
        thick += ", at most half the gap"
    return Profile(
        x=x,
        curves=(
            Curve("heat transfer coefficient", "W/(m2 K)", h, "local, on wall less stream"),
            Curve("wall shear", "Pa", local.friction * dynamic, "local wall shear stress"),
            Curve("layer thickness", "m", layer, thick),
            Curve("momentum thickness", "m", theta, "of the boundary layer"),
            Curve("wall temperature", "K", wall, "surface"),
            Curve("stream temperature", "K", bulk, "outside the layer, or mixed over the gap"),
        ),
        regions=_regions(x, local),
        marks=_marks(batch),
    )


def _temperatures(
    case: Case, batch: Batch, x: Floats, h: Floats, capacity: float
) -> tuple[Floats, Floats]:
    """Wall and stream temperature along the plate [K]."""
    inlet, wall = case.fluid.temperature, case.plates.surface.temperature
    flux = case.plates.surface.flux or 0.0
    gap = batch.settings["gap"][0] if "gap" in batch.settings else np.inf
    if wall is None:
        bulk = inlet + 2.0 * flux * x / (capacity * gap)
        return bulk + flux / h, bulk
    edge = 2.0 * h[0] * x[0]  # from the leading edge to the first station, h as x^-1/2
    steps = np.append(edge, 0.5 * (h[1:] + h[:-1]) * np.diff(x))
    units = 2.0 * np.cumsum(steps) / (capacity * gap)
    return np.full_like(x, wall), wall - (wall - inlet) * np.exp(-units)


def _regions(x: Floats, local: Along) -> tuple[Region, ...]:
    """Laminar, transitional and turbulent stretches."""
    low, high = _EDGES
    starts = [0.0, *(_first(x, local.gamma, edge) for edge in (low, high))]
    names = ("laminar", "transitional", "turbulent")
    ends = [*starts[1:], float(x[-1])]
    found = zip(names, starts, ends, strict=True)
    return tuple(Region(name, start, end) for name, start, end in found if end > start)


def _first(x: Floats, gamma: Floats, edge: float) -> float:
    """Where the intermittency first passes `edge`; the end of the plate if nowhere."""
    passed = np.flatnonzero(gamma > edge)
    return float(x[passed[0]]) if passed.size else float(x[-1])


def _marks(batch: Batch) -> dict[str, float]:
    """Places worth a line in the picture [m]."""
    length = float(batch.settings["length"][0])
    marks = {}
    if batch.settings["trip_height"][0] > 0.0:
        marks["wire"] = float(batch.settings["trip_position"][0])
    marks["onset"] = float(batch.outcomes["onset"][0])
    if marks["onset"] >= length:
        del marks["onset"]
    return {name: place for name, place in marks.items() if place <= length}


def sketch(case: Case, batch: Batch) -> Sketch:
    """Side view of the one design in `batch`: for a stack two gaps between three plates."""
    given = {name: float(values[0]) for name, values in batch.settings.items()}
    gap, thick, length = given.get("gap", 0.0), given["thickness"], given["length"]
    levels = np.array([0.0]) if gap == 0.0 else np.arange(3) * (gap + thick)
    shapes = [Shape("plate", _box(0.0, level - thick, length, thick)) for level in levels]
    wire = given["trip_height"]
    if wire > 0.0:
        place = given["trip_position"]
        below = levels[:-1] + gap - wire if gap else levels - thick - wire
        seats = [*(levels[:-1] if gap else levels), *below]
        if case.kind == "plate" and case.plates.faces == 1:
            seats = list(levels)
        shapes += [Shape("wire", _ring(place, seat + 0.5 * wire, 0.5 * wire)) for seat in seats]
    height = float(levels[-1]) + thick
    return Sketch(
        tuple(shapes),
        length,
        max(height, thick),
        _caption(given),
        repeats=given.get("count", 1.0),
        pitch=gap + thick if gap else 0.0,
    )


def _box(x: float, y: float, width: float, height: float) -> Floats:
    return np.array([[x, y], [x + width, y], [x + width, y + height], [x, y + height]])


def _ring(x: float, y: float, radius: float) -> Floats:
    turn = np.linspace(0.0, 2.0 * np.pi, 33)[:-1]
    return np.column_stack([x + radius * np.cos(turn), y + radius * np.sin(turn)])


def _caption(given: dict[str, float]) -> str:
    """The dimensions in one line."""
    parts = [f"length {1e3 * given['length']:.0f} mm"]
    if "gap" in given:
        parts.append(f"gap {1e3 * given['gap']:.1f} mm")
        parts.append(f"{round(given['count'], 1):g} plates")
    parts.append(f"{given['velocity']:.3g} m/s")
    if given["trip_height"] > 0.0:
        wire, place = 1e3 * given["trip_height"], 1e3 * given["trip_position"]
        parts.append(f"wire {wire:.2f} mm at {place:.0f} mm")
    return ", ".join(parts)
