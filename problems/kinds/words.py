"""What is said about a case and about one design, in plain sentences.

Verdicts are read off the same weights that the model computes with; nothing is decided here.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from problems.case import Case
from problems.convection import transition
from problems.convection.fluids import Fluid
from problems.convection.passage import BAND_HIGH, BAND_LOW
from problems.kinds import plate
from problems.kinds.laws import Walk
from problems.kinds.swept import free_stream_turbulence
from problems.problem import Floats
from problems.tables import Trip

if TYPE_CHECKING:
    from problems.kinds.statement import Batch

_FEED = {
    "duct": "It counts from duct to duct of the stack's own section, and the fan power is on the "
    "loss of total pressure; feed from a still plenum costs the head of that duct more.",
    "plenum": "The stack is fed from a still plenum and blows into one.",
}
PLAIN, TRIPPED, IDLE = "plain", "tripped", "idle wire"


def groups(settings: Mapping[str, Floats], walk: Walk) -> NDArray[np.str_]:
    """Sort of each design: no wire, a wire that works, a wire that does nothing."""
    onset, surface = walk.sweep.onset, walk.surface
    ends = np.minimum(onset.natural, surface.re_l)
    works = (onset.re_x < 0.95 * ends) & (walk.sweep.sustains > 0.5)
    wired = settings["trip_height"] > 0.0
    return np.where(wired & works, TRIPPED, np.where(wired, IDLE, PLAIN))


def notes(case: Case, fluid: Fluid) -> tuple[str, ...]:
    """What the reader must know about the case as a whole."""
    level, natural = free_stream_turbulence(case)
    said = []
    if case.fluid.critical_reynolds is not None:
        said.append(
            f"Transition is taken to begin at Re_x = {natural:.3g}, as given; "
            f"that is a stream of about {level:.2g} % turbulence."
        )
    else:
        others = transition.onset_second_opinions(max(level, 0.05))
        opinions = ", ".join(f"{name} {value:.2g}" for name, value in others.items())
        said.append(
            f"At {level:.3g} % free-stream turbulence natural transition begins at Re_x = "
            f"{natural:.2g}; an honest band is a factor 1.5 either way. Other laws say: {opinions}."
        )
    if case.kind == "plate":
        said.append(plate.NOTE)
    else:
        said.append(
            f"A gap keeps up turbulence from Re_D {BAND_LOW:.0f} (not at all) to {BAND_HIGH:.0f} "
            "(fully), on twice the gap; below, a trip wire costs drag and is given no credit."
        )
        said.append(
            "The velocity is the mean in the gap at inlet density. The pressure drop is static and "
            "more than wall shear: the core speeds up, the ends lose. " + _FEED[case.plates.feed]
        )
    if case.trip is not None:
        said.append(_trip_note(case, case.trip))
    if fluid.phase == "gas":
        said.append("Radiation is not counted; at low velocities it can be a third of the heat.")
    elif fluid.saturation_temperature is None:
        said.append("Boiling and flash point of this liquid are not known here: check both.")
    return tuple(said)


def _trip_note(case: Case, trip: Trip) -> str:
    """What stands on the plates to force transition."""
    what = "strip of grit" if trip.sort == "grit" else "wire"
    row = f"a {what}" if trip.wires == 1 else f"{trip.wires} {what}s in a row"
    if case.kind == "plate":
        where = "one face" if trip.walls == "one" or case.plates.faces == 1 else "both faces"
        return f"The plate carries {row} on {where}."
    if trip.walls == "one":
        return f"Every gap carries {row} on one of its walls; the other wall is plain."
    how = "at the same place" if trip.facing == "opposite" else "staggered"
    return f"Every gap carries {row} on both its walls, {how}."


def remarks(case: Case, batch: Batch) -> tuple[str, ...]:
    """Sentences about the one design in `batch`: regime, wire."""
    walked = batch.walked
    length = float(batch.settings["length"][0])
    sweep = walked.sweep
    metre = length / float(walked.surface.re_l[0])
    said = [_regime(batch, length)]
    if sweep.wires and float(batch.settings["trip_height"][0]) > 0.0:
        said.extend(_wire(batch, length, metre))
    if case.plates.roughness > 0.0:
        rough = float(np.asarray(walked.surface.re_rough)[0])
        kind = "hydraulically smooth for transition" if rough <= 100.0 else "not smooth"
        said.append(f"Surface: U k_s/nu = {rough:.0f}, {kind} (limit 100).")
    return tuple(said)


def _regime(batch: Batch, length: float) -> str:
    """One sentence on where the layer turns."""
    sweep = batch.walked.sweep
    onset = float(sweep.onset.re_x[0] / batch.walked.surface.re_l[0]) * length
    share = float(sweep.turbulent_share[0])
    sustains = float(sweep.sustains[0])
    if sustains == 0.0:
        re_d = float(batch.outcomes["gap_reynolds"][0])
        return f"Laminar throughout: Re_D = {re_d:.0f} cannot keep up turbulence."
    if onset >= length:
        return f"Laminar throughout: transition would begin at {1e3 * onset:.0f} mm."
    kept = "" if sustains == 1.0 else f", of which the passage keeps up {sustains:.0%}"
    return (
        f"Transition begins at {1e3 * onset:.0f} mm of {1e3 * length:.0f} mm; "
        f"{share:.0%} of the length is turbulent{kept}."
    )


def _wire(batch: Batch, length: float, metre: float) -> list[str]:
    """Does the wire (or the first of a row) trip, does it hold, what does it cost."""
    sweep, outcomes = batch.walked.sweep, batch.outcomes
    wire, onset = sweep.wires[0], sweep.onset
    place = float(batch.settings["trip_position"][0])
    natural = float(onset.natural[0]) * metre
    name, figure = ("Grit", "Re_k") if wire.grit else ("Wire", "U k/nu")
    reynolds = float((wire.top_reynolds if wire.grit else wire.reynolds)[0])
    head = f"{name} at {1e3 * place:.0f} mm: {figure} = {reynolds:.0f}"
    if place > length:
        return [f"{head}. It stands behind the end of the plate: no effect, no drag."]
    if place > natural:
        return [f"{head}. It stands behind natural transition ({1e3 * natural:.0f} mm): only drag."]
    share = float(outcomes["wire_drag"][0]) / float(outcomes["drag"][0])
    cost = (
        f" {'It carries' if len(sweep.wires) == 1 else 'The row carries'} {share:.0%} of the drag."
    )
    if float(sweep.sustains[0]) == 0.0:
        return [
            f"{head}. The gap cannot keep up turbulence: it costs drag, no credit is given.{cost}"
        ]
    behind = float(sweep.behind_wires[0])
    row = "" if len(sweep.wires) == 1 else f" the last of {len(sweep.wires)}"
    verdict = _grit(reynolds) if wire.grit else _trips(reynolds)
    return [f"{head}, {verdict}; {_holds(behind, row)}.{_moved(batch, place)}{cost}"]


def _grit(reynolds: float) -> str:
    if reynolds >= transition.GRIT_DESIGN:
        return "it trips (600)"
    return "marginal (500 to 600)" if reynolds >= transition.GRIT_LOW else "too small to trip (600)"


def _trips(reynolds: float) -> str:
    if reynolds >= transition.WIRE_DESIGN:
        return "it trips (design value 900)"
    if reynolds >= transition.WIRE_LOW:
        return "marginal (826 to 900)"
    return "too small to trip (826)"


def _holds(behind: float, row: str) -> str:
    text = f"Re_theta behind{row or ' it'} {behind:.0f}"
    if behind >= transition.HOLDS:
        return f"{text}, turbulence holds (320)"
    if behind >= transition.FAILS:
        return f"{text}, turbulence may not hold (320)"
    return f"{text}, turbulence does not hold (200)"


def _moved(batch: Batch, place: float) -> str:
    onset = float(batch.outcomes["onset"][0])
    if onset >= float(batch.settings["length"][0]):
        return " Transition does not begin on the plate."
    if onset <= 1.02 * place:
        return " Transition begins at the wire."
    return f" Transition begins {1e3 * (onset - place):.0f} mm behind it."
