"""The pictures of a front under uncertainty: both fronts with bands, what matters, the chances.

Sizes, palette and axes are in `ink`; the figures come from a `Study`.
"""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal

import numpy as np

from optim import ink
from optim.front import Front
from optim.picks import column, leading, spread
from optim.robust import Study
from optim.robust_files import PICTURES
from optim.task import task_of
from optim.text import words
from problems.problem import Aim, Floats, Outcome
from problems.units import format_value

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

FRONT, INPUTS, LIMITS = PICTURES
_BANDED = 15  # designs that carry their band in the picture
_LEGEND_MM = 46.0
_BAR_MM, _PANEL_GAP_MM = 5.0, 18.0
_FEW, _MANY = 10, 150  # designs from which markers are smaller
_LEAST = 0.005  # total index from which an input is drawn
_SIDES = {"at_most": "at most", "at_least": "at least"}
_LINES = ("o", "^", "s", "D", "v", "P")


def save_pictures(study: Study, folder: Path) -> list[Path]:
    """Draw what there is to see into `folder`; returns the files written."""
    title = study.problem.title
    drawn = [ink.save(front_picture(study), folder / FRONT, title)]
    drawn.append(ink.save(inputs_picture(study), folder / INPUTS, title))
    if task_of(study.problem).bounds:
        drawn.append(ink.save(limits_picture(study), folder / LIMITS, title))
    return drawn


def _rate(study: Study) -> str:
    return f"{100.0 * study.terms.confidence:g} %"


def front_picture(study: Study) -> Figure:
    """The given front with bands of some of its designs, and the front at the confidence.

    Over the two leading aims; with a single aim over the first variable.
    """
    with ink.style():
        below = (
            f"{_counted(len(study.front))} as computed, with what {study.samples} shared draws "
            f"make of some, and the front at {_rate(study)} confidence"
        )
        top = ink.head_mm(study.problem.title, below)
        figure = ink.sheet(100.0 + top)
        ink.head(figure, study.problem.title, below)
        width = ink.WIDTH_MM - 20.0 - _LEGEND_MM
        ax = ink.panel(figure, 18.0, 13.0, width, ink.height_mm(figure) - 16.0 - top)
        x, y = (_axis(ax, study, side) for side in ("x", "y"))
        _bands(ax, study, x, y)
        lost = ~study.survives
        size = _size(len(study.front))
        if not lost.all():
            ax.plot(
                x.given[~lost], y.given[~lost], ls="", marker="o", ms=size, mfc="none", mew=0.6,
                mec=ink.PALETTE[0], label="given front,\nlimits hold", zorder=3,
            )  # fmt: skip
        if lost.any():
            ax.plot(
                x.given[lost], y.given[lost], ls="", marker="x", ms=size + 1.0, mew=0.8,
                mec=ink.INK, label=f"given front, limits\nbroken too often\nfor {_rate(study)}",
                zorder=4,
            )  # fmt: skip
        if len(study.robust):
            ax.plot(
                x.robust, y.robust, ls="", marker="^", ms=_size(len(study.robust)) + 0.2,
                mfc=ink.PALETTE[1], mec="none", zorder=2,
                label=f"front at {_rate(study)},\nfigures assured",
            )  # fmt: skip
        handles, labels = ax.get_legend_handles_labels()
        ink.legend(ax, handles, labels, 1.0)
        return figure


def _counted(count: int) -> str:
    return "One design" if count == 1 else f"{count} designs"


def _size(count: int) -> float:
    """Size of the markers of so many designs."""
    return 2.6 if count >= _MANY else 3.4 if count >= _FEW else 6.0


class _Side:
    """One axis of the picture of the fronts: what stands there, in the numbers of the axis."""

    def __init__(self, given: Floats, robust: Floats, low: Floats, high: Floats) -> None:
        self.given, self.robust, self.low, self.high = given, robust, low, high


def _axis(ax: Axes, study: Study, side: Literal["x", "y"]) -> _Side:
    """Dress one side of `ax` and give what stands on it."""
    problem, aims = study.problem, leading(study.problem)
    if side == "x" and len(aims) < 2:
        return _variable_axis(ax, study)
    aim = aims[0] if side == "x" or len(aims) < 2 else aims[1]
    named = problem.outcome(aim.outcome)
    place = [known.outcome for known in problem.aims].index(aim.outcome)
    given, band = column(study.front, problem, aim.outcome), study.given.band[aim.outcome]
    robust = study.robust.assured[:, place]
    some = spread(study.front, problem, _BANDED)
    every = np.concatenate([given, robust, band[some].ravel()])
    note = {"most": "more is better", "least": "less is better"}[aim.sense]
    convert = ink.measure(ax, side, words(named.name), named.unit, every, note)
    ink.margins(ax, side, convert(every), 0.04)
    return _Side(convert(given), convert(robust), convert(band[:, 0]), convert(band[:, 2]))


def _variable_axis(ax: Axes, study: Study) -> _Side:
    """The first variable, or the first setting where nothing is free, along the picture."""
    free = study.problem.variables or study.problem.settings
    name, unit, key = free[0].name, free[0].unit, free[0].column
    given = study.front.table[key].to_numpy(dtype=float)
    robust = study.robust_table[key].to_numpy(dtype=float)
    every = np.concatenate([given, robust])
    convert = ink.measure(ax, "x", words(name), unit, every)
    ink.margins(ax, "x", convert(every), 0.06)
    return _Side(convert(given), convert(robust), convert(given), convert(given))


def _bands(ax: Axes, study: Study, x: _Side, y: _Side) -> None:
    """Crosses from 5 to 95 % of the draws on some designs."""
    some = spread(study.front, study.problem, _BANDED)
    look: dict[str, Any] = {"color": ink.INK, "lw": 1.0, "zorder": 5}
    ax.hlines(y.given[some], x.low[some], x.high[some], label="5 to 95 % of draws", **look)
    ax.vlines(x.given[some], y.low[some], y.high[some], **look)


def inputs_picture(study: Study) -> Figure:
    """Which input matters for each aim and limit: first-order and total indices."""
    influence = study.influence
    moved = [
        name
        for place, name in enumerate(influence.outcomes)
        if influence.total[:, place].max(initial=0.0) > 0.0
    ]
    drawn = []
    shown = moved or list(influence.outcomes[:1])
    for name in shown:
        share = influence.share(name)
        drawn.append(
            [known for known, total in share.items() if total >= _LEAST] or [next(iter(share))]
        )
    with ink.style():
        below = (
            f"What the spread comes from: mean of {len(study.shown)} designs of the front, "
            "whiskers from least to greatest"
        )
        rows = [drawn[start : start + 2] for start in range(0, len(drawn), 2)]
        talls = [_BAR_MM * max(len(names) for names in row) + 2.0 for row in rows]
        top = ink.head_mm(study.problem.title, below) + 13.0
        figure = ink.sheet(top + sum(talls) + _PANEL_GAP_MM * len(rows) + 2.0)
        ink.head(figure, study.problem.title, below)
        upper = ink.height_mm(figure) - top
        for number, row in enumerate(rows):
            for place, names in enumerate(row):
                tall = _BAR_MM * len(names) + 2.0
                left = 34.0 + 85.0 * place
                ax = ink.panel(figure, left, upper - tall, 47.0, tall)
                _bars(ax, study, shown[2 * number + place], names)
            upper -= talls[number] + _PANEL_GAP_MM
        handles, labels = figure.axes[0].get_legend_handles_labels()
        figure.legend(
            handles, labels, loc="upper left", ncols=2, borderaxespad=0.0,
            bbox_to_anchor=(4.0 / ink.WIDTH_MM, 1.0 - (top - 12.0) / ink.height_mm(figure)),
        )  # fmt: skip
        return figure


def _bars(ax: Axes, study: Study, name: str, names: list[str]) -> None:
    """Bars of one outcome, the input that matters most on top."""
    influence = study.influence
    place = influence.outcomes.index(name)
    columns = [influence.inputs.index(known) for known in names]
    total = 100.0 * influence.total[:, place, columns]
    first = 100.0 * np.maximum(influence.first[:, place, columns], 0.0)
    at = np.arange(len(names), dtype=float)
    mean = total.mean(axis=0)
    ax.barh(
        at, mean, height=0.72, fc="white", ec=ink.PALETTE[0], hatch="////", lw=0.8,
        label="with what it does together with others (total)",
    )  # fmt: skip
    ax.barh(
        at, first.mean(axis=0), height=0.36, fc=ink.PALETTE[0], ec="none",
        label="alone (first order)",
    )  # fmt: skip
    ends = [mean - total.min(axis=0), total.max(axis=0) - mean]
    ax.errorbar(mean, at, xerr=ends, fmt="none", ecolor=ink.INK, elinewidth=0.8, capsize=2.0)
    ax.set_yticks(at, [words(known) for known in names])
    ax.set_ylim(len(names) - 0.5, -0.5)
    ax.set_xlim(0.0, 103.0)
    ax.grid(visible=False, axis="y")
    ax.tick_params(axis="y", length=0.0)
    ax.set_title(words(name), loc="left", fontweight="bold", pad=3.0)
    ax.set_xlabel("share of the variance, %")


def limits_picture(study: Study) -> Figure:
    """Chance of meeting each limit and all of them along the front, over the last leading aim."""
    problem, bounds = study.problem, task_of(study.problem).bounds
    with ink.style():
        below = f"Chance of meeting the limits along the given front, {study.samples} shared draws"
        top = ink.head_mm(problem.title, below)
        figure = ink.sheet(82.0 + top)
        ink.head(figure, problem.title, below)
        width = ink.WIDTH_MM - 20.0 - _LEGEND_MM
        ax = ink.panel(figure, 18.0, 13.0, width, ink.height_mm(figure) - 16.0 - top)
        x = _along(ax, study.front, problem.outcome(_last(leading(problem)).outcome))
        for place, bound in enumerate(bounds):
            named = problem.outcome(bound.outcome)
            told = (
                f"{words(named.name)}\n{_SIDES[bound.side]} {format_value(bound.bound, named.unit)}"
            )
            ax.plot(
                x, 100.0 * study.given.chance[:, place], ls="", marker=_LINES[place % len(_LINES)],
                ms=4.0, mfc="none", mec=ink.PALETTE[place % len(ink.PALETTE)], mew=0.8, label=told,
            )  # fmt: skip
        ax.plot(
            x, 100.0 * study.given.chance_of_all, ls="", marker=".", ms=3.0, color=ink.INK,
            label="all limits",
        )  # fmt: skip
        ax.axhline(
            100.0 * study.terms.confidence, color=ink.GREY, ls=(0, (5, 2)), lw=1.0,
            label=f"asked for: {_rate(study)}",
        )  # fmt: skip
        ax.set_ylabel("chance of meeting it, %")
        least = 100.0 * min(float(study.given.chance_of_all.min()), study.terms.confidence)
        ax.set_ylim(max(least - 4.0, -2.0), 102.0)
        handles, labels = ax.get_legend_handles_labels()
        ink.legend(ax, handles, labels, 1.0)
        return figure


def _last(aims: tuple[Aim, ...]) -> Aim:
    return aims[1] if len(aims) > 1 else aims[0]


def _along(ax: Axes, front: Front, named: Outcome) -> Floats:
    values = front.table[named.column].to_numpy(dtype=float)
    shown = ink.measure(ax, "x", words(named.name), named.unit, values)(values)
    ink.margins(ax, "x", shown, 0.04)
    return np.asarray(shown)
