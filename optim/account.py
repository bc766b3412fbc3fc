"""What a case, one design and a front amount to, as plain data: SI values under column names.

`--json` prints these as they are; `text` turns them into what is read on a screen.
"""

from __future__ import annotations

import tomllib
from collections.abc import Iterator, Mapping
from typing import TYPE_CHECKING, Any

import numpy as np

from optim.front import Front, units
from optim.picks import picked, spread
from optim.task import values
from problems.problem import Evaluation, Floats, Limit, Problem, Variable

if TYPE_CHECKING:
    from problems.case import Case

Account = dict[str, Any]


def safety() -> list[str]:
    """The usual cautions of the trade, the same words wherever something is sized."""
    from problems.kinds.cautions import GENERAL

    return list(GENERAL)


def of_case(case: Case, problem: Problem) -> Account:
    """What will be searched, aimed at and held fixed, by which laws, on which assumptions."""
    return {
        "title": problem.title,
        "kind": problem.kind,
        "name": case.name,
        "searched": [_variable(variable) for variable in problem.variables],
        "aims": [
            {
                "outcome": aim.outcome,
                "sense": aim.sense,
                "unit": problem.outcome(aim.outcome).unit,
                "meaning": problem.outcome(aim.outcome).meaning,
            }
            for aim in problem.aims
        ],
        "limits": [_limit(problem, limit) for limit in problem.limits],
        "fixed": dict(_fixed(tomllib.loads(case.source))),
        "assumed": dict(case.assumed),
        "laws": [
            {"name": law.name, "source": law.source, "valid": law.valid} for law in problem.laws
        ],
        "uncertain": uncertain(problem),
        "notes": list(problem.notes),
        "cautions": safety(),
    }


def uncertain(problem: Problem) -> list[Account]:
    """The inputs that are not known exactly, as stated or as is usual."""
    return [
        {
            "name": known.name,
            "meaning": known.meaning,
            "sort": known.sort,
            "unit": known.unit,
            "nominal": known.nominal,
            "low": known.low,
            "high": known.high,
            "shape": known.shape,
            "source": known.source,
            "usual": known.usual,
        }
        for known in problem.uncertain
    ]


def middle(problem: Problem) -> Floats:
    """The design in the middle of every range, by ratio where that is how it is searched."""
    return np.array([_middle(variable) for variable in problem.variables], dtype=float)


def of_design(problem: Problem, design: Floats) -> Account:
    """One design of shape (number of variables,) in full; curves are left to its picture."""
    given = problem.evaluate(design[None, :])
    possible = bool(given.possible[0])
    taken = zip(problem.variables, design.tolist(), strict=True)
    account = {
        "title": problem.title,
        "kind": problem.kind,
        "possible": possible,
        "reason": str(given.reasons[0]),
        "group": str(given.group[0]),
        "taken": [{**_variable(variable), "value": value} for variable, value in taken],
        **_figures(problem, given),
        "limits": [_judged(problem, limit, given) for limit in problem.limits],
        "regions": [],
        "marks_m": {},
        "remarks": [],
        "laws": [
            {
                "name": law.name,
                "source": law.source,
                "valid": law.valid,
                "inside": not bool(given.outside.get(law.name, np.zeros(1, dtype=bool))[0]),
            }
            for law in problem.laws
        ],
        "cautions": [text for text, applies in given.cautions.items() if applies[0]],
        "whole": None,
        "notes": list(problem.notes),
        "safety": safety(),
        "units": units(problem),
    }
    return {**account, **_along(problem, design)} if possible else account


def of_front(front: Front, problem: Problem) -> Account:
    """The size of a front, why its search stopped, and a few of its designs in full."""
    letters = {pick.row: pick for pick in picked(front, problem)}
    records = front.table.to_dict("records")
    shown = []
    for row in spread(front, problem).tolist():
        pick = letters.get(row)
        name = {"letter": pick.letter, "label": pick.label} if pick else {"letter": "", "label": ""}
        shown.append({**name, **{str(key): value for key, value in records[row].items()}})
    kept = ("title", "kind", "seed", "evaluations", "stopped_because", "wall_time_s")
    return {
        **{key: front.provenance[key] for key in kept if key in front.provenance},
        "designs": len(front),
        "shown": shown,
        "cautions": front.provenance.get("cautions", []),
        "outside": front.provenance.get("outside", []),
        "nearest_miss": front.provenance.get("nearest_miss"),
        "units": units(problem),
    }


def _along(problem: Problem, design: Floats) -> Account:
    """What needs a possible design: regions, remarks, the same with a whole count."""
    profile = problem.profile(design)
    whole = problem.whole(design)
    return {
        "regions": [
            {"name": region.name, "start_m": region.start, "end_m": region.end}
            for region in profile.regions
        ],
        "marks_m": dict(profile.marks),
        "remarks": list(problem.remarks(design)),
        "whole": None if whole is None else _whole(*whole),
    }


def _whole(problem: Problem, design: Floats) -> Account:
    given = problem.evaluate(design[None, :])
    return {
        "possible": bool(given.possible[0]),
        "reason": str(given.reasons[0]),
        **_figures(problem, given),
        "limits": [_judged(problem, limit, given) for limit in problem.limits],
    }


def _figures(problem: Problem, given: Evaluation) -> Account:
    """Settings and outcomes of the first design evaluated, by column."""
    return {
        "settings": {s.column: float(given.settings[s.name][0]) for s in problem.settings},
        "outcomes": {o.column: float(given.outcomes[o.name][0]) for o in problem.outcomes},
    }


def _variable(variable: Variable) -> Account:
    return {
        "name": variable.name,
        "column": variable.column,
        "unit": variable.unit,
        "low": variable.low,
        "high": variable.high,
        "scale": variable.scale,
        "meaning": variable.meaning,
    }


def _middle(variable: Variable) -> float:
    if variable.scale == "log" and variable.low > 0.0:
        return float(np.sqrt(variable.low * variable.high))
    return 0.5 * (variable.low + variable.high)


def _limit(problem: Problem, limit: Limit) -> Account:
    outcome = problem.outcome(limit.outcome)
    return {
        "outcome": limit.outcome,
        "unit": outcome.unit,
        "at_least": limit.at_least,
        "at_most": limit.at_most,
        "meaning": outcome.meaning,
    }


def _judged(problem: Problem, limit: Limit, given: Evaluation) -> Account:
    value = float(values(given, limit.outcome)[0])
    low = -np.inf if limit.at_least is None else limit.at_least
    high = np.inf if limit.at_most is None else limit.at_most
    return {**_limit(problem, limit), "value": value, "met": bool(low <= value <= high)}


def _fixed(tables: Mapping[str, Any], path: str = "") -> Iterator[tuple[str, str]]:
    """Every single value of a case file under its dotted key, as the user wrote it."""
    for key, value in tables.items():
        place = f"{path}{key}"
        if place in ("title", "kind", "aims", "limits") or isinstance(value, list):
            continue
        if isinstance(value, Mapping):
            yield from _fixed(value, f"{place}.")
        else:
            yield place, str(value)
