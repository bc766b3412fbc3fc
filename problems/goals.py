"""What a case may aim at and limit: the tables [aims] and [limits], read by the kind's outcomes.

The outcomes themselves stand in `kinds.outcomes`; what a search makes of them is for `optim`.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from problems.kinds.outcomes import OUTCOMES, SETTINGS
from problems.problem import Aim, Limit, Outcome
from problems.rules import Fault, Rule, faults, nearest
from problems.units import to_si

MOST_AIMS = 5


@dataclass(frozen=True)
class Aims(Rule):
    """The table [aims] of a kind."""

    kind: str

    @property
    def allowed(self) -> str:
        return (
            "a table with most = [...], least = [...] or both, one to five outcomes in all, "
            'such as most = ["heat"], least = ["fan_power"]'
        )

    def read(self, value: object) -> tuple[Aim, ...]:
        if not isinstance(value, Mapping):
            raise ValueError(value)
        known = [outcome.name for outcome in OUTCOMES[self.kind]]
        found: list[Fault] = []
        aims: dict[str, Aim] = {}
        for sense, names in value.items():
            if sense not in ("most", "least") or not isinstance(names, list):
                found.append(((sense,), names, self.allowed))
                continue
            for name in names:
                if name not in known:
                    found.append(((sense,), name, nearest(name, known)))
                elif name in aims:
                    found.append(((sense,), name, "each outcome is named once"))
                aims[str(name)] = Aim(str(name), sense)
        if not found and not 1 <= len(aims) <= MOST_AIMS:
            raise ValueError(value)
        if found:
            raise faults(found)
        return tuple(aims.values())


@dataclass(frozen=True)
class Limits(Rule):
    """The table [limits] of a kind."""

    kind: str

    @property
    def allowed(self) -> str:
        return 'a table of limits such as pressure_drop = { at_most = "150 Pa" }'

    def read(self, value: object) -> tuple[Limit, ...]:
        if not isinstance(value, Mapping):
            raise ValueError(value)
        known = {item.name: item for item in (*OUTCOMES[self.kind], *SETTINGS[self.kind])}
        found: list[Fault] = []
        limits = []
        for name, bounds in value.items():
            if name not in known:
                found.append(((name,), bounds, nearest(name, known)))
                continue
            numbers, wrong = _bounds(bounds, known[name])
            found += [((name, *loc), given, says) for loc, given, says in wrong]
            limits.append(Limit(name, **numbers))
        if found:
            raise faults(found)
        return tuple(limits)


def _bounds(bounds: object, of: Outcome) -> tuple[dict[str, float], list[Fault]]:
    """The numbers of one limit in SI by key, and what is wrong with it."""
    example = {"K": '"60 degC"', "delta K": '"5 K"', "1": "2"}.get(of.unit, f'"150 {of.unit}"')
    table = f"a table with at_least, at_most or both, such as {{ at_most = {example} }}"
    if not isinstance(bounds, Mapping) or not bounds or bounds.keys() - {"at_least", "at_most"}:
        return {}, [((), bounds, table)]
    numbers: dict[str, float] = {}
    found: list[Fault] = []
    for key, value in bounds.items():
        try:
            numbers[key] = to_si(value, of.unit)
        except ValueError:
            found.append(((key,), value, f"{of.meaning}: a quantity such as {example}"))
    if len(numbers) == 2 and numbers["at_least"] > numbers["at_most"]:
        found.append(((), bounds, "at_least must not be above at_most"))
    return numbers, found
