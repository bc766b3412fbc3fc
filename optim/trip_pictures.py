"""The pictures of `trips`: the fronts of all ways, their gain over fan power, the wire.

The map is drawn in `trip_map_picture`; sizes, palette and axes are in `ink`.
"""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from optim import ink
from optim.picks import column
from optim.text import words
from optim.trip_map_picture import map_picture
from optim.trip_study import AT_POWER, PAYS, POWER, TripStudy
from problems.problem import Floats
from problems.units import format_value

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

# dash, marker and colour of each way in its order, the plain one first
_LOOKS: tuple[tuple[Any, str, str], ...] = (
    ("-", "o", ink.INK),
    ("-", "^", ink.PALETTE[0]),
    ((0, (6, 2)), "s", ink.PALETTE[1]),
    ((0, (4, 1.5, 1, 1.5)), "v", ink.PALETTE[2]),
    ((0, (1.5, 1.5)), "D", ink.PALETTE[3]),
    ((0, (8, 2, 1, 2, 1, 2)), "X", ink.PALETTE[4]),
)
_LEGEND_MM = 46.0


def save_pictures(study: TripStudy, folder: Path) -> list[Path]:
    """Draw what there is to show into `folder`; returns the files written."""
    title = study.entries[0].problem.title
    drawn = [ink.save(strategies_picture(study), folder / "strategies.png", title)]
    if study.references:
        drawn.append(ink.save(gain_picture(study), folder / "gain.png", title))
    if study.maps:
        drawn.append(ink.save(map_picture(study), folder / "map.png", title))
    if study.wire is not None:
        drawn.append(ink.save(wire_picture(study), folder / "wire.png", title))
    return drawn


def strategies_picture(study: TripStudy) -> Figure:
    """The front of every way: merit against fan power."""
    problem = study.entries[0].problem
    with ink.style():
        below = (
            "The best designs of each way to force transition, under the limits of the case. "
            "Where lines lie on the plain one a wire brings nothing."
        )
        figure, ax = _sheet(problem.title, below)
        known = [(entry, study.fronts[entry.name]) for entry in study.entries]
        found = [(entry, front) for entry, front in known if len(front)]
        merit = problem.outcome(study.merit.outcome)
        powers = [column(front, entry.problem, POWER) for entry, front in found]
        figures = [column(front, entry.problem, merit.name) for entry, front in found]
        note = "more is better" if study.merit.sense == "most" else "less is better"
        x_of = ink.measure(ax, "x", words(POWER), "W", np.concatenate(powers), "less is better")
        y_of = ink.measure(ax, "y", words(merit.name), merit.unit, np.concatenate(figures), note)
        for (entry, _), power, figure_of in zip(found, powers, figures, strict=True):
            order = np.argsort(power, kind="stable")
            _line(ax, study, entry.name, x_of(power[order]), y_of(figure_of[order]))
        ink.margins(ax, "x", x_of(np.concatenate(powers)))
        ink.margins(ax, "y", y_of(np.concatenate(figures)))
        _answers(ax, study, merit.name, x_of, y_of)
        _legend(ax)
        return figure


def gain_picture(study: TripStudy) -> Figure:
    """Gain of every way over the plain surface at equal fan power, with the band of the best."""
    problem = study.entries[0].problem
    with ink.style():
        what = {"hottest_wall": "excess of the hottest wall, plain over tripped, less one"}
        told = what.get(study.merit.outcome, words(study.merit.outcome))
        below = (
            f"Gain in {told}, at equal fan power and within the limits of the case. Markers: "
            "searched one by one; lines: from the fronts."
        )
        figure, ax = _sheet(problem.title, below)
        powers, gains = study.curve
        x_of = ink.measure(ax, "x", words(POWER), "W", powers)
        ax.set_ylabel("gain over the best plain surface, %")
        _zero(ax)
        places = range(len(study.references))
        at = x_of(np.array([study.references[place][POWER] for place in places]))
        for name in study.names:
            _line(ax, study, name, x_of(powers), 100.0 * gains[name], marked=False)
            dash, marker, colour = _look(study, name)
            exact = [100.0 * study.gain(place, name) for place in places]
            ax.plot(at, exact, ls="", marker=marker, ms=5.0, mfc=colour, mec=ink.INK, mew=0.5)
            ax.plot([], [], ls=dash, marker=marker, ms=5.0, color=colour, mec=ink.INK, label=name)
        _band(ax, study, x_of(powers), gains, at)
        highest = max(100.0 * max(float(g.max()) for g in gains.values()), 4.0)
        lowest = min(0.0, 100.0 * min(study.guaranteed(p, study.best) for p in places))
        ax.set_ylim(lowest - 0.06 * highest, 1.08 * highest)
        ink.margins(ax, "x", x_of(powers), 0.03)
        _legend(ax)
        return figure


def wire_picture(study: TripStudy) -> Figure:
    """The wire of the answer: what its diameter does, and what turning the velocity down does."""
    wire = study.wire
    if wire is None or study.wire_way is None:
        raise ValueError("the study has no wire to draw")
    problem = study.entries[0].problem
    design = study.winners[study.shown, AT_POWER, study.wire_way]
    place = format_value(float(f"{design.settings['trip_position']:.2g}"), "m")
    speed = format_value(float(f"{design.settings['velocity']:.2g}"), "m/s")
    with ink.style():
        below = (
            f"The design of the answer, {study.wire_way}, at {place} from the leading edge and "
            f"{speed}: all else fixed, its diameter (left) or its velocity (right) moves."
        )
        top = ink.head_mm(problem.title, below) + 16.0
        figure = ink.sheet(78.0 + top)
        ink.head(figure, problem.title, below)
        _diameter(ink.panel(figure, 17.0, 12.0, 62.0, 64.0), study, design.settings["trip_height"])
        _turndown(ink.panel(figure, 103.0, 12.0, 62.0, 64.0), study)
        return figure


def _sheet(title: str, below: str) -> tuple[Figure, Axes]:
    top = ink.head_mm(title, below)
    figure = ink.sheet(98.0 + top)
    ink.head(figure, title, below)
    width = ink.WIDTH_MM - 20.0 - _LEGEND_MM
    return figure, ink.panel(figure, 18.0, 13.0, width, ink.height_mm(figure) - 17.0 - top)


def _look(study: TripStudy, name: str) -> tuple[Any, str, str]:
    return _LOOKS[[entry.name for entry in study.entries].index(name)]


def _line(ax: Axes, study: TripStudy, name: str, x: Floats, y: Floats, marked: bool = True) -> None:
    """One way as a line; markers here and there, at other places for each way."""
    dash, marker, colour = _look(study, name)
    number = [entry.name for entry in study.entries].index(name)
    every = (number * len(x) // 48, max(len(x) // 8, 1))
    ax.plot(
        x,
        y,
        ls=dash,
        color=colour,
        marker=marker if marked else "",
        markevery=every,
        ms=5.0,
        mec=ink.INK,
        mew=0.5,
        lw=2.2 if name == "plain" else 1.4,
        label=name if marked else None,
        zorder=2.5 if name == "plain" else 3.0,
    )


def _legend(ax: Axes) -> None:
    handles, labels = ax.get_legend_handles_labels()
    ink.legend(ax, handles, labels, 1.0, "Way to trip")


def _answers(ax: Axes, study: TripStudy, merit: str, x_of: Any, y_of: Any) -> None:
    """Rings around the design of the answer and the plain one beside it."""
    if not study.references:
        return
    for name in dict.fromkeys((study.best, "plain")):
        won = study.winners[study.shown, AT_POWER, name]
        x, y = x_of(np.array([won[POWER]])), y_of(np.array([won[merit]]))
        told = "compared in\nthe answer" if name == "plain" else None
        ax.plot(x, y, ls="", marker="o", ms=11.0, mfc="none", mec=ink.INK, mew=1.1, label=told)


def _zero(ax: Axes) -> None:
    ax.axhline(0.0, color=ink.INK, lw=1.0)
    ax.axhline(
        100.0 * PAYS,
        color=ink.GREY,
        lw=0.8,
        ls=(0, (2, 2)),
        label=f"counts as\npaying, {100 * PAYS:.0f} %",
    )


def _band(ax: Axes, study: TripStudy, x: Floats, gains: dict[str, Floats], at: Floats) -> None:
    """The gain of the best way over the band of onsets, shaded; between references as far from
    the line as at them.
    """
    if study.best == "plain":
        return
    name, line = study.best, 100.0 * gains[study.best]
    ends = [(study.guaranteed(p, name), study.bands[p, name].gain.max()) for p in range(len(at))]
    apart = 100.0 * np.array([np.array(end) - study.gain(p, name) for p, end in enumerate(ends)])
    low, high = (line + np.interp(np.log(x), np.log(at), side) for side in apart.T)
    colour = _look(study, study.best)[2]
    ax.fill_between(
        x, low, high, color=colour, alpha=0.25, lw=0.0, label=f"{name} over\nthe onset band"
    )


def _diameter(ax: Axes, study: TripStudy, height: float) -> None:
    """Merit and fan power over those without a wire, against the diameter."""
    wire = study.wire
    if wire is None:
        return
    ends = [height, wire.enough, wire.smallest or 0.0, *wire.stock]
    shown = wire.heights <= 1.15 * max(ends)
    x = 1e3 * wire.heights[shown]
    merit = 100.0 * (wire.merit[shown] / wire.merit[0] - 1.0)
    power = 100.0 * (wire.power[shown] / wire.power[0] - 1.0)
    ax.plot(x, merit, color=ink.PALETTE[0], label=_merit_told(study))
    ax.plot(x, power, color=ink.PALETTE[1], ls=(0, (5, 2)), label=words(POWER))
    ax.set_xlabel("wire diameter, mm")
    ax.set_ylabel("change by the wire, %")
    ax.set_xlim(0.0, float(x[-1]))
    marks = [("-", height, "design"), ((0, (1, 1.5)), wire.enough, "enough: more only drags")]
    if wire.smallest is not None:
        margin = f"trips, {100.0 * (wire.margin - 1.0):.0f} % to spare"
        marks.append(((0, (6, 2)), wire.smallest, margin))
    for dash, size, name in marks:
        ax.axvline(1e3 * size, color=ink.GREY, ls=dash, lw=1.1, label=name)
    if wire.stock:
        foot = np.zeros(len(wire.stock))
        ax.plot(
            1e3 * np.array(wire.stock), foot, ls="", marker="^", ms=7.0, mfc="white", mec=ink.INK,
            transform=ax.get_xaxis_transform(), clip_on=False, label="in stock", zorder=5,
        )  # fmt: skip
    _above(ax, 2)


def _merit_told(study: TripStudy) -> str:
    told = {"hottest_wall": "1 / wall excess"}
    return told.get(study.merit.outcome, words(study.merit.outcome))


def _turndown(ax: Axes, study: TripStudy) -> None:
    """Merit with the wire over that without, against the share of the design velocity."""
    wire = study.wire
    if wire is None:
        return
    x = 100.0 * wire.speeds
    gain = 100.0 * (wire.turned_down / wire.turned_down_bare - 1.0)
    told = _merit_told(study)
    ax.plot(x, gain, color=ink.PALETTE[0], label=f"{told}, over no wire")
    ax.axhline(0.0, color=ink.INK, lw=1.0)
    if wire.fails_below > 0.0:
        share = 100.0 * wire.fails_below
        ax.axvspan(x[0], share, fc="none", ec=ink.PALE, hatch="///", lw=0.0, label="wire fails")
    ax.set_xlabel("velocity, % of the design's")
    ax.set_ylabel("change at the same velocity, %")
    ax.set_xlim(float(x[0]), 100.0)
    _above(ax, 1)


def _above(ax: Axes, columns: int) -> None:
    """The legend of a panel above it, as wide as the panel."""
    ax.legend(
        loc="lower left", bbox_to_anchor=(-0.12, 1.02), ncols=columns, borderaxespad=0.0,
        columnspacing=1.0, handlelength=2.2, handletextpad=0.5,
    )  # fmt: skip
