"""How every picture looks: sheet, palette, markers, axes with units, titles, files.

What is drawn is decided in `plots`, `profiles` and `sketches`; matplotlib is imported when needed.
"""

from __future__ import annotations

import textwrap
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
from numpy.typing import NDArray

from optim.files import written_whole
from problems.problem import Floats
from problems.units import axis_unit, format_number

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

WIDTH_MM, DPI = 170.0, 200
LOG_SPAN = 30.0  # an axis that runs over more than this factor is logarithmic
INK, GREY, PALE = "#000000", "#595959", "#BFBFBF"
# Okabe and Ito 2008, from memory: told apart with every common sort of colour blindness
PALETTE = ("#0072B2", "#D55E00", "#009E73", "#CC79A7", "#E69F00", "#56B4E9", "#F0E442")
RAMP = "cividis"
_MARKERS = {"plain": "o", "tripped": "^", "idle wire": "D"}
_SPARE_MARKERS = ("s", "v", "P", "X", "<", ">")

_STYLE: dict[Any, Any] = {
    "font.family": "sans-serif",
    "font.size": 9.0,
    "axes.titlesize": 9.0,
    "axes.labelsize": 9.0,
    "xtick.labelsize": 8.5,
    "ytick.labelsize": 8.5,
    "legend.fontsize": 8.5,
    "legend.frameon": False,
    "axes.spines.top": False,
    "axes.spines.right": False,
    "axes.linewidth": 0.7,
    "axes.grid": True,
    "axes.axisbelow": True,
    "grid.color": "#E3E3E3",
    "grid.linewidth": 0.6,
    "lines.linewidth": 1.4,
    "hatch.linewidth": 0.5,
    "hatch.color": "#CACACA",
}


@contextmanager
def style() -> Iterator[None]:
    """Draw within this context: sizes and lines of all our pictures, whatever the user's own."""
    import matplotlib as mpl

    with mpl.rc_context():
        mpl.rcdefaults()
        mpl.rcParams.update(_STYLE)
        yield


def sheet(height_mm: float) -> Figure:
    """An empty sheet as wide as the text of an A4 page."""
    from matplotlib.figure import Figure

    return Figure(figsize=(WIDTH_MM / 25.4, height_mm / 25.4), dpi=DPI)


def panel(figure: Figure, left: float, bottom: float, width: float, height: float) -> Axes:
    """Axes at a place given in mm from the lower left corner of the sheet."""
    wide, tall = (25.4 * inches for inches in figure.get_size_inches())
    return figure.add_axes((left / wide, bottom / tall, width / wide, height / tall))


def height_mm(figure: Figure) -> float:
    """Height of a sheet in mm."""
    return 25.4 * float(figure.get_size_inches()[1])


def head(figure: Figure, title: str, below: str = "") -> None:
    """The title of a sheet, at most two lines, and one quieter line below it."""
    tall = height_mm(figure)
    lines = textwrap.wrap(title, 84, max_lines=2, placeholder=" ...") or [""]
    top = 1.0 - 3.0 / tall
    figure.text(4.0 / WIDTH_MM, top, "\n".join(lines), va="top", fontsize=10, fontweight="bold")
    second = top - (4.6 * len(lines) + 0.6) / tall
    quiet = "\n".join(textwrap.wrap(below, 104, max_lines=2, placeholder=" ..."))
    figure.text(4.0 / WIDTH_MM, second, quiet, va="top", color=GREY, fontsize=8.5)


def head_mm(title: str, below: str = "") -> float:
    """Room that `head` needs at the top of a sheet, in mm."""
    lines = len(textwrap.wrap(title, 84, max_lines=2)) or 1
    return 3.0 + 4.6 * lines + 4.2 * len(textwrap.wrap(below, 104, max_lines=2)) + 2.0


def markers(groups: NDArray[np.str_]) -> dict[str, tuple[str, str]]:
    """Marker shape and colour of each sort of design, the commonest first.

    The same in every picture of a run; drawn in this order, the rare ones are not hidden.
    """
    names, counts = np.unique(groups, return_counts=True)
    spare, colours = iter(_SPARE_MARKERS * 5), iter(PALETTE * 5)
    found = {str(name): (_MARKERS.get(name) or next(spare), next(colours)) for name in names}
    order = np.argsort(-counts, kind="stable")
    return {str(name): found[str(name)] for name in names[order]}


def legend(
    ax: Axes, handles: Sequence[Any], labels: Sequence[str], top: float, title: str = ""
) -> float:
    """A legend beside `ax`, its upper edge at `top` (share of the height of `ax`).

    Returns where the next one may begin.
    """
    from matplotlib.legend import Legend

    ax.add_artist(
        Legend(
            ax,
            list(handles),
            list(labels),
            loc="upper left",
            bbox_to_anchor=(1.03, top),
            title=title or None,
            alignment="left",
            borderaxespad=0.0,
            handletextpad=0.6,
            labelspacing=0.5,
        )
    )
    tall = height_mm(ax.figure) * ax.get_position(original=True).height  # type: ignore[arg-type]
    lines = len(handles) + (1 + title.count("\n") if title else 0)
    return top - (4.9 * lines + 4.0) / tall


def runs_over_decades(values: Floats) -> bool:
    """Whether values are all above 0 and span more than a factor `LOG_SPAN`."""
    known = values[np.isfinite(values)]
    return bool(known.size and known.min() > 0.0 and known.max() > LOG_SPAN * known.min())


def measure(
    ax: Axes,
    side: Literal["x", "y"],
    name: str,
    unit: str,
    values: Floats,
    note: str = "",
    wrap: int = 0,
) -> Callable[[Any], NDArray[np.float64]]:
    """Label and scale one side of `ax` for `values` (any shape, SI).

    `note` stands behind the unit in brackets; `wrap` is the length of a line of the label.
    Returns what takes SI values to the numbers on the axis.
    """
    label, convert = axis_unit(unit, values)
    shown = convert(values)
    axis = ax.xaxis if side == "x" else ax.yaxis
    unbroken = label.replace(" ", "\N{NO-BREAK SPACE}")
    text = f"{name}, {unbroken}" if label else name
    text = f"{text} ({note})" if note else text
    axis.set_label_text("\n".join(textwrap.wrap(text, wrap)) if wrap else text)
    if runs_over_decades(shown):
        (ax.set_xscale if side == "x" else ax.set_yscale)("log")
        _ticks_by_ratio(axis, shown)
    else:
        _ticks_by_step(axis)
    return convert


def _ticks_by_step(axis: Any) -> None:
    from matplotlib.ticker import MaxNLocator, ScalarFormatter

    plain = ScalarFormatter(useOffset=False)
    plain.set_powerlimits((-4, 6))
    axis.set_major_locator(MaxNLocator(nbins=6, steps=[1, 2, 2.5, 5, 10]))
    axis.set_major_formatter(plain)


def _ticks_by_ratio(axis: Any, shown: Floats) -> None:
    """Ticks at 1, 2 and 5 over two decades and a half, at 1 beyond that, in plain numbers."""
    from matplotlib.ticker import FixedLocator, FuncFormatter, NullFormatter

    low, high = np.floor(np.log10(shown.min())) - 1, np.ceil(np.log10(shown.max())) + 1
    powers = 10.0 ** np.arange(low, high + 1)
    few = np.log10(shown.max() / shown.min()) <= 2.5
    steps = np.array([1.0, 2.0, 5.0]) if few else np.array([1.0])
    axis.set_major_locator(FixedLocator(list(np.outer(powers, steps).ravel())))
    axis.set_minor_locator(FixedLocator(list(np.outer(powers, np.arange(2, 10)).ravel())))
    axis.set_major_formatter(FuncFormatter(lambda value, _: format_number(value)))
    axis.set_minor_formatter(NullFormatter())


def margins(
    ax: Axes,
    side: Literal["x", "y"],
    shown: Floats,
    share: float = 0.06,
    from_zero: bool = False,
) -> None:
    """Limits of one side of `ax` around the numbers on it, with `share` of their span to spare.

    `from_zero` lets a linear side that begins near 0 begin at 0.
    """
    scale = ax.get_xscale() if side == "x" else ax.get_yscale()
    low, high = float(np.min(shown)), float(np.max(shown))
    if scale == "log":
        room = (high / low) ** share
        ends = (low / room, high * room)
    else:
        room = share * (high - low) or 0.05 * abs(high) or 1.0
        ends = (0.0 if from_zero and 0.0 <= low < 0.4 * high else low - room, high + room)
    (ax.set_xlim if side == "x" else ax.set_ylim)(ends)


def save(figure: Figure, path: Path, title: str) -> Path:
    """Write a picture as PNG, whole or not at all."""
    facts = {"Software": None, "Title": title}
    with style(), written_whole(path, "wb") as stream:
        figure.savefig(
            stream, format="png", dpi=DPI, metadata=facts, pil_kwargs={"compress_level": 4}
        )
    return path
