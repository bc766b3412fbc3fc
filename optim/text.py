"""What is read on a screen: the accounts of a case, a design and a front as plain text.

Every function takes an account (see `optim.account`) and returns text; nothing is computed here
but the units that are shown.
"""

from __future__ import annotations

import textwrap
from collections.abc import Iterable, Mapping, Sequence
from typing import Any

import numpy as np

from problems.problem import Outcome, Problem
from problems.units import axis_unit, format_number, format_value

Account = Mapping[str, Any]

WIDTH = 98
# unit -> heading under which an outcome is printed
_HEADINGS = {
    "W": "Heat and power",
    "W/m2": "Heat and power",
    "W/(m2 K)": "Heat and power",
    "K": "Temperatures",
    "delta K": "Temperatures",
    "N": "Forces and pressures",
    "Pa": "Forces and pressures",
    "m3/s": "Flow",
    "kg/s": "Flow",
    "m/s": "Flow",
    "1": "Ratios and numbers",
    "": "Ratios and numbers",
}
_SIZES = "Sizes and places"


def words(name: str) -> str:
    """The name of a quantity as prose: "gap_reynolds" -> "gap Reynolds"."""
    return name.replace("_", " ").replace("reynolds", "Reynolds")


def table(rows: Iterable[Sequence[str]], right: Sequence[int] = ()) -> str:
    """Rows of equal length as aligned columns, those numbered in `right` flush right.

    The last column wraps at the width of the page.
    """
    given = [list(row) for row in rows]
    if not given:
        return ""
    widths = [max(map(len, column)) for column in zip(*given, strict=True)]
    start = 2 + sum(width + 2 for width in widths[:-1])
    lines = []
    for row in given:
        cells = [
            cell.rjust(width) if place in right else cell.ljust(width)
            for place, (cell, width) in enumerate(zip(row, widths, strict=True))
        ]
        wrapped = textwrap.wrap(cells[-1].rstrip(), max(WIDTH - start, 24)) or [""]
        if len(row) - 1 in right:
            wrapped = [cells[-1]]
        lines.append(f"  {'  '.join([*cells[:-1], wrapped[0]])}".rstrip())
        lines += [" " * start + more for more in wrapped[1:]]
    return "\n".join(lines)


def sentences(texts: Iterable[str]) -> str:
    """Each text as an entry of a list, wrapped."""
    return "\n".join(
        textwrap.fill(text, WIDTH, initial_indent="  - ", subsequent_indent="    ")
        for text in texts
    )


def section(heading: str, body: str) -> str:
    """A heading over its body; nothing without a body."""
    return f"{heading}\n{body}\n" if body else ""


def of_cases(cases: Iterable[Mapping[str, str]]) -> str:
    """The ready-made cases."""
    rows = [(case["name"], case["kind"], case["title"]) for case in cases]
    return table([("NAME", "KIND", "TITLE"), *rows])


def of_case(account: Account) -> str:
    """A case as `check` prints it."""
    searched = [
        (words(v["name"]), _range(v), f"{v['meaning']}{_by_ratio(v)}") for v in account["searched"]
    ]
    aims = [(aim["sense"], words(aim["outcome"]), aim["meaning"]) for aim in account["aims"]]
    limits = [(words(lim["outcome"]), bounds(lim), lim["meaning"]) for lim in account["limits"]]
    parts = [
        f"{account['title']}\nkind {account['kind']}, case {account['name']}\n",
        section("Searched", table(searched) or "  nothing: every quantity is fixed"),
        section("Aims", table(aims)),
        section("Limits", table(limits) or "  none"),
        section("Fixed, as given", table(account["fixed"].items())),
        section("Assumed, as the case does not say", table(account["assumed"].items())),
        section("Laws", _laws(account["laws"])),
        section("Notes", sentences(account["notes"])),
        section("Cautions", sentences(account["cautions"])),
    ]
    return "\n".join(filter(None, parts)).rstrip()


def of_design(account: Account, problem: Problem) -> str:
    """One design as `point` prints it."""
    whole = account["whole"]
    named = {item.column: item for item in (*problem.settings, *problem.outcomes)}
    free = [
        (words(v["name"]), format_value(v["value"], v["unit"]), f"the middle of {_range(v)}")
        for v in account["taken"]
    ]
    columns = [account] if whole is None else [account, whole]
    head = "" if whole is None else ("  as searched | with a whole count")
    parts = [
        f"{account['title']}\nkind {account['kind']}, {account['group']}\n",
        _impossible(account),
        section("Left free in the case, taken for this design", table(free)),
        section(f"Design{head}", _values("settings", columns, named)),
        section("Along the plate", _regions(account)),
        *_outcome_sections(columns, named, head),
        section("Limits", _verdicts(account["limits"]) or "  none"),
        section("Limits, with a whole count", "" if whole is None else _verdicts(whole["limits"])),
        section("Remarks", sentences(account["remarks"])),
        section("Laws", _laws(account["laws"])),
        section("Cautions for this design", sentences(account["cautions"])),
        section("Notes", sentences(account["notes"])),
        section("Cautions", sentences(account["safety"])),
    ]
    return "\n".join(filter(None, parts)).rstrip()


def of_front(account: Account, problem: Problem) -> str:
    """A front as `search` prints it: a few designs side by side, and what to beware of."""
    shown = account["shown"]
    letters = [f"{one['letter']} {one['label']}" for one in shown if one["letter"]]
    effort = f"{account['evaluations']:,} evaluations"
    if "wall_time_s" in account:
        effort += f" in {account['wall_time_s']:.1f} s"
    count = account["designs"]
    what = "designs that nothing beats" if count > 1 else "design"
    if len(problem.aims) == 1 and count > 1:
        what = "designs: the best and its neighbours"
    parts = [
        f"{account['title']}\n{count} {what}; {effort}: {account['stopped_because']}.\n",
        section(f"Along the front ({', '.join(letters)})", _side_by_side(shown, problem)),
        section("Cautions, with the number of designs", sentences(_counted(account, count))),
    ]
    return "\n".join(filter(None, parts)).rstrip()


def of_miss(account: Account) -> str:
    """Why a search found nothing: the limits in the way and how near the best design came."""
    miss = account["nearest_miss"]
    unit = account["units"]
    design = miss["design"]
    rows = [
        (
            words(lim["outcome"]),
            f"{words(lim['side'])} {format_value(lim['bound'], lim['unit'])}",
            _told(lim["best"], lim["unit"]),
            _told(lim["nearest"], lim["unit"]),
            _standing(lim),
        )
        for lim in miss["limits"]
    ]
    heads = ("LIMIT", "WANTED", "BEST ALONE", "NEAREST DESIGN", "")
    nearest = [
        (words(_plain(name, unit)), format_value(value, unit[name]))
        for name, value in design["settings"].items()
    ]
    reasons = [f"{one['designs']} of {miss['sampled']}: {one['text']}" for one in _reasons(miss)]
    parts = [
        f"{account['title']}\nNo feasible design after {account['evaluations']:,} evaluations.\n",
        section("What stands in the way", table([heads, *rows]) if rows else ""),
        section("The nearest design", table(nearest, right=(1,))),
        section("Designs that cannot be", sentences(reasons)),
    ]
    return "\n".join(filter(None, parts)).rstrip()


def bounds(limit: Account) -> str:
    """A limit in words with its unit."""
    sides = [(words(side), limit[side]) for side in ("at_least", "at_most")]
    told = [f"{s} {format_value(v, limit['unit'])}" for s, v in sides if v is not None]
    return ", ".join(told)


def _range(variable: Account) -> str:
    low, high = (format_value(variable[end], variable["unit"]) for end in ("low", "high"))
    return f"{low} to {high}"


def _by_ratio(variable: Account) -> str:
    return ", searched by ratio" if variable["scale"] == "log" else ""


def _impossible(account: Account) -> str:
    if account["possible"]:
        return ""
    return f"This design cannot be: {account['reason']}. The figures below mean nothing.\n"


def _values(which: str, columns: Sequence[Account], named: Mapping[str, Outcome]) -> str:
    """Settings or outcomes of one or two accounts of a design, one row each."""
    return _rows(columns[0][which], which, columns, named)


def _rows(
    names: Iterable[str], which: str, columns: Sequence[Account], named: Mapping[str, Outcome]
) -> str:
    rows = []
    for name in names:
        item = named[name]
        cells = [format_value(column[which][name], item.unit) for column in columns]
        rows.append((words(item.name), *cells, item.meaning))
    return table(rows, right=range(1, 1 + len(columns)))


def _outcome_sections(
    columns: Sequence[Account], named: Mapping[str, Outcome], head: str
) -> list[str]:
    """Outcomes under a heading for each sort of unit, in the order in which they come."""
    found: dict[str, list[str]] = {}
    for name in columns[0]["outcomes"]:
        found.setdefault(_HEADINGS.get(named[name].unit, _SIZES), []).append(name)
    return [
        section(f"{heading}{head}", _rows(names, "outcomes", columns, named))
        for heading, names in found.items()
    ]


def _regions(account: Account) -> str:
    rows = [
        (region["name"], f"{_metres(region['start_m'])} to {_metres(region['end_m'])}")
        for region in account["regions"]
    ]
    return table([*rows, *((name, f"at {_metres(at)}") for name, at in account["marks_m"].items())])


def _metres(value: float) -> str:
    return format_value(value, "m")


def _verdicts(limits: Iterable[Account]) -> str:
    rows = [
        (
            words(lim["outcome"]),
            bounds(lim),
            format_value(lim["value"], lim["unit"]),
            "met" if lim["met"] else "BROKEN",
        )
        for lim in limits
    ]
    return table(rows)


def _laws(laws: Iterable[Account]) -> str:
    rows = []
    for law in laws:
        inside = {None: "", True: " (inside)", False: " (OUTSIDE)"}[law.get("inside")]
        rows.append((law["name"], f"{law['source']}; valid for {law['valid']}{inside}"))
    return table(rows)


def _side_by_side(shown: Sequence[Account], problem: Problem) -> str:
    """Designs as columns; variables, settings that differ, aims and limited outcomes as rows."""
    rows = [("", "", *(one["letter"] for one in shown))]
    for item in _told_of(shown, problem):
        values = np.array([one[item.column] for one in shown], dtype=float)
        label, convert = axis_unit("" if item.unit == "1" else item.unit, values)
        digits = [format_number(float(f"{value:.3g}")) for value in convert(values)]
        said = zip(digits, shown, strict=True)
        told = [number if _counts(item, one, problem) else "-" for number, one in said]
        rows.append((words(item.name), label, *told))
    rows.append(("sort", "", *(one["group"] for one in shown)))
    return table(rows, right=range(2, 2 + len(shown)))


def _counts(item: Any, one: Account, problem: Problem) -> bool:
    """Whether a quantity means anything in a design: not the place of a wire that is not there."""
    needed = getattr(item, "only_with", None)
    return all(one[v.column] != 0.0 for v in problem.variables if v.name == needed)


def _told_of(shown: Sequence[Account], problem: Problem) -> list[Any]:
    named: dict[str, Any] = {}
    for setting in problem.settings:
        if len({one[setting.column] for one in shown}) > 1:
            named[setting.column] = setting
    for variable in problem.variables:
        named.setdefault(variable.column, variable)
    for name in (*(a.outcome for a in problem.aims), *(lim.outcome for lim in problem.limits)):
        named.setdefault(problem.outcome(name).column, problem.outcome(name))
    return list(named.values())


def _counted(account: Account, count: int) -> list[str]:
    """Cautions and laws outside their range, each with the number of designs it applies to."""
    cautions = [f"{one['text']}: {one['designs']} of {count}" for one in account["cautions"]]
    outside = [
        f"law outside its range, {one['text']}: {one['designs']} of {count}"
        for one in account["outside"]
    ]
    return cautions + outside


def _told(value: float | None, unit: str) -> str:
    return "-" if value is None else format_value(value, unit)


def _standing(limit: Account) -> str:
    if limit["out_of_reach"]:
        return "out of reach by itself"
    return "broken" if limit["stands_in_the_way"] else "met"


def _plain(column: str, units: Mapping[str, str]) -> str:
    """The name of a column without the unit behind it."""
    from problems.units import suffix

    return column.removesuffix(suffix(units[column]))


def _reasons(miss: Account) -> list[Account]:
    found: list[Account] = miss["impossible_because"]
    return found
