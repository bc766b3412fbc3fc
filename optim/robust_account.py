"""What a front under uncertainty amounts to, as plain data: SI values under column names.

`--json` prints it as it is, `robust_text` turns it into what is read on a screen.
"""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import numpy as np
import pandas as pd

from optim.account import safety, uncertain
from optim.bands import BAND, Bands
from optim.front import units
from optim.picks import picked
from optim.provenance import versions
from optim.robust import Study
from optim.task import Bound, task_of
from optim.text import words
from problems.problem import Floats, Outcome
from problems.units import suffix

Account = dict[str, Any]

INDICES = "Sobol' 1993; Saltelli et al. 2010 (first order), Jansen 1999 (total); by scipy"
_SHOWN = 7
_SAME = 5e-4  # change of an aim that is not worth a word


def of_study(study: Study) -> Account:
    """The answer, the inputs, what survives, the chances, both fronts and what matters."""
    problem = study.problem
    return {
        "title": problem.title,
        "kind": problem.kind,
        "confidence": study.terms.confidence,
        "samples": study.samples,
        "seed": study.seed,
        "evaluations": study.evaluations,
        "versions": versions(),
        "answer": answer(study),
        "answered": bool(len(study.robust)),
        "inputs": uncertain(problem),
        "exact": list(problem.exact),
        "all_usual": all(known.usual for known in problem.uncertain),
        "front": {
            "designs": len(study.front),
            "meet_limits": int(study.survives.sum()),
            "on_robust_front": int(study.unbeaten.sum()),
            "near_robust_front": int(study.near.sum()),
        },
        "robust_front": {
            "designs": len(study.robust),
            "before_thinning": study.held,
            "searched_for_it": int(study.anew.sum()),
            "hypervolume": None if study.volume is None else study.volume[1],
            "hypervolume_of_the_given": None if study.volume is None else study.volume[0],
        },
        "price": _price(study),
        "limits": _limits(study),
        "shown": _shown(study),
        "robust_shown": _robust_shown(study),
        "influence": _influence(study),
        "notes": _notes(study),
        "safety": safety(),
        "units": {**units(problem), **_band_units(study)},
    }


def tables(study: Study) -> pd.DataFrame:
    """robust.csv: the given front, then the designs that were searched for the robust one."""
    given, robust = study.front.table, study.robust_table[study.anew]
    whole = pd.concat([given, robust], ignore_index=True)
    both = [_columns(study, study.given), _columns(study, study.robust.rows(study.anew))]
    figures = {name: np.concatenate([part[name] for part in both]) for name in both[0]}
    front = np.where(study.unbeaten, "both", "given").tolist() + ["robust"] * len(robust)
    return pd.concat([pd.DataFrame({"front": front}), whole, pd.DataFrame(figures)], axis=1)


def answer(study: Study) -> str:
    """The answer in a few sentences."""
    rate = f"{100.0 * study.terms.confidence:g} %"
    said = [_surviving(study, rate)]
    if not len(study.robust):
        said.append("No other design does either: give more room in the limits, or know more.")
        return " ".join(said)
    said.append(_staying(study, rate))
    changes = [
        f"{words(price['outcome'])} {_apart(price)}"
        for price in _price(study)
        if abs(price["median_change"]) >= _SAME
    ]
    if changes:
        said.append(
            f"What is assured with {rate}, median of the front: {_listed(changes)} what is "
            "computed."
        )
    if deciding := list(_deciding(study)):
        said.append(f"What decides most: {_listed(deciding)}.")
    return " ".join(said)


def _surviving(study: Study, rate: str) -> str:
    """How many designs of the given front hold at the confidence."""
    total, meet = len(study.front), int(study.survives.sum())
    does = "meet all limits" if study.problem.limits else "can be built and driven"
    if total == 1:
        one = does.replace("meet ", "meets ")
        negative = "does not meet all limits" if study.problem.limits else "cannot be built"
        return f"The one design {one if meet else negative} with a chance of {rate} or more."
    many = {0: f"None of the {total}", total: f"All {total}"}.get(meet, f"{meet} of the {total}")
    return f"{many} designs of the front {does} with a chance of {rate} or more."


def _staying(study: Study, rate: str) -> str:
    """How much of them is on the front at the confidence, and how much of that is new."""
    held, near, anew = (int(marks.sum()) for marks in (study.unbeaten, study.near, study.anew))
    new = f"the front at {rate} confidence was searched anew"
    if not study.survives.any():
        count = len(study.robust)
        return f"{new[0].upper()}{new[1:]}: {count} design{'s' * (count > 1)}."
    if len(study.front) == 1:
        stays = "stays unbeaten" if held else "is beaten"
        return f"It {stays} when every aim is taken at {rate} confidence."
    if not near:
        return f"All of them are beaten when every aim is taken at {rate} confidence; {new}."
    near_it = f"; {near} lie on that front or within 1 % of it" if near > held else ""
    stay = "stays" if held == 1 else "stay"
    more = f"; {anew} more designs of it were found" if anew else ""
    return (
        f"{held or 'None'} of them {stay} unbeaten when every aim is taken at {rate} "
        f"confidence{near_it}{more}."
    )


def _listed(parts: list[str]) -> str:
    return parts[0] if len(parts) == 1 else f"{', '.join(parts[:-1])} and {parts[-1]}"


def _deciding(study: Study) -> Iterator[str]:
    """For each aim the input that explains most of it."""
    for aim in study.problem.aims:
        first, share = next(iter(study.influence.share(aim.outcome).items()))
        if share > 0.0:
            yield f"{words(first)} for {words(aim.outcome)} ({100.0 * share:.0f} % of the variance)"


def _apart(price: Account) -> str:
    change = price["median_change"]
    side = "above" if change > 0.0 else "below"
    if price["relative"]:
        return f"{abs(100.0 * change):.1f} % {side}"
    return f"{abs(change):.2g} K {side}"


def _price(study: Study) -> list[Account]:
    """By how much each aim at the confidence differs from its nominal figure, given front."""
    found = []
    for place, aim in enumerate(study.problem.aims):
        named = study.problem.outcome(aim.outcome)
        nominal = study.front.table[named.column].to_numpy(dtype=float)
        change = study.given.assured[:, place] - nominal
        relative = named.unit != "K"
        if relative:
            change = change / np.where(nominal == 0.0, 1.0, np.abs(nominal))
        found.append(
            {
                "outcome": aim.outcome,
                "sense": aim.sense,
                "unit": named.unit,
                "relative": relative,
                "median_change": float(np.median(change)),
                "least_change": float(change.min()),
                "greatest_change": float(change.max()),
            }
        )
    return found


def _limits(study: Study) -> list[Account]:
    """Chances of meeting each side of a limit over the given front."""
    found = []
    for place, bound in enumerate(task_of(study.problem).bounds):
        chance = study.given.chance[:, place]
        found.append(
            {
                "outcome": bound.outcome,
                "side": bound.side,
                "bound": bound.bound,
                "unit": study.problem.outcome(bound.outcome).unit,
                "least_chance": float(chance.min()),
                "median_chance": float(np.median(chance)),
                "designs_below_confidence": int((chance < study.terms.confidence).sum()),
            }
        )
    return found


def _shown(study: Study) -> list[Account]:
    """A few designs of the given front with their bands and chances."""
    letters = {pick.row: pick for pick in picked(study.front, study.problem)}
    records = study.front.table.to_dict("records")
    figures = _columns(study, study.given)
    found = []
    for row in study.shown.tolist():
        pick = letters.get(row)
        found.append(
            {
                "letter": pick.letter if pick else "",
                "label": pick.label if pick else "",
                "survives": bool(study.survives[row]),
                "on_robust_front": bool(study.unbeaten[row]),
                **{str(key): value for key, value in records[row].items()},
                **{name: float(values[row]) for name, values in figures.items()},
            }
        )
    return found


def _robust_shown(study: Study) -> list[Account]:
    """A few designs spread along the front at the confidence."""
    count = len(study.robust)
    rows = np.unique(np.linspace(0, count - 1, min(_SHOWN, count)).round().astype(int))
    records = study.robust_table.to_dict("records")
    figures = _columns(study, study.robust)
    return [
        {
            "searched_for_it": bool(study.anew[row]),
            **{str(key): value for key, value in records[row].items()},
            **{name: float(values[row]) for name, values in figures.items()},
        }
        for row in rows.tolist()
    ]


def _influence(study: Study) -> list[Account]:
    """Mean and range over the shown designs of both indices of every input, by outcome."""
    found = []
    influence = study.influence
    for place, name in enumerate(influence.outcomes):
        order = list(influence.share(name))
        columns = [influence.inputs.index(known) for known in order]
        first, total = influence.first[:, place], influence.total[:, place]
        found.append(
            {
                "outcome": name,
                "standard_deviation": influence.spread[:, place].tolist(),
                "inputs": [
                    {
                        "name": known,
                        "first": float(first[:, column].mean()),
                        "total": float(total[:, column].mean()),
                        "least_total": float(total[:, column].min()),
                        "greatest_total": float(total[:, column].max()),
                    }
                    for known, column in zip(order, columns, strict=True)
                ],
            }
        )
    return found


def _columns(study: Study, bands: Bands) -> dict[str, Floats]:
    """Bands, aims at the confidence and chances of some designs, by column name."""
    problem, rate = study.problem, f"{100.0 * study.terms.confidence:g}"
    found: dict[str, Floats] = {}
    for named in (*problem.outcomes, *problem.settings):
        for place, percent in enumerate(BAND):
            found[_named(named, f"p{percent:g}")] = bands.band[named.name][:, place]
    for place, aim in enumerate(problem.aims):
        found[_named(problem.outcome(aim.outcome), f"at_{rate}")] = bands.assured[:, place]
    for place, bound in enumerate(task_of(problem).bounds):
        found[chance_of(bound)] = bands.chance[:, place]
    return {**found, "chance_of_all": bands.chance_of_all}


def _band_units(study: Study) -> dict[str, str]:
    problem, rate = study.problem, f"{100.0 * study.terms.confidence:g}"
    named = {aim.outcome: problem.outcome(aim.outcome) for aim in problem.aims}
    found = {_named(item, f"at_{rate}"): item.unit for item in named.values()}
    for item in (*problem.outcomes, *problem.settings):
        found |= {_named(item, f"p{percent:g}"): item.unit for percent in BAND}
    return found


def _named(named: Outcome, what: str) -> str:
    """Column of a figure about an outcome: "heat_p5_W"."""
    return f"{named.name}_{what}{suffix(named.unit)}"


def chance_of(bound: Bound) -> str:
    """Column of the chance of meeting one side of a limit."""
    return f"chance_{bound.outcome}_{bound.side}"


def _notes(study: Study) -> list[str]:
    rate = f"{100.0 * study.terms.confidence:g} %"
    said = [
        f"All designs meet the same {study.samples} draws (scrambled Sobol sample, seed "
        f"{study.seed}): differences between designs are not chance.",
        f"At {rate} confidence: the figure that an aim does at least as well as in {rate} of the "
        "draws; limits are met all together in that share of them.",
        "Ends of a normal shape hold 95 % of the draws; it is cut at three standard deviations.",
        "The inputs are drawn independently of each other; each law's scatter is one factor for "
        "the whole design.",
        f"Shares of variance: {INDICES}.",
    ]
    if all(known.usual for known in study.problem.uncertain):
        said.insert(
            0,
            "The case states nothing in [uncertain]: what is usual was taken. State there what "
            "you know of your own job.",
        )
    if study.problem.exact:
        said.append(f"Taken as exact: {', '.join(words(name) for name in study.problem.exact)}.")
    return said
