"""The model of transition against measured plates: a picture and a table for contributors.

python -m tests.benchmarks.measured_transition [PICTURE]
"""

from __future__ import annotations

import sys
from dataclasses import dataclass

import numpy as np

from problems.convection import flat_plate, transition
from problems.convection.sweep import Surface, sweep
from problems.problem import Floats
from tests.published_data import published


@dataclass(frozen=True)
class Plate:
    """A measured plate: its file, name, onset read off the data [Re_x], turbulence to use [%]."""

    file: str
    name: str
    onset: float
    turbulence: float
    average: float


PLATES = (
    # onset: the last station before cf leaves the laminar fall; average from the edge to it
    Plate("ercoftac_T3A", "T3A, 3 % at the edge", 1.348e5, 2.0, 2.46),
    Plate("ercoftac_T3AM", "T3A-, 0.9 % at the edge", 1.6e6, 0.5, 0.62),
)


def local_friction(natural: float, turbulence: float, re_x: Floats) -> Floats:
    """cf at re_x: derivative of the model's friction summed from the edge."""
    step = 1e-4
    ends = np.concatenate([re_x * (1.0 - step), re_x * (1.0 + step)])
    surface = Surface(ends, np.full_like(ends, 0.7), natural, turbulence)
    below, above = np.split(sweep(surface).friction * ends, 2)
    return np.asarray((above - below) / (2.0 * step * re_x))


def rms(model: Floats, measured: Floats) -> float:
    """Root-mean-square of the relative deviation."""
    return float(np.sqrt(np.mean((model / measured - 1.0) ** 2)))


def wieghardt() -> tuple[Floats, Floats, Floats]:
    """Re_x, measured and modelled cf of the tripped plate, grown from its first sound station."""
    data = published("wieghardt_flatplate_ident1400").query("x_m > 0.6")
    re_x, cf = data["Re_x"].to_numpy(), data["cf"].to_numpy()
    start = np.full_like(re_x, data["Re_theta"].iloc[0])
    grown = flat_plate.turbulent_growth(start, re_x - re_x[0])
    return re_x, cf, flat_plate.turbulent_friction(grown)


def table() -> list[tuple[str, str, float]]:
    """Deviations: what, with which onset, root-mean-square."""
    rows = []
    for plate in PLATES:
        data = published(plate.file)
        re_x, cf = data["Re_x"].to_numpy(), data["cf"].to_numpy()
        law = float(transition.onset_re_x(np.array([plate.average]))[0])
        for words, natural in (("as measured", plate.onset), ("by the law", law)):
            model = local_friction(natural, plate.turbulence, re_x)
            rows.append((f"{plate.name}: cf", f"onset {words}, Re_x {natural:.3g}", rms(model, cf)))
    _, cf, model = wieghardt()
    rows.append(
        ("Wieghardt, tripped: cf from 0.64 m on", "grown from Re_theta 2864", rms(model, cf))
    )
    return rows


def draw(path: str) -> None:
    """Save the picture."""
    from matplotlib.figure import Figure

    figure = Figure(figsize=(6.7, 7.4), layout="constrained")
    axes = figure.subplots(3, 1)
    for ax, plate in zip(axes, PLATES, strict=False):
        data = published(plate.file)
        measured = data["Re_x"].to_numpy()
        re_x = np.geomspace(0.9 * measured[0], 1.1 * measured[-1], 300)
        law = float(transition.onset_re_x(np.array([plate.average]))[0])
        ax.plot(measured, 1e3 * data["cf"], "ko", mfc="none", label="measured")
        model = local_friction(plate.onset, plate.turbulence, re_x)
        ax.plot(re_x, 1e3 * model, "-", color="#0072B2", label="model, onset as measured")
        model = local_friction(law, plate.turbulence, re_x)
        words = f"model, onset by the law at {plate.average:.2g} %"
        ax.plot(re_x, 1e3 * model, "--", color="#D55E00", label=words)
        ax.plot(re_x, 1e3 * flat_plate.laminar_friction(re_x), ":", color="0.4", label="laminar")
        ax.set_title(plate.name, loc="left", fontsize=10)
    re_x, cf, model = wieghardt()
    axes[2].plot(re_x, 1e3 * cf, "ko", mfc="none", label="measured")
    axes[2].plot(re_x, 1e3 * model, "-", color="#0072B2", label="model, from the first station on")
    axes[2].set_title("Wieghardt's plate, tripped, Re_x to 1.1e7", loc="left", fontsize=10)
    for ax in axes:
        ax.set(xlabel="Re_x", ylabel="1000 cf", ylim=(0.0, None))
        ax.legend(frameon=False, fontsize=8)
        ax.grid(alpha=0.3)
    axes[2].set_ylim(2.0, 3.6)
    figure.savefig(path, dpi=150)


if __name__ == "__main__":
    for what, how, deviation in table():
        print(f"{what:42s} {how:36s} {deviation:6.1%}")
    if len(sys.argv) > 1:
        draw(sys.argv[1])
