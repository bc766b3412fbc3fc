"""The map of `trips`: where forcing transition gains, where it is neutral and where it loses.

What the map holds comes from the study; sizes, palette and axes are in `ink`.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from optim import ink
from optim.text import words
from optim.trip_study import AT_POWER, POWER, TripStudy
from problems.problem import Bools, Floats
from problems.units import axis_unit, format_number, format_value

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

    from problems.trips import TripMap

_MAP_MM, _BETWEEN_MM, _KEY_MM = 82.0, 28.0, 48.0
_LEVELS = (1, 2, 5, 10, 20, 40, 60, 80, 100, 150, 200)  # %, either way
_MOST_LEVELS = 5  # either side of zero
_HATCHES = ("", "\\\\\\\\", "////", "xxxx")
_COLOURS = "PuOr"  # orange for a loss, violet for a gain
_LEAST_SHARE = 0.01  # of the map: a smaller region is not labelled
_ROWS = {"trip_share": "place of the wire, % of the length", "gap": "gap, mm"}


def map_picture(study: TripStudy) -> Figure:
    """The maps of a study, one below the other, with the designs that won on them."""
    title = study.entries[0].problem.title
    with ink.style():
        below = (
            "Gain over the plain surface at equal fan power; at every point the smallest wire that "
            "trips there (U\u00a0k/nu\u00a0=\u00a0900), or the largest that fits."
        )
        top = ink.head_mm(title, below) + 9.0
        count = len(study.maps)
        figure = ink.sheet(top + count * _MAP_MM + (count - 1) * _BETWEEN_MM + 14.0)
        ink.head(figure, title, below)
        levels = _levels(study)
        for place, chart in enumerate(study.maps):
            bottom = 13.0 + (count - 1 - place) * (_MAP_MM + _BETWEEN_MM)
            width = ink.WIDTH_MM - 20.0 - _KEY_MM
            ax = ink.panel(figure, 17.0, bottom, width, _MAP_MM - 4.0)
            _draw(figure, ax, study, chart, levels)
        return figure


def _levels(study: TripStudy) -> Floats:
    """Contours in % either side of zero, as far as gains and losses of the maps go."""
    gains = np.concatenate([chart.gain.ravel() for chart in study.maps])
    known = 100.0 * gains[np.isfinite(gains)]
    losses, wins = (
        [step for step in _LEVELS if step <= max(end, 2.0)][-_MOST_LEVELS:]
        for end in (float(-known.min(initial=0.0)), float(known.max(initial=0.0)))
    )
    return np.array([*(-step for step in reversed(losses)), 0.0, *wins], dtype=float)


def _colours(levels: Floats) -> list[Any]:
    """A colour for each stretch between contours: losses one hue, gains the other."""
    from matplotlib import colormaps

    ramp = colormaps[_COLOURS]
    losses, wins = int((levels < 0.0).sum()) + 1, int((levels > 0.0).sum()) + 1
    return [*ramp(np.linspace(0.08, 0.46, losses)), *ramp(np.linspace(0.54, 0.9, wins))]


def _draw(figure: Figure, ax: Axes, study: TripStudy, chart: TripMap, levels: Floats) -> None:
    from matplotlib.patheffects import withStroke

    x, y = chart.columns[1], _shown(chart)
    gain = np.ma.masked_invalid(100.0 * chart.gain)
    ax.set_xscale("log")
    ax.set_yscale("log")
    filled = ax.contourf(x, y, gain, levels=levels, colors=_colours(levels), extend="both")
    thin = ax.contour(x, y, gain, levels=levels[levels != 0.0], colors=ink.GREY, linewidths=0.6)
    for label in ax.clabel(thin, fmt=lambda value: f"{value:+.0f} %", fontsize=7.5, colors=ink.INK):
        label.set_path_effects([withStroke(linewidth=2.0, foreground="white")])
        across, up = ax.transAxes.inverted().transform(ax.transData.transform(label.get_position()))
        label.set_visible(0.04 < across < 0.96 and 0.03 < up < 0.97)
    if gain.min() < 0.0 < gain.max():
        ax.contour(x, y, gain, levels=[0.0], colors=ink.INK, linewidths=2.2)
    for side, shown in (("x", x), ("y", y)):
        _ticks(ax.xaxis if side == "x" else ax.yaxis, shown)
    ax.grid(False)
    ax.set_xlabel("velocity, m/s")
    ax.set_ylabel(_ROWS[chart.rows[0]])
    regions = _regions(ax, chart, x, y)
    designs = _designs(ax, study, chart)
    _second_axis(ax, study, chart)
    if chart is study.maps[0]:
        _bar(figure, ax, filled)
    _key(ax, [*regions, *designs], 0.4 if chart is study.maps[0] else 1.0)


def _shown(chart: TripMap) -> Floats:
    name, values = chart.rows
    return 1e3 * values if name == "gap" else 100.0 * values


def _ticks(axis: Any, shown: Floats) -> None:
    """Ticks at 1, 2 and 5, or closer where the side runs over little, in plain numbers."""
    from matplotlib.ticker import FixedLocator, FuncFormatter, NullFormatter, NullLocator

    low, high = float(shown.min()), float(shown.max())
    powers = 10.0 ** np.arange(np.floor(np.log10(low)), np.ceil(np.log10(high)) + 1)
    for steps in ((1.0, 2.0, 5.0), (1.0, 1.5, 2.0, 3.0, 4.0, 5.0, 7.0)):
        places = np.outer(powers, steps).ravel()
        places = places[(places >= low * 0.999) & (places <= high * 1.001)]
        if places.size >= 4:
            break
    axis.set_major_locator(FixedLocator(list(places)))
    axis.set_major_formatter(FuncFormatter(lambda value, _: format_number(value)))
    axis.set_minor_locator(NullLocator())
    axis.set_minor_formatter(NullFormatter())


def _regions(ax: Axes, chart: TripMap, x: Floats, y: Floats) -> list[tuple[Any, str]]:
    """Hatches where a wire changes nothing or does not fit, numbered; entries for the key."""
    from matplotlib.patches import Patch

    from problems.trips import SORTS

    entries = []
    for sort, (name, hatch) in enumerate(zip(SORTS, _HATCHES, strict=True)):
        where = chart.sort == sort
        if not hatch or where.mean() < _LEAST_SHARE:
            continue
        ax.contourf(x, y, where.astype(float), levels=[0.5, 1.5], colors="none", hatches=[hatch])
        ax.contour(x, y, where.astype(float), levels=[0.5], colors=ink.GREY, linewidths=0.8)
        letter = "abc"[sort - 1]
        row, place = _inside(where)
        _tag(ax, letter, float(x[place]), float(y[row]))
        entries.append((Patch(fc="white", ec=ink.GREY, hatch=hatch, lw=0.6), f"{letter}  {name}"))
    return entries


def _inside(where: Bools) -> tuple[int, int]:
    """Row and column of the point of a region farthest from its edge."""
    from scipy.ndimage import distance_transform_edt

    padded = np.pad(where, 1)
    depth = distance_transform_edt(padded)[1:-1, 1:-1]
    row, place = np.unravel_index(int(np.argmax(depth)), where.shape)
    return int(row), int(place)


def _tag(ax: Axes, letter: str, x: float, y: float) -> None:
    box = {"boxstyle": "round,pad=0.25", "fc": "white", "ec": ink.GREY, "lw": 0.6}
    ax.text(x, y, letter, ha="center", va="center", fontsize=9, bbox=box, zorder=6)


def _designs(ax: Axes, study: TripStudy, chart: TripMap) -> list[tuple[Any, str]]:
    """The winners at equal power, numbered by reference, the one of the answer ringed."""
    from matplotlib.lines import Line2D

    name = study.wire_way or "plain"
    wired = study.wire_way is not None
    found = []
    for place in range(len(study.references)):
        design = study.winners[place, AT_POWER, name]
        at = _place(chart, design.settings, wired)
        if at is None or (wired and design.settings["trip_height"] == 0.0):
            continue
        found.append(place)
        ax.plot(
            *at,
            ls="",
            marker="o",
            ms=5.5,
            mfc="white",
            mec=ink.INK,
            mew=1.0,
            zorder=7,
            clip_on=False,
        )
        if place == study.shown:
            ax.plot(
                *at,
                ls="",
                marker="o",
                ms=10.5,
                mfc="none",
                mec=ink.INK,
                mew=1.1,
                zorder=7,
                clip_on=False,
            )
        _number(ax, str(place + 1), *at)
    if not found:
        return []
    powers = [format_value(float(f"{one[POWER]:.2g}"), "W") for one in study.references]
    told = ", ".join(f"{place + 1}: {powers[place]}" for place in found)
    sort = f"{name}, best at {told}".replace(": ", ":\N{NO-BREAK SPACE}")
    sort = sort.replace(" W", "\N{NO-BREAK SPACE}W")
    entries = [(Line2D([], [], ls="", marker="o", ms=5.5, mfc="white", mec=ink.INK), sort)]
    if study.shown in found:
        ring = Line2D([], [], ls="", marker="o", ms=10.5, mfc="none", mec=ink.INK)
        entries.append((ring, "of the answer; the map has its other sizes"))
    return entries


def _place(chart: TripMap, settings: Any, wired: bool) -> tuple[float, float] | None:
    """Where a design stands on the map; None where it has no place there."""
    if chart.rows[0] == "gap":
        x, y = settings["velocity"], 1e3 * settings["gap"]
    elif wired:
        x, y = settings["velocity"], 100.0 * settings["trip_position"] / settings["length"]
    else:
        return None
    shown, columns = _shown(chart), chart.columns[1]
    inside = columns[0] * 0.999 <= x <= columns[-1] * 1.001 and shown[0] <= y <= shown[-1]
    return (float(x), float(y)) if inside else None


def _number(ax: Axes, text: str, x: float, y: float) -> None:
    from matplotlib.patheffects import withStroke

    ax.annotate(
        text,
        (x, y),
        xytext=(8.0, -8.0),
        textcoords="offset points",
        ha="center",
        va="center",
        fontweight="bold",
        fontsize=8.0,
        path_effects=[withStroke(linewidth=2.5, foreground="white")],
        zorder=8,
    )


def _second_axis(ax: Axes, study: TripStudy, chart: TripMap) -> None:
    """Reynolds number along the top: on the gap for a map over place, else on the length."""
    won = study.winners[study.shown, AT_POWER, study.wire_way or "plain"]
    on_gap = chart.rows[0] == "trip_share" and "gap_reynolds" in won.outcomes
    name = "gap_reynolds" if on_gap else "length_reynolds"
    each = float(won.outcomes[name] / won.settings["velocity"])
    size = won.settings["gap" if on_gap else "length"]
    unit, convert = axis_unit("m", np.array([size]))
    shown = format_number(float(f"{float(convert(size)):.3g}"))
    told = f"{words('gap' if on_gap else 'length')} {shown} {unit}"

    def forth(velocity: Any) -> Any:
        return velocity * each

    def back(reynolds: Any) -> Any:
        return reynolds / each

    top = ax.secondary_xaxis("top", functions=(forth, back))
    what = "gap, 2 s u/nu" if on_gap else "plate, u L/nu"
    top.set_xlabel(f"Reynolds number of the {what} ({told})", labelpad=5.0)
    _ticks(top.xaxis, chart.columns[1] * each)


def _bar(figure: Figure, ax: Axes, filled: Any) -> None:
    """The colour bar, which holds for all maps, beside the first."""
    box = ax.get_position(original=True)
    left = (box.x0 + box.width) * ink.WIDTH_MM + 5.0
    bottom = box.y0 * ink.height_mm(figure) + 0.48 * _MAP_MM
    bar = ink.panel(figure, left, bottom, 4.0, 0.44 * _MAP_MM)
    figure.colorbar(
        filled,
        cax=bar,
        spacing="uniform",
        ticks=filled.levels,
        format=lambda value, _: f"{value:+.0f} %".replace("+0 ", "0 "),
    )
    bar.minorticks_off()
    bar.set_title("gain", fontsize=8.5, loc="left")


def _key(ax: Axes, entries: list[tuple[Any, str]], top: float) -> None:
    """What hatches and markers mean, to the right of a map."""
    if entries:
        handles, labels = zip(*entries, strict=True)
        ink.legend(ax, handles, [_folded(label) for label in labels], top)


def _folded(label: str) -> str:
    import textwrap

    return "\n".join(line for part in label.split("\n") for line in textwrap.wrap(part, 24))
