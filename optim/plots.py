"""The pictures of a run: the front, and how the design variables run along it.

The side views are drawn in `sketches`, one design along its plate in `profiles`; sizes, palette
and axes are in `ink`.
"""

from __future__ import annotations

import os
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from optim import ink
from optim.front import Front
from optim.picks import column, designs, leading, picked
from optim.profiles import profile_picture
from optim.runs import PICTURES, free_name, writable
from optim.sketches import sketch_picture
from optim.text import words
from problems.problem import Aim, Bools, Floats, Outcome, Problem, Variable
from problems.units import format_value

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = [
    "FRONT",
    "PROFILE",
    "SKETCH",
    "VARIABLES",
    "front_picture",
    "profile_picture",
    "save_pictures",
    "save_profile",
    "sketch_picture",
    "variables_picture",
]

FRONT, VARIABLES, SKETCH = PICTURES
PROFILE = "profile.png"
_SIZES = (0.13, 1.0)  # of markers, from least to most of the third aim
_LARGEST = 110.0  # pt^2, for up to _MANY designs; smaller beyond
_MANY = 60
_LEGEND_MM = 46.0


def save_pictures(front: Front, problem: Problem, folder: str | os.PathLike[str]) -> list[Path]:
    """Draw front.png, variables.png and sketch.png into `folder`; nothing for an empty front.

    Returns the files written. A picture that would show nothing (no free variable) is left out.
    """
    if not len(front):
        return []
    place = Path(folder)
    drawn = [ink.save(front_picture(front, problem), place / FRONT, problem.title)]
    if problem.variables:
        drawn.append(ink.save(variables_picture(front, problem), place / VARIABLES, problem.title))
    drawn.append(ink.save(sketch_picture(front, problem), place / SKETCH, problem.title))
    return drawn


def save_profile(
    problem: Problem, design: Floats, folder: str | os.PathLike[str], force: bool = False
) -> Path:
    """Draw one design of shape (number of variables,) along its plate into `folder`.

    Without `force` a picture that is there stays and the new one takes the next free name.
    """
    writable(Path(folder))
    path = Path(folder) / PROFILE
    if not force:
        path = free_name(path.parent, path.stem, path.suffix)
    return ink.save(profile_picture(problem, design), path, problem.title)


def front_picture(front: Front, problem: Problem, figure: Figure | None = None) -> Figure:
    """The front over its two leading aims, the third as size and colour of the markers.

    With a single aim it is drawn over the first variable. The sort of design is told by the
    marker's shape; the designs of the sketch carry their letters.
    """
    with ink.style():
        below = _below(front, problem)
        top = ink.head_mm(problem.title, below)
        figure = figure or ink.sheet(96.0 + top)
        ink.head(figure, problem.title, below)
        width = ink.WIDTH_MM - 20.0 - _LEGEND_MM
        ax = ink.panel(figure, 18.0, 13.0, width, ink.height_mm(figure) - 16.0 - top)
        x_name, y_name = _axes(problem)
        x = _scaled(ax, "x", front, problem, x_name)
        y = _scaled(ax, "y", front, problem, y_name)
        third = leading(problem)[2] if len(problem.aims) > 2 else None
        if third is None:
            _scatter(ax, front, x, y, np.array(0.35 * _largest(front)))
            _sorts(ax, front, True)
        else:
            _third_aim(ax, front, problem, third, x, y)
        for pick in picked(front, problem):
            _letter(ax, pick.letter, x[pick.row], y[pick.row])
        return figure


def variables_picture(front: Front, problem: Problem, figure: Figure | None = None) -> Figure:
    """How each free variable runs along the front, over the first aim, within its range.

    Aims beyond the third, which the picture of the front cannot show, have a panel each too.
    """
    with ink.style():
        rows: list[Variable | Outcome] = list(problem.variables)
        rows += [problem.outcome(aim.outcome) for aim in leading(problem)[3:]]
        tall, below = -(-len(rows) // 2), "How the designs change along the front"
        top = ink.head_mm(problem.title, below) + 6.0
        figure = figure or ink.sheet(top + 40.0 * tall + 11.0)
        ink.head(figure, problem.title, below)
        name = leading(problem)[0].outcome
        for place, quantity in enumerate(rows):
            lowest = place + 2 >= len(rows)
            left = 18.0 + 84.0 * (place % 2)
            bottom = 11.0 + 40.0 * (tall - 1 - place // 2)
            ax = ink.panel(figure, left, bottom, 61.0, 34.0)
            x = _scaled(ax, "x", front, problem, name)
            _along(ax, front, problem, quantity, x)
            if not lowest:
                ax.set_xlabel("")
                ax.tick_params(labelbottom=False)
        _strip_legend(figure, figure.axes[0], top - 6.0)
        return figure


def _below(front: Front, problem: Problem) -> str:
    count = f"{len(front)} designs that nothing beats" if len(front) > 1 else "one design"
    if len(problem.aims) == 1:
        count = f"the best design and {len(front) - 1} near it" if len(front) > 1 else count
    letters = "; ".join(f"{pick.letter} {pick.label}" for pick in picked(front, problem))
    more = [words(aim.outcome) for aim in leading(problem)[3:]]
    also = f"; {' and '.join(more)}: see {VARIABLES}" if more else ""
    return f"{count[0].upper()}{count[1:]}. {letters}{also}"


def _axes(problem: Problem) -> tuple[str, str]:
    """Names of the quantities along and up the picture of the front."""
    aims = leading(problem)
    if len(aims) > 1:
        return aims[0].outcome, aims[1].outcome
    free = [item.name for item in problem.variables] or [item.name for item in problem.settings]
    return free[0], aims[0].outcome


def _quantity(problem: Problem, name: str) -> Variable | Outcome:
    named = {item.name: item for item in problem.variables}
    return named[name] if name in named else problem.outcome(name)


def _values(front: Front, problem: Problem, quantity: Variable | Outcome) -> Floats:
    if isinstance(quantity, Variable):
        return designs(front, problem)[:, problem.variables.index(quantity)]
    return column(front, problem, quantity.name)


def _scaled(ax: Axes, side: Any, front: Front, problem: Problem, name: str) -> Floats:
    """Dress one side of `ax` for a quantity and return its values as they stand there."""
    quantity = _quantity(problem, name)
    values = _values(front, problem, quantity)
    senses = {aim.outcome: aim.sense for aim in problem.aims}
    note = {"most": "more is better", "least": "less is better"}.get(senses.get(name, ""), "")
    shown = ink.measure(ax, side, words(name), quantity.unit, values, note)(values)
    ink.margins(ax, side, shown, 0.08)
    return shown


def _scatter(
    ax: Axes,
    front: Front,
    x: Floats,
    y: Floats,
    size: Floats,
    tint: NDArray[np.float64] | None = None,
) -> None:
    """One marker per design, shaped by its sort, large ones below small ones.

    `size` (pt^2) is one for all or one for each; colours tell the sort where no `tint` is given.
    """
    groups = front.table["group"].to_numpy(dtype=str)
    sizes = np.broadcast_to(size, x.shape)
    order = np.argsort(-sizes, kind="stable")
    for group, (marker, colour) in ink.markers(groups).items():
        rows = order[groups[order] == group]
        ax.scatter(
            x[rows],
            y[rows],
            s=sizes[rows],
            c=[colour] if tint is None else tint[rows],
            marker=marker,
            edgecolors=ink.INK,
            linewidths=0.4 * min(1.0, (_MANY / len(front)) ** 0.5),
            label=group,
            zorder=3,
        )


def _sorts(ax: Axes, front: Front, coloured: bool) -> float:
    """The legend of the sorts of design with their numbers; returns where the next may begin."""
    from matplotlib.lines import Line2D

    groups = front.table["group"].to_numpy(dtype=str)
    known = ink.markers(groups)
    handles = [
        Line2D([], [], ls="", marker=m, ms=5.5, mfc=c if coloured else "white", mec=ink.INK)
        for m, c in known.values()
    ]
    labels = [f"{group} ({int((groups == group).sum())})" for group in known]
    return ink.legend(ax, handles, labels, 1.0, "Sort of design")


def _third_aim(ax: Axes, front: Front, problem: Problem, aim: Aim, x: Floats, y: Floats) -> None:
    """The designs with a third aim as size and colour, and the legends of both."""
    import matplotlib as mpl
    from matplotlib.lines import Line2D

    unit = problem.outcome(aim.outcome).unit
    values = column(front, problem, aim.outcome)
    ramp, largest = mpl.colormaps[ink.RAMP], _largest(front)
    share = _share(values, values)
    _scatter(ax, front, x, y, largest * _size(share), ramp(share))
    steps = _steps(values)
    parts = _share(steps, values)
    handles = [
        Line2D([], [], ls="", marker="o", ms=float(area) ** 0.5, mfc=ramp(part), mec=ink.INK)
        for part, area in zip(parts, largest * _size(parts), strict=True)
    ]
    labels = [format_value(float(f"{step:.2g}"), unit) for step in steps]
    better = "more" if aim.sense == "most" else "less"
    title = f"{words(aim.outcome)}\n({better} is better)"
    ink.legend(ax, handles, labels, _sorts(ax, front, False), title)


def _largest(front: Front) -> float:
    return float(_LARGEST * min(1.0, _MANY / len(front)) ** 0.7)


def _share(values: Floats, among: Floats) -> Floats:
    """Where values stand between least and most of `among`, 0 to 1, by ratio over decades."""
    bend = np.log if ink.runs_over_decades(among) else np.asarray
    low, high = bend(among.min()), bend(among.max())
    return np.asarray((bend(values) - low) / (high - low if high > low else 1.0), dtype=float)


def _size(share: Floats) -> Floats:
    return np.asarray(_SIZES[0] + share * (_SIZES[1] - _SIZES[0]))


def _steps(values: Floats) -> Floats:
    """Four values from least to most, for a legend."""
    low, high = float(values.min()), float(values.max())
    if high <= low:
        return np.array([low])
    if ink.runs_over_decades(values):
        return np.geomspace(low, high, 4)
    return np.linspace(low, high, 4)


def _letter(ax: Axes, letter: str, x: float, y: float) -> None:
    from matplotlib.patheffects import withStroke

    ax.annotate(
        letter,
        (x, y),
        xytext=(-11.0, 8.0),
        textcoords="offset points",
        ha="center",
        va="center",
        fontweight="bold",
        path_effects=[withStroke(linewidth=2.5, foreground="white")],
        zorder=5,
    )
    ax.plot([x], [y], ls="", marker="o", ms=14.0, mfc="none", mec=ink.INK, mew=1.1, zorder=4)


def _along(
    ax: Axes, front: Front, problem: Problem, quantity: Variable | Outcome, x: Floats
) -> None:
    """One panel: a quantity over the first aim, with the ends of its range if it was searched."""
    values = _values(front, problem, quantity)
    ends = np.array([quantity.low, quantity.high]) if isinstance(quantity, Variable) else values
    convert = ink.measure(ax, "y", words(quantity.name), quantity.unit, ends, wrap=20)
    if isinstance(quantity, Variable):
        for end in convert(ends):
            ax.axhline(end, color=ink.GREY, lw=0.9, ls=(0, (5, 3)), label="searched range")
    ink.margins(ax, "y", convert(ends), 0.08)
    values = np.where(_counts(front, problem, quantity), values, np.nan)
    _scatter(ax, front, x, convert(values), np.array(0.25 * _largest(front)))


def _counts(front: Front, problem: Problem, quantity: Variable | Outcome) -> Bools:
    """Which designs a quantity means anything in: not the place of a wire that is not there."""
    needed = getattr(quantity, "only_with", None)
    named = [variable for variable in problem.variables if variable.name == needed]
    without = [_values(front, problem, variable) == 0.0 for variable in named]
    return ~np.any(without, axis=0) if without else np.ones(len(front), dtype=np.bool_)


def _strip_legend(figure: Figure, ax: Axes, top: float) -> None:
    """One line of legend across the sheet, `top` mm below its upper edge."""
    unique = dict(zip(*reversed(ax.get_legend_handles_labels()), strict=True))
    figure.legend(
        list(unique.values()),
        list(unique),
        loc="upper left",
        bbox_to_anchor=(3.0 / ink.WIDTH_MM, 1.0 - top / ink.height_mm(figure)),
        ncols=len(unique),
        borderaxespad=0.0,
        columnspacing=1.6,
        handletextpad=0.4,
    )
