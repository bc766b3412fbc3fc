"""What is designed: the physics of swept plates and the problems stated with it.

`load_case` reads a case, `build` makes it a Problem. Nothing heavy is imported until one of them
is used; how a Problem is searched is the business of `optim`.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from problems.case import Case, load_case, ready_made
    from problems.problem import Problem

__all__ = ["CaseError", "build", "load_case", "ready_made"]


# kind of case -> module whose `build` states it as a Problem
_BUILDERS = {"plate": "problems.kinds.statement", "stack": "problems.kinds.statement"}


class CaseError(Exception):
    """A case that cannot be used; the message names key, value and what is allowed."""


def build(case: Case) -> Problem:
    """The Problem of a case, ready to evaluate.

    Raises CaseError where the fluid has no properties at the case's temperatures.
    """
    problem: Problem = import_module(_BUILDERS[case.kind]).build(case)
    return problem


def __getattr__(name: str) -> Any:
    if name in ("load_case", "ready_made"):
        return getattr(import_module("problems.case"), name)
    raise AttributeError(f"module 'problems' has no attribute {name!r}")
