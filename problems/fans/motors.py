"""What motor and drive lose between the mains and the fan's shaft.

One smooth curve of efficiency over shaft power, from a data file that a user may replace; what the
fan itself loses is in its own curve.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache
from importlib.resources import files
from pathlib import Path

import numpy as np

from problems.fans.sheet import Column, Sheet, read_sheet
from problems.problem import Floats

_NODES = 512  # of the table that is read; fine enough that its corners are below 1e-5

COLUMNS = (
    Column("shaft power", "W", "a shaft power above 0", lambda x: x > 0.0),
    Column("motor efficiency", "1", "above 0 and below 1 (below 100 %)", lambda x: 0.0 < x < 1.0),
)

# converter losses of a few percent; a fan on the motor's own shaft loses nothing: common practice
DRIVE_EFFICIENCY = {"variable speed": 0.97, "fixed speed": 1.0}


@dataclass(frozen=True)
class Motor:
    """Efficiency over the logarithm of the shaft power [W]; level outside the points given."""

    log_power: Floats
    efficiency: Floats

    def __call__(self, shaft_power: Floats) -> Floats:
        """Efficiency [-] of the motor at `shaft_power` [W], above 0, any shape."""
        return np.interp(np.log(shaft_power), self.log_power, self.efficiency)

    @staticmethod
    def constant(efficiency: float) -> Motor:
        """The same efficiency at every power."""
        return Motor(np.zeros(1), np.array([efficiency]))


def read_motor(path: str | Path) -> Motor:
    """The motor of a CSV file with the columns `shaft power` and `motor efficiency`.

    Raises CaseError with one line for every fault.
    """
    return _motor(read_sheet(path, COLUMNS))


@cache
def ordinary_motor() -> Motor:
    """The motor assumed where nothing is said: four poles, mains frequency, premium class.

    Figures of class IE3 of IEC 60034-30-1, four poles, 50 Hz (from memory), taken at the power that
    the shaft takes; a motor run far below its rating is worse.
    """
    with (files("problems.cases") / "ordinary-motors.csv").open(encoding="utf-8") as text:
        return _motor(read_sheet("ordinary-motors.csv", COLUMNS, text.read()))


def _motor(sheet: Sheet) -> Motor:
    from scipy.interpolate import PchipInterpolator

    names = [column.name for column in COLUMNS]
    if sheet.has(names):
        sheet.full(names)
    power, efficiency = (sheet.numbers(column.name) for column in COLUMNS)
    sheet.rising("shaft power", "")
    if len(sheet.rows) < 2:
        sheet.fault(f"{len(sheet.rows)} points -- at least 2")
    sheet.finish()
    nodes = np.linspace(np.log(power[0]), np.log(power[-1]), _NODES)
    return Motor(nodes, PchipInterpolator(np.log(power), efficiency)(nodes))
