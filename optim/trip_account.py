"""What a study of forced transition amounts to, as plain data: SI values under column names.

`--json` prints it as it is, `trip_text` turns it into what is read on a screen; the answer in one
sentence is made in `trip_answer`.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import TYPE_CHECKING, Any

from optim.account import safety
from optim.contest import Design
from optim.front import units
from optim.provenance import versions
from optim.trip_answer import answer, intervals
from optim.trip_study import AT_AREA, AT_MERIT, AT_POWER, EVEN, PAYS, TripStudy

if TYPE_CHECKING:
    from problems.trips import WireChoice

Account = dict[str, Any]

_SOURCE = "Webb 1981, Int. J. Heat Mass Transfer 24, 715-726 (from memory)"
CRITERIA = {
    AT_POWER: "most {merit} at the same fan power, sizes free",
    AT_MERIT: "least fan power at the same {merit}, sizes free",
    AT_AREA: "most {merit} at the same fan power on no more plate area",
}
GAINS = {
    AT_POWER: "gain_at_equal_power",
    AT_MERIT: "power_saved_at_equal_merit",
    AT_AREA: "gain_at_equal_area",
}


def of_trips(study: TripStudy) -> Account:
    """The answer, the table of ways and of references, the wire, evenness, notes and cautions."""
    problem = study.entries[0].problem
    merit = problem.outcome(study.merit.outcome)
    answered = any(len(front) for front in study.fronts.values())
    return {
        "title": problem.title,
        "kind": problem.kind,
        "name": study.case.name,
        "seed": study.seed,
        "versions": versions(),
        "merit": {"outcome": merit.name, "sense": study.merit.sense, "unit": merit.unit},
        "answer": answer(study),
        "answered": answered,
        "pays": answered and (study.most > PAYS or not study.references),
        "evaluations": sum(front.provenance["evaluations"] for front in study.fronts.values()),
        "pays_between_W": intervals(study),
        "best": study.best or None,
        "shown": study.shown if study.references else None,
        "criteria": [
            {"name": key, "meaning": told.format(merit=_told(merit.name)), "source": _SOURCE}
            for key, told in CRITERIA.items()
        ],
        "ways": [_way(study, place) for place in range(len(study.entries))],
        "references": [_reference(study, place) for place in range(len(study.references))],
        "wire": _wire(study, study.wire),
        "wire_from_stock": _stocked(study),
        "verdicts": _verdicts(study),
        "notes": [*problem.notes, *_notes(study)],
        "cautions": _cautions(study),
        "safety": safety(),
        "nearest_miss": _miss(study),
        "units": units(study.entries[-2].problem),
    }


def rows(study: TripStudy) -> Iterator[Account]:
    """The table trips.csv: each reference, criterion and way, with the design that won.

    Where no plain surface meets the limits: the fronts of the ways that do.
    """
    for name, front in study.fronts.items() if not study.references else ():
        for record in front.table.to_dict("records"):
            yield {"way": name, **{str(key): value for key, value in record.items()}}
    columns = {item.name: item.column for item in _quantities(study)}
    for (place, key, name), design in study.winners.items():
        reference = study.references[place]
        settings = {columns[k]: v for k, v in design.settings.items()}
        outcomes = {columns[k]: v for k, v in design.outcomes.items()}
        yield {
            "reference": place + 1,
            "reference_fan_power_W": reference["fan_power"],
            f"reference_{columns[study.merit.outcome]}": reference[study.merit.outcome],
            "criterion": key,
            "way": name,
            "gain": study.gain(place, name, key) if key in GAINS else None,
            "guaranteed_gain": study.guaranteed(place, name) if key == AT_POWER else None,
            "wires": _count(study, design),
            "sort": design.group,
            **settings,
            **outcomes,
        }


def _quantities(study: TripStudy) -> list[Any]:
    problem = study.entries[0].problem
    return [*problem.settings, *problem.outcomes]


def _told(name: str) -> str:
    return {"hottest_wall": "cooling of the hottest place"}.get(name, name.replace("_", " "))


def _count(study: TripStudy, design: Design) -> int:
    """Wires in a row on a wall; 0 without."""
    way = next(way for way in study.ways if way.name == design.entry)
    wired = way.case.trip is not None and design.settings["trip_height"] > 0.0
    return way.case.trip.wires if wired and way.case.trip is not None else 0


def _way(study: TripStudy, place: int) -> Account:
    way, front = study.ways[place], study.fronts[study.ways[place].name]
    account: Account = {
        "name": way.name,
        "meaning": way.meaning,
        "front_designs": len(front),
        "verdict": _verdict(study, way.name),
    }
    if not study.references:
        return account
    shown, name = study.shown, way.name
    design = study.winners[shown, AT_POWER, name]
    return {
        **account,
        **{told: study.gain(shown, name, key) for key, told in GAINS.items()},
        "guaranteed_gain": study.guaranteed(shown, name),
        "band": _band(study, shown, name),
        "design": _design(study, design),
        "most_even": _design(study, study.winners[shown, EVEN, name]),
    }


def _verdict(study: TripStudy, name: str) -> str:
    """What comes of one way, in a few words."""
    if name == "plain":
        return ""
    if not len(study.fronts[name]):
        miss = study.fronts[name].provenance.get("nearest_miss") or {}
        reasons = miss.get("impossible_because") or []
        return f"no such design: {reasons[0]['text']}" if reasons else "no design meets the limits"
    if not study.references:
        return "meets the limits"
    gain = study.gain(study.shown, name)
    if gain <= 0.0:
        return "no gain: leave it away"
    if gain <= PAYS:
        return "does not pay"
    if study.guaranteed(study.shown, name) <= PAYS:
        return "pays, but not over the whole onset band"
    return "pays"


def _design(study: TripStudy, design: Design) -> Account:
    columns = {item.name: item.column for item in _quantities(study)}
    return {
        "way": design.entry,
        "wires": _count(study, design),
        "sort": design.group,
        "settings": {columns[name]: value for name, value in design.settings.items()},
        "outcomes": {columns[name]: value for name, value in design.outcomes.items()},
        "cautions": list(design.cautions),
    }


def _band(study: TripStudy, place: int, name: str) -> Account:
    """Ends of merit, fan power and gain of a winner over the band of onsets."""
    band = study.bands[place, name]
    figures = {"merit": band.merit, "fan_power_W": band.power, "gain": band.gain}
    return {told: [float(v.min()), float(v.max())] for told, v in figures.items()}


def _reference(study: TripStudy, place: int) -> Account:
    plain = study.winners[place, AT_POWER, "plain"]
    return {
        "fan_power_W": study.references[place]["fan_power"],
        "plain": _design(study, plain),
        "gains": {
            name: {
                **{told: study.gain(place, name, key) for key, told in GAINS.items()},
                "guaranteed_gain": study.guaranteed(place, name),
                "band": _band(study, place, name),
            }
            for name in study.names
        },
    }


def _wire(study: TripStudy, wire: WireChoice | None) -> Account | None:
    if wire is None or study.wire_way is None:
        return None
    design = study.winners[study.shown, AT_POWER, study.wire_way]
    return {
        "way": study.wire_way,
        "velocity_m_s": design.settings["velocity"],
        "trip_position_m": design.settings["trip_position"],
        "trip_height_m": design.settings["trip_height"],
        "margin": wire.margin,
        "smallest_m": wire.smallest,
        "enough_m": wire.enough,
        "stock_m": list(wire.stock),
        "fails_below": wire.fails_below,
        "tolerance": {name: list(change) for name, change in wire.tolerance.items()},
    }


def _stocked(study: TripStudy) -> Account | None:
    wire = study.stocked
    if wire is None:
        return None
    return {
        "trip_height_m": wire.height,
        "gain_at_equal_power": wire.gain,
        "guaranteed_gain": wire.guaranteed,
        "fails_below": wire.fails_below,
    }


def _verdicts(study: TripStudy) -> list[str]:
    from problems.trip_verdicts import fixed_speed, meaningless

    found = [*meaningless(study.case), fixed_speed(study.case, study.case.limits)]
    return [verdict for verdict in found if verdict]


def _notes(study: TripStudy) -> list[str]:
    from problems.trip_verdicts import onset_told
    from problems.trips import ONSET_BAND

    said = [
        "Guaranteed gain: the least over the onset band, "
        f"{onset_told(study.case, study.levels, ONSET_BAND)}; the plain surface meets the same "
        "onset and is run at the velocity that draws the same fan power."
    ]
    if study.merit.outcome == "hottest_wall":
        said.append(
            "Gain under a given flux: the excess of the hottest wall over the inlet, plain over "
            "tripped, less one."
        )
    if study.case.trip is None:
        said.append("The case has no [trip]; places of 1 to 90 % of the length were tried.")
    return said


def _cautions(study: TripStudy) -> list[str]:
    """What to beware of in the design of the answer."""
    if not study.references:
        return []
    return list(study.winners[study.shown, AT_POWER, study.best].cautions)


def _miss(study: TripStudy) -> Any:
    """How near the plain surface came to the limits, where nothing meets them."""
    if any(len(front) for front in study.fronts.values()):
        return None
    return study.fronts["plain"].provenance["nearest_miss"]
