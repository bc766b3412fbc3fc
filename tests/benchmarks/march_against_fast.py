"""How far the fast model can be trusted: its means against the marched equations, by regime.

Quasi-random designs over the whole envelope; prints a table and, if asked, saves a map.

    python -m tests.benchmarks.march_against_fast [PICTURE]
"""

from __future__ import annotations

import sys
from dataclasses import dataclass

import numpy as np
import pandas as pd
from scipy.stats import qmc

from problems.convection import transition
from problems.convection.march_surface import march_surface
from problems.convection.sweep import Surface, Sweep, sweep
from problems.problem import Floats

RE_D, LENGTHS, PR = (200.0, 1e5), (0.5, 200.0), (0.7, 100.0)
PLATE = (1e4, 1e7)  # Re_L of single plates
TURBULENCE = (1.0, 4.0)
WIRE = (300.0, 1500.0)  # U k/nu
TALL = 0.02  # most of a wire's diameter over the length of the plate
BLOCKED = 0.4  # share of the gap that wires may take; the fast model cautions from 0.5
QUANTITIES = ("heat", "friction", "drop")
REGIMES = (
    "laminar",
    "laminar, with a wire",
    "band, Re_D 2300 to 4000",
    "natural transition",
    "tripped",
    "wire, not tripping",
    "long, mostly turbulent",
)


@dataclass(frozen=True)
class Batch:
    """Designs that share what a `Surface` holds once."""

    surface: Surface
    name: str


def batches(count: int, seed: int = 1) -> list[Batch]:
    """Batches of `count` designs: gaps and plates, two streams, with and without a wire."""
    found = []
    for number, turbulence in enumerate(TURBULENCE):
        for wired in (False, True):
            for flux in (False, True):
                unit = qmc.Sobol(5, seed=seed + 10 * number + 2 * wired + flux).random(count)
                for gap in (True, False):
                    found.append(_batch(unit, turbulence, wired, flux, gap))
    return found


def _batch(unit: Floats, turbulence: float, wired: bool, flux: bool, gap: bool) -> Batch:
    def between(column: int, ends: tuple[float, float]) -> Floats:
        return ends[0] * (ends[1] / ends[0]) ** unit[:, column]

    re_d = between(0, RE_D) if gap else None
    re_l = between(1, PLATE) if re_d is None else re_d * between(1, LENGTHS)
    wire_k = np.minimum(between(4, WIRE), TALL * re_l)
    if re_d is not None:
        wire_k = np.minimum(wire_k, 0.25 * BLOCKED * re_d)
    surface = Surface(
        re_l=re_l,
        pr=between(2, PR),
        natural=float(transition.onset_re_x(np.array([turbulence]))[0]),
        turbulence=turbulence,
        re_d=re_d,
        wire_x=re_l * between(3, (1e-3, 1.0)) if wired else None,
        wire_k=wire_k if wired else None,
        flux=flux,
    )
    return Batch(surface, "gap" if gap else "plate")


def pressure_drop(surface: Surface, swept: Sweep) -> Floats:
    """Pressure drop inside the gap by the fast model, in rho U^2/2."""
    if surface.re_d is None:
        return np.full_like(surface.re_l, np.nan)
    shear = swept.friction + swept.wire_friction
    return 4.0 * shear * surface.re_l / surface.re_d + 2.0 * (swept.momentum_factor - 1.0)


def compared(batch: Batch) -> pd.DataFrame:
    """Fast over marched less one, for every design of a batch, with its place and regime."""
    surface, swept = batch.surface, sweep(batch.surface)
    marched = march_surface(surface, swept)
    if not marched.converged.all():
        raise ArithmeticError("a design did not converge")
    whole = np.nan if surface.re_d is None else pressure_drop(surface, swept) / marched.drop[:, -1]
    frame = pd.DataFrame(
        {
            "sort": batch.name,
            "re_d": np.nan if surface.re_d is None else surface.re_d,
            "re_l": surface.re_l,
            "pr": surface.pr,
            "flux": surface.flux,
            "turbulence": surface.turbulence,
            "wire_x": np.nan if surface.wire_x is None else surface.wire_x,
            "wire_k": np.nan if surface.wire_k is None else surface.wire_k,
            "onset": swept.onset.re_x,
            "forced": swept.onset.forced,
            "sustains": swept.sustains,
            "turbulent_share": swept.turbulent_share,
            "heat": swept.stanton / marched.stanton - 1.0,
            "friction": swept.friction / marched.friction - 1.0,
            "drop": whole - 1.0,
            "outlet_cf": marched.cf[:, -1],
        }
    )
    frame["regime"] = regimes(frame)
    return frame


def regimes(frame: pd.DataFrame) -> list[str]:
    """The regime of every design."""
    turned = frame["turbulent_share"] > 0.0
    plain = frame["wire_x"].isna()
    conditions = [
        ~turned & plain,
        ~turned,
        frame["sustains"] < 1.0,
        (frame["re_l"] / frame["re_d"] > 30.0) & (frame["turbulent_share"] > 0.5),
        frame["forced"] > 0.5,
        plain | (frame["wire_x"] > frame["onset"]),
    ]
    names = [REGIMES[k] for k in (0, 1, 2, 6, 4, 3)]
    return list(np.select(conditions, names, default=REGIMES[5]))


def table(frame: pd.DataFrame) -> pd.DataFrame:
    """Median, 95th percentile and worst of the deviation's size, by sort and regime, in percent."""
    rows = {}
    groups = [*frame.groupby(["sort", "regime"]), (("gap", "all"), frame[frame["sort"] == "gap"])]
    for (sort, regime), part in [*groups, (("plate", "all"), frame[frame["sort"] == "plate"])]:
        row: dict[tuple[str, str], float] = {("", "designs"): len(part)}
        for name in QUANTITIES:
            size = 100.0 * part[name].abs().dropna()
            if size.empty:
                continue
            row[name, "median"] = size.median()
            row[name, "95 %"] = size.quantile(0.95)
            row[name, "worst"] = size.max()
            row[name, "mean +-"] = 100.0 * part[name].mean()
        rows[sort, regime] = row
    return pd.DataFrame.from_dict(rows, orient="index")


def draw(frame: pd.DataFrame, path: str) -> None:
    """Save the map: deviation of heat, friction and pressure drop over Re_D and length."""
    from matplotlib.figure import Figure

    gaps = frame[frame["sort"] == "gap"]
    figure = Figure(figsize=(7.0, 7.6), layout="constrained")
    words = {"heat": "mean Stanton number", "friction": "mean wall shear", "drop": "pressure drop"}
    for ax, (name, title) in zip(figure.subplots(3, 1, sharex=True), words.items(), strict=True):
        size = 100.0 * gaps[name]
        for marker, part in (("^", gaps[size >= 0.0]), ("v", gaps[size < 0.0])):
            dots = ax.scatter(
                part["re_d"],
                part["re_l"] / part["re_d"],
                c=100.0 * np.clip(part[name], -0.15, 0.15),
                s=8.0 + 300.0 * np.minimum(part[name].abs(), 0.2),
                marker=marker,
                cmap="PuOr",
                vmin=-15.0,
                vmax=15.0,
                edgecolors="0.3",
                linewidths=0.3,
            )
        ax.set(xscale="log", yscale="log", ylabel="length over D_h")
        ax.set_title(f"{title}: fast model less march", loc="left", fontsize=10)
        ax.axvspan(2300.0, 4000.0, color="0.9", zorder=0)
        figure.colorbar(dots, ax=ax, label="%; point up: fast is more", extend="both")
    ax.set_xlabel("Reynolds number on hydraulic diameter (grey: 2300 to 4000)")
    figure.savefig(path, dpi=150)


def main() -> None:
    """Print the table; save the map and, beside it, the designs."""
    frame = pd.concat([compared(batch) for batch in batches(64)], ignore_index=True)
    with pd.option_context("display.width", 220, "display.max_columns", 30):
        print(table(frame).round(1).to_string())
    if len(sys.argv) > 1:
        draw(frame, sys.argv[1])
        frame.to_csv(sys.argv[1] + ".csv", index=False)


if __name__ == "__main__":
    main()
