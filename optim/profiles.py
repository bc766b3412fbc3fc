"""One design along its plate: a panel for each unit, regions hatched, places marked.

What the curves are comes from `Problem.profile`; this module only draws them.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

import numpy as np

from optim import ink
from problems.problem import Curve, Floats, Problem, Profile, Region

if TYPE_CHECKING:
    from collections.abc import Callable

    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

_LEFT_MM, _WIDE_MM = 25.0, 97.0
_PANEL_MM, _STEP_MM = 34.0, 38.0
_STRIP_MM, _FOOT_MM, _LINE_MM = 5.5, 12.0, 4.2
_LETTER_MM = 1.9
_DASHES: tuple[Any, ...] = ("-", (0, (5, 2)), (0, (1.5, 1.5)), "-.")
_HATCHES = ("", "////", "...", "xxx", "\\\\\\\\")
_LOG_EDGE = 0.003  # share of the length that a profile's scale of h or shear may begin at


def profile_picture(problem: Problem, design: Floats, figure: Figure | None = None) -> Figure:
    """Curves along the plate of one design of shape (number of variables,).

    Curves of one unit share a panel. The regions stand as a labelled strip over the panels and
    as hatching in them, the marked places as vertical lines with their names.
    """
    with ink.style():
        profile = problem.profile(design)
        panels = _by_unit(profile.curves)
        caption = problem.sketch(design).caption
        rows = _rows(profile)
        top = ink.head_mm(problem.title, caption)
        over = _LINE_MM * (1 + max(rows.values(), default=-1)) + 1.0 + _STRIP_MM + 2.0
        figure = figure or ink.sheet(top + over + _STEP_MM * len(panels) + _FOOT_MM - 4.0)
        ink.head(figure, problem.title, caption)
        bottom = ink.height_mm(figure) - top - over
        strip = ink.panel(figure, _LEFT_MM, bottom + 2.0, _WIDE_MM, _STRIP_MM)
        hatches = _hatches(profile.regions)
        convert: Callable[[Any], Any] = np.asarray
        for place, curves in enumerate(panels):
            low = bottom - _PANEL_MM - _STEP_MM * place
            ax = ink.panel(figure, _LEFT_MM, low, _WIDE_MM, _PANEL_MM)
            convert = ink.measure(ax, "x", "distance from the leading edge", "m", _ends(profile))
            _panel(ax, profile, curves, convert, hatches)
            if place + 1 < len(panels):
                ax.set_xlabel("")
                ax.tick_params(labelbottom=False)
        _strip(strip, profile, convert, rows, hatches)
        return figure


def _by_unit(curves: tuple[Curve, ...]) -> list[list[Curve]]:
    found: dict[str, list[Curve]] = {}
    for curve in curves:
        found.setdefault(curve.unit, []).append(curve)
    return list(found.values())


def _ends(profile: Profile) -> Floats:
    return np.array([0.0, profile.x[-1]])


def _hatches(regions: tuple[Region, ...]) -> dict[str, str]:
    """A hatch for each sort of region, none for the first."""
    names = dict.fromkeys(["laminar", "transitional", "turbulent"])
    names |= dict.fromkeys(region.name for region in regions)
    return {name: _HATCHES[place % len(_HATCHES)] for place, name in enumerate(names)}


def _panel(
    ax: Axes,
    profile: Profile,
    curves: list[Curve],
    convert: Callable[[Any], Any],
    hatches: Mapping[str, str],
) -> None:
    """The curves of one unit over regions and marks, with a legend beside them."""
    x = convert(profile.x)
    worth = profile.x >= _LOG_EDGE * profile.x[-1]
    values = np.concatenate([curve.values[worth] for curve in curves])
    name = curves[0].name if len(curves) == 1 else _shared(curves)
    shown = ink.measure(ax, "y", name, curves[0].unit, values, wrap=22)
    for place, curve in enumerate(curves):
        ax.plot(
            x[worth],
            shown(curve.values)[worth],
            color=ink.PALETTE[place % len(ink.PALETTE)],
            ls=_DASHES[place % len(_DASHES)],
            label=curve.name,
            zorder=3,
        )
    ink.margins(ax, "y", shown(values), 0.1, from_zero=curves[0].unit != "K")
    ax.set_xlim(convert(_ends(profile)))
    for region in profile.regions:
        start, end = convert(region.start), convert(region.end)
        ax.axvspan(start, end, facecolor="none", hatch=hatches[region.name], lw=0, zorder=0)
    for mark in profile.marks.values():
        ax.axvline(convert(mark), color=ink.INK, lw=0.9, ls=(0, (6, 3)), zorder=2)
    if len(curves) > 1:
        ink.legend(ax, *ax.get_legend_handles_labels(), 1.0)


def _shared(curves: list[Curve]) -> str:
    """The word that all curves of a panel end with, "thickness" of layer and momentum."""
    last = {curve.name.split()[-1] for curve in curves}
    return last.pop() if len(last) == 1 else curves[0].name


def _rows(profile: Profile) -> dict[str, int]:
    """In which line above the strip the name of each mark stands, from right to left.

    A name stands to the right of its line; none overlaps another or is crossed by a line.
    """
    left: list[float] = []
    rows = {}
    for name, place in sorted(profile.marks.items(), key=lambda mark: -mark[1]):
        start = place / profile.x[-1] * _WIDE_MM
        end = start + _LETTER_MM * len(name) + 2.0
        row = next((row for row, edge in enumerate(left) if end < edge), len(left))
        left[row:] = [start]  # the lines of marks further left would run through lower names
        rows[name] = row
    return rows


def _strip(
    ax: Axes,
    profile: Profile,
    convert: Callable[[Any], Any],
    rows: Mapping[str, int],
    hatches: Mapping[str, str],
) -> None:
    """The regions by name, where there is room, and the names of the marks above them."""
    from matplotlib.patches import Patch

    ax.grid(False)
    ax.set(xlim=convert(_ends(profile)), ylim=(0.0, 1.0), xticks=[], yticks=[])
    ax.spines[["top", "right"]].set_visible(True)
    length = float(profile.x[-1])
    for region in profile.regions:
        start, end = convert(region.start), convert(region.end)
        ax.axvspan(start, end, facecolor="none", edgecolor=ink.GREY, lw=0.7)
        ax.axvspan(start, end, facecolor="none", hatch=hatches[region.name], lw=0, zorder=0)
        if (region.end - region.start) / length * _WIDE_MM > _LETTER_MM * len(region.name) + 1.0:
            plate = {"facecolor": "white", "edgecolor": "none", "pad": 1.0}
            middle = 0.5 * (start + end)
            ax.text(middle, 0.47, region.name, ha="center", va="center", fontsize=8.5, bbox=plate)
    for name, place in profile.marks.items():
        height = 1.0 + (1.0 + _LINE_MM * rows[name]) / _STRIP_MM
        ax.plot(
            [convert(place)] * 2,
            [0.0, height + 0.55 * _LINE_MM / _STRIP_MM],
            color=ink.INK,
            lw=0.9,
            ls=(0, (6, 3)),
            clip_on=False,
        )
        ax.annotate(
            name,
            (convert(place), height),
            xytext=(3, 0),
            textcoords="offset points",
            ha="left",
            va="bottom",
            annotation_clip=False,
        )
    handles = [
        Patch(facecolor="white", edgecolor=ink.GREY, hatch=hatch, label=name)
        for name, hatch in hatches.items()
    ]
    ink.legend(ax, handles, list(hatches), 1.0)
