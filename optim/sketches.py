"""Side views to scale of the picked designs of a front, all at one scale, with an enlarged detail.

What stands where comes from `Problem.sketch`; this module only draws it.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from optim import ink
from optim.front import Front
from optim.picks import Pick, column, designs, leading, picked
from optim.text import words
from problems.problem import Floats, Problem, Shape, Sketch
from problems.units import format_value

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

_VIEW_MM, _VIEW_HIGH_MM = 104.0, 40.0  # room for the largest design
_DETAIL_MM, _DETAIL_HIGH_MM, _BAR_MM = 42.0, 22.0, 6.0
_LEFT_MM, _CAPTION_MM, _BELOW_MM, _FOOT_MM = 14.0, 14.0, 3.0, 10.0
_WIRE_MM = 2.5  # least diameter of a wire on paper, in the detail
_FILL = {"plate": "#4D4D4D", "wire": "#D55E00", "layer": "#CDE3F2"}
_ROUND = np.array([1.0, 2.0, 5.0])


@dataclass(frozen=True)
class _Row:
    """One design with its sketch and where its row lies, mm from the top of the sheet."""

    pick: Pick
    sketch: Sketch
    figures: str
    high: float  # of the whole, m


def sketch_picture(front: Front, problem: Problem, figure: Figure | None = None) -> Figure:
    """Side views of the picked designs: the whole at one scale, the wire enlarged beside it.

    The whole shows every repeat of the drawn passage; the detail is centred on the first wire,
    or on the leading edge, and has its own scale bar.
    """
    with ink.style():
        rows = _rows(front, problem)
        widest, highest = max(row.sketch.width for row in rows), max(row.high for row in rows)
        scale = min(_VIEW_MM / widest, _VIEW_HIGH_MM / highest)  # mm on paper per m
        heights = [max(_DETAIL_HIGH_MM + _BAR_MM, scale * row.high) for row in rows]
        below = "Side views, flow from the left, with a detail of the wire or the leading edge"
        top = ink.head_mm(problem.title, below)
        total = top + sum(heights) + (_CAPTION_MM + _BELOW_MM) * len(rows) + _FOOT_MM
        figure = figure or ink.sheet(total)
        ink.head(figure, problem.title, below)
        upper = ink.height_mm(figure) - top
        for row, height in zip(rows, heights, strict=True):
            _caption(figure, row, upper)
            bottom = upper - _CAPTION_MM - height
            view = ink.panel(figure, _LEFT_MM, bottom, _VIEW_MM, height)
            _whole(view, row, _VIEW_MM / scale, height / scale, 1.0 / scale)
            lift = bottom + 0.5 * (height - _DETAIL_HIGH_MM - _BAR_MM) + _BAR_MM
            ax = ink.panel(figure, 124.0, lift, _DETAIL_MM, _DETAIL_HIGH_MM)
            _detail(ax, row.sketch)
            upper = bottom - _BELOW_MM
        wired = any(shape.part == "wire" for row in rows for shape in row.sketch.shapes)
        _foot(figure, widest, scale, wired)
        return figure


def _rows(front: Front, problem: Problem) -> list[_Row]:
    places = designs(front, problem)
    rows = []
    for pick in picked(front, problem):
        sketch = problem.sketch(places[pick.row])
        told = [
            f"{words(aim.outcome)} "
            + format_value(
                float(column(front, problem, aim.outcome)[pick.row]),
                problem.outcome(aim.outcome).unit,
            )
            for aim in leading(problem)
        ]
        rows.append(_Row(pick, sketch, ", ".join(told), _whole_height(sketch)))
    return rows


def _whole_height(sketch: Sketch) -> float:
    low, high = _extent(sketch.shapes)
    return max(sketch.repeats * sketch.pitch, high - low)


def _extent(shapes: tuple[Shape, ...]) -> tuple[float, float]:
    """Lowest and highest point of some shapes."""
    heights = np.concatenate([shape.corners[:, 1] for shape in shapes])
    return float(heights.min()), float(heights.max())


def _caption(figure: Figure, row: _Row, upper: float) -> None:
    tall = ink.height_mm(figure)
    left = 4.0 / ink.WIDTH_MM
    title = f"{row.pick.letter}   {row.pick.label}:  {row.figures}"
    figure.text(left, (upper - 1.5) / tall, title, va="top", fontweight="bold")
    figure.text(left, (upper - 5.9) / tall, row.sketch.caption, va="top", color=ink.GREY)


def _bare(ax: Axes) -> None:
    ax.set_aspect("equal", adjustable="box")
    ax.grid(False)
    ax.set(xticks=[], yticks=[])
    for spine in ax.spines.values():
        spine.set_visible(False)


def _fill(ax: Axes, outlines: Floats | list[Floats], part: str, edge: float) -> None:
    from matplotlib.collections import PolyCollection

    ax.add_collection(
        PolyCollection(
            list(outlines),
            facecolors=_FILL[part],
            edgecolors=ink.INK,
            linewidths=edge,
            zorder=2,
            snap=False,
        ),
        autolim=False,
    )


def _whole(ax: Axes, row: _Row, wide: float, tall: float, mm: float) -> None:
    """All plates of one design, with an arrow for the flow and the place of the wire.

    The view is `wide` by `tall` m; `mm` is what stands for 1 mm of paper.
    """
    _bare(ax)
    sketch = row.sketch
    plates = [shape.corners for shape in sketch.shapes if shape.part == "plate"]
    base = min(plates, key=lambda corners: float(corners[:, 1].min()))
    levels = np.arange(max(round(sketch.repeats), 1)) * sketch.pitch
    stacked = base[None, :, :] + np.stack([np.zeros_like(levels), levels], axis=1)[:, None, :]
    _fill(ax, stacked, "plate", 0.3 if not sketch.pitch or sketch.pitch > 0.6 * mm else 0.0)
    middle = 0.5 * (float(stacked[..., 1].min()) + float(stacked[..., 1].max()))
    ax.set_xlim(0.0, wide)
    ax.set_ylim(middle - 0.5 * tall, middle + 0.5 * tall)
    ax.annotate(
        "",
        xy=(-1.5 * mm, middle),
        xytext=(-9.0 * mm, middle),
        arrowprops={"arrowstyle": "-|>", "color": ink.INK, "lw": 1.1},
        annotation_clip=False,
    )
    wires = [shape.corners for shape in sketch.shapes if shape.part == "wire"]
    if wires:
        place = float(wires[0][:, 0].mean())
        ax.plot(
            [place],
            [float(stacked[..., 1].max()) + 1.6 * mm],
            marker="v",
            ms=5.0,
            color=_FILL["wire"],
            mec=ink.INK,
            mew=0.5,
            clip_on=False,
        )


def _detail(ax: Axes, sketch: Sketch) -> None:
    """The surroundings of the first wire, or of the leading edge, enlarged, with a scale bar."""
    _bare(ax)
    for spine in ax.spines.values():
        spine.set(visible=True, color=ink.PALE)
    for part in ("layer", "plate", "wire"):
        chosen = [shape.corners for shape in sketch.shapes if shape.part == part]
        if chosen:
            _fill(ax, chosen, part, 0.6)
    low, high = _extent(sketch.shapes)
    wires = [shape.corners for shape in sketch.shapes if shape.part == "wire"]
    diameter = float(np.ptp(wires[0][:, 1])) if wires else 0.0
    room = max(high - low, 1e-6) * 1.25
    tall = min(room, _DETAIL_HIGH_MM / _WIRE_MM * diameter) if wires else room
    wide = tall * _DETAIL_MM / _DETAIL_HIGH_MM
    seat = wires[0].mean(axis=0) if wires else np.array([0.3 * wide, 0.0])
    centre = 0.5 * (low + high) if tall >= room else float(seat[1]) + 0.18 * tall
    ax.set_xlim(float(seat[0]) - 0.5 * wide, float(seat[0]) + 0.5 * wide)
    ax.set_ylim(centre - 0.5 * tall, centre + 0.5 * tall)
    _bar(ax, wide, tall)


def _bar(ax: Axes, wide: float, tall: float) -> None:
    """A scale bar of a round length below the detail, at its right."""
    size, mm = _rounded(0.3 * wide), tall / _DETAIL_HIGH_MM
    left, level = ax.get_xlim()[1] - 0.36 * wide, ax.get_ylim()[0] - 2.8 * mm
    ax.plot(
        [left - size, left],
        [level, level],
        color=ink.INK,
        lw=2.0,
        solid_capstyle="butt",
        clip_on=False,
    )
    ax.text(left + 1.5 * mm, level, format_value(size, "m"), va="center", fontsize=8.5)


def _rounded(size: float) -> float:
    """The largest of 1, 2, 5 times a power of ten that is at most `size`."""
    power = 10.0 ** np.floor(np.log10(size))
    return float((_ROUND[size >= 0.999 * _ROUND * power] * power).max())


def _foot(figure: Figure, widest: float, scale: float, wired: bool) -> None:
    """Scale bar of the whole views and the meaning of the marks."""
    ax = ink.panel(figure, _LEFT_MM, 2.0, ink.WIDTH_MM - _LEFT_MM - 4.0, 7.0)
    ax.set_axis_off()
    ax.set(xlim=(0.0, ink.WIDTH_MM - _LEFT_MM - 4.0), ylim=(0.0, 7.0))
    size = _rounded(0.3 * widest)
    ax.plot([0.0, size * scale], [4.0, 4.0], color=ink.INK, lw=2.0, solid_capstyle="butt")
    ax.text(size * scale + 2.0, 4.0, f"{format_value(size, 'm')}, all alike", va="center")
    if wired:
        ax.plot([74.0], [4.0], marker="v", ms=5.0, color=_FILL["wire"], mec=ink.INK, mew=0.5)
        ax.text(76.5, 4.0, "place of the wire", va="center")
    ax.text(110.0, 4.0, "enlarged, own bar each", va="center")
