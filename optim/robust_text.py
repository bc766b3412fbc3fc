"""The account of a front under uncertainty as plain text: the answer, the inputs, both fronts.

Takes an account (see `optim.robust_account`) and returns text; nothing is computed here but the
units that are shown.
"""

from __future__ import annotations

import textwrap
from collections.abc import Mapping, Sequence
from typing import Any

from optim.picks import leading
from optim.text import WIDTH, section, sentences, table, words
from problems.problem import Outcome, Problem, Variable
from problems.units import format_number, format_value, shown, suffix

Account = Mapping[str, Any]
_AIMS = 3  # in a table; more do not fit on a line
_MOST = 5  # inputs told of for each outcome


def of_study(account: Account, problem: Problem) -> str:
    """What `robust` prints."""
    rate = _rate(account)
    parts = [
        f"{account['title']}\nkind {account['kind']}\n",
        section("Answer", _paragraph(account["answer"])),
        section("Uncertain", inputs(account["inputs"])),
        section("Chance of meeting the limits, along the front", _limits(account)),
        section(
            "Designs of the front, 5 to 95 % of the draws, and the chance of meeting all limits",
            _front(account, problem),
        ),
        section(
            f"The front at {rate} confidence, with the chance of meeting all limits",
            _robust(account, problem),
        ),
        section(
            "What matters: share of the variance, with what it does together", _influence(account)
        ),
        section("Notes", sentences([*account["notes"], *_left_out(problem)])),
        section("Cautions", sentences(account["safety"])),
    ]
    return "\n".join(filter(None, parts)).rstrip()


def _left_out(problem: Problem) -> list[str]:
    """That some aims are not in the tables, where that is so."""
    more = [words(aim.outcome) for aim in leading(problem)[_AIMS:]]
    return [f"Not in these tables but in robust.csv: {', '.join(more)}."] if more else []


def _rate(account: Account) -> str:
    return f"{100.0 * account['confidence']:g} %"


def _paragraph(text: str) -> str:
    return textwrap.fill(text, WIDTH, initial_indent="  ", subsequent_indent="  ")


def inputs(known_inputs: Sequence[Account]) -> str:
    """The uncertain inputs as a table, empty where there are none."""
    if not known_inputs:
        return ""
    rows = [("INPUT", "BETWEEN", "SHAPE", "WHAT, AND WHERE FROM")]
    for known in known_inputs:
        rows.append(
            (
                words(known["name"]),
                ends(known),
                known["shape"],
                f"{known['meaning']}; {known['source']}",
            )
        )
    return table(rows)


def ends(known: Account) -> str:
    """The ends of an input as an engineer writes them."""
    low, high, unit = known["low"], known["high"], known["unit"]
    if known["sort"] == "factor":
        if abs(low * high - 1.0) < 1e-9:
            return f"x {format_number(low)} to x {format_number(high)}"
        if abs(low + high - 2.0) < 1e-9:
            return f"± {format_number(100.0 * (high - 1.0))} %"
        return f"x {format_number(low)} to x {format_number(high)}"
    if known["sort"] == "change":
        return f"± {format_value(high, unit)}"
    if known["name"] == "turbulence":
        return f"{format_number(100.0 * low)} to {format_number(100.0 * high)} %"
    return f"{format_value(low, unit)} to {format_value(high, unit)}"


def _limits(account: Account) -> str:
    rows = [("LIMIT", "", "MEDIAN", "LEAST", f"DESIGNS UNDER {_rate(account)}")]
    for limit in account["limits"]:
        side = limit["side"].replace("_", " ")
        rows.append(
            (
                words(limit["outcome"]),
                f"{side} {format_value(limit['bound'], limit['unit'])}",
                f"{100.0 * limit['median_chance']:.1f} %",
                f"{100.0 * limit['least_chance']:.1f} %",
                str(limit["designs_below_confidence"]),
            )
        )
    return table(rows, right=(2, 3)) if len(rows) > 1 else ""


def _front(account: Account, problem: Problem) -> str:
    names = [problem.outcome(aim.outcome) for aim in leading(problem)[:_AIMS]]
    heads = [_heading(named, _sizes(account, named)) for named in names]
    rows = [("", *heads, "CHANCE", f"AT {_rate(account)}")]
    for design in account["shown"]:
        label = f"{design['letter']} {design['label']}".strip()
        figures = [_banded(design, named, _sizes(account, named)) for named in names]
        rows.append((label, *figures, f"{100.0 * design['chance_of_all']:.1f} %", _fate(design)))
    return table(rows, right=range(1, len(names) + 2))


def _fate(design: Account) -> str:
    if not design["survives"]:
        return "over a limit"
    return "unbeaten" if design["on_robust_front"] else "beaten"


def _robust(account: Account, problem: Problem) -> str:
    rate = f"at_{100.0 * account['confidence']:g}"
    names = [problem.outcome(aim.outcome) for aim in leading(problem)[:_AIMS]]
    sizes = problem.variables
    columns = {variable.name: variable.column for variable in sizes}
    heads = [_heading(named, _sizes(account, named, rate)) for named in names]
    rows = [(*heads, "CHANCE", *(words(v.name).upper() for v in sizes), "")]
    for design in account["robust_shown"]:
        figures = [_one(design, named, _sizes(account, named, rate), rate) for named in names]
        chance = f"{100.0 * design['chance_of_all']:.1f} %"
        values = [_variable(design, v, columns) for v in sizes]
        source = "new" if design["searched_for_it"] else "given"
        rows.append((*figures, chance, *values, source))
    return table(rows, right=range(len(rows[0]) - 1)) if len(rows) > 1 else ""


def _variable(design: Account, variable: Variable, columns: Mapping[str, str]) -> str:
    value = design[variable.column]
    if design.get(columns.get(variable.only_with or "", ""), 1.0) == 0.0:
        return "-"
    if variable.unit == "1" and variable.high <= 1.0:
        return f"{100.0 * value:.1f} %"
    return format_value(value, variable.unit) if value else "none"


def _sizes(account: Account, named: Outcome, what: str = "p50") -> float:
    """The largest figure of an outcome that is shown, which decides its unit."""
    designs = account["robust_shown" if what.startswith("at_") else "shown"]
    column = f"{named.name}_{what}{suffix(named.unit)}"
    return max((abs(design[column]) for design in designs), default=0.0)


def _heading(named: Outcome, size: float) -> str:
    label = shown(named.unit, size)[0]
    return f"{words(named.name).upper()}{f', {label}' if label else ''}"


def _one(design: Account, named: Outcome, size: float, what: str) -> str:
    _, factor, offset = shown(named.unit, size)
    return format_number(
        round(design[f"{named.name}_{what}{suffix(named.unit)}"] * factor + offset, 6)
    )


def _banded(design: Account, named: Outcome, size: float) -> str:
    """The nominal figure and its band, "8.62 (7.9 to 9.3)", or the one figure that it always is."""
    _, factor, offset = shown(named.unit, size)
    low, high = (
        _short(design[f"{named.name}_{what}{suffix(named.unit)}"] * factor + offset)
        for what in ("p5", "p95")
    )
    nominal = _short(design[named.column] * factor + offset)
    return nominal if low == nominal == high else f"{nominal} ({low} to {high})"


def _short(value: float) -> str:
    """Three significant digits."""
    return format_number(float(f"{value:.3g}"))


def _influence(account: Account) -> str:
    rows = [("OUTCOME", "INPUTS, ALONE AND WITH WHAT IT DOES TOGETHER WITH OTHERS")]
    for one in account["influence"]:
        told = [
            f"{words(known['name'])} {100.0 * known['first']:.0f} / {100.0 * known['total']:.0f} %"
            for known in one["inputs"][:_MOST]
            if known["total"] >= 0.01
        ]
        rows.append((words(one["outcome"]), ", ".join(told) or "nothing moves it"))
    return table(rows)
