"""Where a front came from: versions, seed, effort, convergence, cautions, units.

Everything here is plain text, numbers and lists, so that run.json gives back what was put in.
"""

from __future__ import annotations

import platform
from collections.abc import Mapping
from datetime import UTC, datetime
from importlib.metadata import PackageNotFoundError, version
from typing import Any

from optim.front import units
from optim.steps import State
from optim.stopping import measured
from optim.task import Task
from problems.problem import Bools, Evaluation, Problem

_PACKAGES = ("platewright", "numpy", "scipy", "pandas", "pymoo", "moocore", "CoolProp")


def provenance(
    task: Task, state: State, reason: str, seed: int, evaluations: int, given: Evaluation
) -> dict[str, Any]:
    """What run.json says of a search that ended in `state`; `given` are the designs told of."""
    problem = task.problem
    return {
        "title": problem.title,
        "kind": problem.kind,
        "date": datetime.now(UTC).isoformat(timespec="seconds"),
        "versions": versions(),
        "seed": seed,
        "evaluations": evaluations,
        "designs": len(given),
        "stopped_because": reason,
        "aims": [{"outcome": aim.outcome, "sense": aim.sense} for aim in problem.aims],
        "limits": [
            {"outcome": limit.outcome, "at_least": limit.at_least, "at_most": limit.at_most}
            for limit in problem.limits
        ],
        "variables": _variables(problem),
        "units": units(problem),
        "notes": list(problem.notes),
        "cautions": _counts(given.cautions),
        "outside": _counts(given.outside),
        "history": history(task, state),
    }


def versions() -> dict[str, str]:
    """The versions of Python and of the packages that had a part in the figures."""
    found = {"python": platform.python_version()}
    for name in _PACKAGES:
        try:
            found[name] = version(name)
        except PackageNotFoundError:
            found[name] = "not installed"
    return found


def history(task: Task, state: State) -> list[dict[str, Any]]:
    """After each generation: evaluations, front size, and hypervolume in the last front's box.

    In long searches early generations are told of with gaps.
    With one aim `best` is the best value so far.
    """
    rows = []
    for mark, volume in zip(state.trail, measured(state.trail), strict=True):
        row: dict[str, Any] = {
            "generation": mark.generation,
            "evaluations": mark.evaluations,
            "front_size": mark.size,
            "hypervolume": volume,
        }
        if len(task.aims) == 1:
            row["best"] = float(mark.front.min()) * task.aims[0][1] if mark.size else None
        rows.append(row)
    return rows


def _variables(problem: Problem) -> list[dict[str, Any]]:
    return [
        {"name": v.name, "unit": v.unit, "low": v.low, "high": v.high, "scale": v.scale}
        for v in problem.variables
    ]


def _counts(marks: Mapping[str, Bools]) -> list[dict[str, Any]]:
    counts = {text: int(applies.sum()) for text, applies in marks.items()}
    return [{"text": text, "designs": count} for text, count in counts.items() if count]
