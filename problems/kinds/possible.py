"""Which designs of a plate or a stack can exist, how far the others are from it, and why not.

Wires that fill the gap, temperatures beyond what is known of the fluid, fans that cannot serve.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from problems.convection.fluids import Fluid
from problems.fans.choice import Choice
from problems.kinds.blown import reasons_of
from problems.problem import Floats

if TYPE_CHECKING:
    from problems.kinds.statement import Batch

_TOUCHING = 0.8  # share of the gap that wires on both walls may take


def impossible(fluid: Fluid, batch: Batch) -> tuple[Floats, NDArray[np.str_]]:
    """How far each design is from existing, and why; see `Evaluation`."""
    wire = batch.walked.sweep.wire
    touching = np.zeros_like(batch.walked.h)
    if wire is not None:
        touching = np.maximum(wire.blockage - _TOUCHING, 0.0)
    above, below = _out_of_table(fluid, batch)
    reasons = np.full(touching.shape, "", dtype=object)
    reasons[below > 0.0] = _low_reason(fluid)
    reasons[above > 0.0] = _high_reason(fluid)
    reasons[touching > 0.0] = f"the wires fill over {_TOUCHING:.0%} of the gap"
    return touching + above + below, reasons.astype(np.str_)


def _out_of_table(fluid: Fluid, batch: Batch) -> tuple[Floats, Floats]:
    """How far temperatures lie above and below what is known of the fluid, over its span.

    Humid air under its dew point keeps the properties it has there: a surface may be wet, and a
    caution says so.
    """
    hot, cold = batch.outcomes["hottest_wall"], batch.outcomes["coldest_wall"]
    hot, cold = np.maximum(hot, batch.walked.film), np.minimum(cold, batch.walked.film)
    if "outlet_temperature" in batch.outcomes:
        outlet = batch.outcomes["outlet_temperature"]
        hot, cold = np.maximum(hot, outlet), np.minimum(cold, outlet)
    span = fluid.high - fluid.low
    above = np.maximum(hot - fluid.high - 1e-6, 0.0) / span
    if fluid.dew_point is not None:
        cold = np.where(cold > 200.0, fluid.low, cold)
    return above, np.maximum(fluid.low - cold - 1e-6, 0.0) / span


def _high_reason(fluid: Fluid) -> str:
    boiling = fluid.saturation_temperature
    if fluid.phase == "liquid" and boiling is not None and fluid.high > boiling - 1.0:
        return f"{fluid.name} boils at {boiling - 273.15:.1f} degC: a wall is hotter"
    known = f"{fluid.high - 273.15:.0f} degC, up to where {fluid.name} is known"
    return f"a temperature is over {known}"


def _low_reason(fluid: Fluid) -> str:
    freezing, condensing = fluid.freezing_point, fluid.saturation_temperature
    if freezing is not None and fluid.low < freezing + 1.0:
        return f"{fluid.name} freezes at {freezing - 273.15:.1f} degC: a wall is colder"
    if fluid.phase == "gas" and condensing is not None and fluid.low < condensing + 1.0:
        return f"{fluid.name} condenses at {condensing - 273.15:.1f} degC: a wall is colder"
    known = f"{fluid.low - 273.15:.0f} degC, down to where {fluid.name} is known"
    return f"a temperature is under {known}"


def unserved(
    batch: Batch, choice: Choice, impossible_by: Floats, reasons: NDArray[np.str_]
) -> tuple[Floats, NDArray[np.str_]]:
    """Designs that no fan can serve are impossible too, with the reason of the nearest fan."""
    short = np.where(choice.duty.holds, 0.0, np.maximum(choice.duty.short_by, 1e-6))
    texts = np.where(choice.duty.holds, "", reasons_of(choice))
    if batch.met is not None:
        off = choice.duty.holds & ~batch.met
        short = np.where(off, 0.1, short)
        texts = np.where(off, "the fan drives a velocity outside the range of the case", texts)
    return impossible_by + short, np.where(reasons == "", texts, reasons)
