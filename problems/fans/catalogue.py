"""Fans as an engineer types them in from data sheets: one row for each tested point.

A file or a folder of files to a checked `Catalogue` in SI; every fault names file, row, column,
value and what is allowed. What can be done with the fans is for `choice`.
"""

from __future__ import annotations

import difflib
import math
from collections.abc import Sequence
from dataclasses import dataclass
from importlib.resources import files
from pathlib import Path

from problems import CaseError
from problems.fans.curves import Fan, peak_of
from problems.fans.sheet import Column, Row, Sheet, read_sheet

LEAST_POINTS = 4
# where a data sheet gives no limits: never above the tested speed, and not below 30 % of it, where
# the affinity laws and the motor's cooling get doubtful (common practice)
LOWEST_SHARE = 0.3

_POWERS = ("shaft power", "electrical power", "efficiency", "static efficiency", "total efficiency")
_PRESSURES = ("static pressure", "total pressure")
_SHARE = "above 0 and below 1 (below 100 %)"


def _above(what: str) -> str:
    return f"a {what} above 0"


def _positive(value: float) -> bool:
    return value > 0.0


def _not_negative(value: float) -> bool:
    return value >= 0.0


def _is_share(value: float) -> bool:
    return 0.0 < value < 1.0


# columns that say the same of every point of one fan
OF_FAN = (
    Column("sort", "", "a word such as axial or centrifugal"),
    Column("size", "m", _above("size"), _positive),
    Column("speed", "1/s", _above("speed"), _positive),
    Column(
        "density", "kg/m3", "air density of the curve, 0.1 to 10 kg/m3", lambda x: 0.1 <= x <= 10
    ),
    Column("lowest speed", "1/s", _above("speed"), _positive),
    Column("highest speed", "1/s", _above("speed"), _positive),
    Column("outlet area", "m2", _above("area"), _positive),
    Column("price", "money", "a price of 0 or more", _not_negative),
)
OF_POINT = (
    Column("flow", "m3/s", "a volume flow of 0 or more", _not_negative),
    Column("static pressure", "Pa", "a pressure of 0 or more", _not_negative),
    Column("total pressure", "Pa", "a pressure of 0 or more", _not_negative),
    Column("shaft power", "W", _above("power"), _positive),
    Column("electrical power", "W", _above("power"), _positive),
    Column("efficiency", "1", _SHARE, _is_share),
    Column("static efficiency", "1", _SHARE, _is_share),
    Column("total efficiency", "1", _SHARE, _is_share),
)
COLUMNS = (Column("fan", "", "the name of the fan"), *OF_FAN, *OF_POINT)


@dataclass(frozen=True)
class Catalogue:
    """Checked fans, in the order of the files, and the currency of their prices if one is given."""

    name: str
    fans: tuple[Fan, ...]
    currency: str = ""

    def __len__(self) -> int:
        return len(self.fans)

    @property
    def unpriced(self) -> tuple[str, ...]:
        """Names of the fans without a price."""
        return tuple(fan.name for fan in self.fans if fan.price is None)

    @property
    def prices(self) -> tuple[float, ...]:
        """Price of each fan; 0 where none is given, see `unpriced`."""
        return tuple(fan.price or 0.0 for fan in self.fans)

    def place(self, name: str) -> int:
        """The place of the fan called `name`. Raises CaseError naming the nearest."""
        names = [fan.name for fan in self.fans]
        if name not in names:
            near = difflib.get_close_matches(name, names, n=1) or names
            raise CaseError(f"fan {name}: unknown; the nearest: {', '.join(near)}")
        return names.index(name)


def ready_made_catalogues() -> list[str]:
    """Names of the invented catalogues that come with the program."""
    found = (entry.name for entry in files("problems.cases").iterdir())
    return sorted(name.removesuffix(".csv") for name in found if name.endswith("-fans.csv"))


def read_catalogue(name_or_path: str | Path, beside: str | Path = ".") -> Catalogue:
    """The catalogue of a ready-made name, a CSV file or a folder of CSV files.

    A path that is not absolute is looked for in the folder `beside` (that of the case file).

    Raises CaseError with one line for every fault.
    """
    name = str(name_or_path)
    if name.removesuffix(".csv") in ready_made_catalogues():
        file = f"{name.removesuffix('.csv')}.csv"
        text = (files("problems.cases") / file).read_text(encoding="utf-8")
        return _catalogue(Path(file).stem, [read_sheet(file, COLUMNS, text)])
    path = Path(beside) / name
    if not path.exists():
        ready = ", ".join(ready_made_catalogues())
        raise CaseError(f"{path}: no such file or folder of fans; ready-made: {ready}")
    paths = sorted(path.glob("*.csv")) if path.is_dir() else [path]
    if not paths:
        raise CaseError(f"{path}: a folder without CSV files of fans")
    return _catalogue(path.stem, [read_sheet(one, COLUMNS) for one in paths])


def _catalogue(name: str, sheets: Sequence[Sheet]) -> Catalogue:
    """The fans of all sheets together. Raises CaseError with the faults of all of them."""
    fans = [fan for sheet in sheets for fan in _fans(sheet)]
    _one_of_each_name(sheets)
    currencies = {sheet.units["price"] for sheet in sheets if sheet.units.get("price")}
    if len(currencies) > 1:
        sheets[-1].fault(f"prices in {' and '.join(sorted(currencies))} -- one currency")
    messages = [sheet.message() for sheet in sheets if sheet.faults]
    if messages:
        raise CaseError("\n".join(messages))
    return Catalogue(name, tuple(fan for fan in fans if fan), "".join(currencies))


def _one_of_each_name(sheets: Sequence[Sheet]) -> None:
    seen: dict[str, str] = {}
    for sheet in sheets:
        for fan in dict.fromkeys(row.text("fan") for row in sheet.rows):
            if fan and seen.setdefault(fan, sheet.where) != sheet.where:
                sheet.fault(f"fan {fan}: is in {seen[fan]} too -- one file for each fan")


def _fans(sheet: Sheet) -> list[Fan | None]:
    """Every fan of a sheet, faults noted; None for a fan that cannot be used."""
    there = sheet.has(("fan", "speed", "density", "flow"))
    pressure, power = _one_of(sheet, _PRESSURES), _one_of(sheet, _POWERS)
    if not there or not pressure or not power:
        return []
    sheet.full(("fan", "flow", pressure, power))
    groups: dict[str, list[Row]] = {}
    for row in sheet.rows:
        if row.text("fan"):
            groups.setdefault(row.text("fan"), []).append(row)
    return [_fan(sheet, name, rows, pressure, power) for name, rows in groups.items()]


def _one_of(sheet: Sheet, names: Sequence[str]) -> str | None:
    """The one column of `names` that the sheet has; None and a fault for none or several."""
    found = [name for name in names if name in sheet.headers]
    if len(found) == 1:
        return found[0]
    given = " and ".join(f'"{sheet.headers[name]}"' for name in found) or "missing"
    sheet.fault(f"column of {names[0].split()[-1]}: {given} -- exactly one of: {', '.join(names)}")
    return None


def _fan(sheet: Sheet, name: str, rows: list[Row], pressure: str, power: str) -> Fan | None:
    """One fan from its rows; None where any of them has a fault."""
    said, lines = f" of fan {name}", {row.line for row in rows}

    def faulty() -> bool:
        return any(line in lines for line, _ in sheet.faults)

    facts = {column.name: _same(sheet, column.name, rows) for column in OF_FAN}
    for needed in ("speed", "density"):
        if not any(row.written.get(needed) for row in rows):
            sheet.wrong(rows[0], needed, "a value in the first row of each fan at least")
    if len(rows) < LEAST_POINTS:
        sheet.fault(f"fan {name}: {len(rows)} points -- at least {LEAST_POINTS}", rows[0].line)
    sheet.rising("flow", said, rows)
    speeds = _speeds(sheet, rows, facts)
    if faulty():
        return None
    area, density = facts["outlet area"], facts["density"] or 0.0
    needs_area = pressure == "total pressure" or power == f"{_other(pressure)} efficiency"
    if needs_area and area is None:
        says = "the fan's outlet area, without which static and total pressure cannot be told apart"
        sheet.wrong(rows[0], "outlet area", says)
        return None
    points = [_point(sheet, row, pressure, power, density, area) for row in rows]
    _falls_at_the_end(sheet, name, rows, pressure, [point[1] for point in points])
    if faulty():
        return None
    flow, static, taken = zip(*points, strict=True)
    return Fan(
        name=name, flow=flow, pressure=static, power=taken, electrical=power == "electrical power",
        speed=speeds[0], lowest_speed=speeds[1], highest_speed=speeds[2], density=density,
        sort=rows[0].text("sort"), size=facts["size"], outlet_area=area, price=facts["price"],
    )  # fmt: skip


def _same(sheet: Sheet, name: str, rows: Sequence[Row]) -> float | None:
    """What a fan's rows say in a column, empty cells passed over; a fault where they differ."""
    said = [row for row in rows if name in row.values]
    for row in said[1:]:
        if row.values.get(name) != said[0].values.get(name):
            says = f"{said[0].written[name]} as in row {said[0].line}: one value for each fan"
            sheet.wrong(row, name, f"{says}; another tested speed is a fan with a name of its own")
            break
    return said[0].number(name) if said else None


def _speeds(
    sheet: Sheet, rows: Sequence[Row], facts: dict[str, float | None]
) -> tuple[float, float, float]:
    """Tested, lowest and highest speed; limits that the data sheet does not give are assumed."""
    speed = facts["speed"] or math.nan
    lowest, highest = facts["lowest speed"], facts["highest speed"]
    highest = speed if highest is None else highest
    lowest = LOWEST_SHARE * min(speed, highest) if lowest is None else lowest
    if lowest > highest:
        name = "highest speed" if facts["highest speed"] is not None else "lowest speed"
        sheet.wrong(rows[0], name, "a lowest speed that is not above the highest")
    return speed, lowest, highest


def _other(pressure: str) -> str:
    return "total" if pressure == "static pressure" else "static"


def _point(
    sheet: Sheet, row: Row, pressure: str, power: str, density: float, area: float | None
) -> tuple[float, float, float]:
    """Flow, static pressure and power of one row, in SI.

    Fan static pressure is total pressure less the outlet's velocity pressure, efficiency is
    q dp/P on its own basis: definitions of the open standards.
    """
    flow, given, taken = (row.number(name) or 0.0 for name in ("flow", pressure, power))
    dynamic = 0.5 * density * (flow / area) ** 2 if area else 0.0
    static = given - dynamic if pressure == "total pressure" else given
    total = static + dynamic
    if static < 0.0:
        says = f"at least {dynamic:.4g} Pa, the velocity pressure in the outlet area"
        sheet.wrong(row, pressure, says)
    if power.endswith("efficiency"):
        base = {"efficiency": given, "static efficiency": static, "total efficiency": total}[power]
        if flow * base <= 0.0:
            says = "leave the point out: at no flow or pressure an efficiency gives no power"
            sheet.wrong(row, power, says)
        taken = flow * base / taken
    elif flow * total >= taken:
        says = f"more than the {flow * total:.4g} W of flow times pressure (efficiency below 1)"
        sheet.wrong(row, power, says)
    return flow, static, taken


def _falls_at_the_end(
    sheet: Sheet, name: str, rows: Sequence[Row], pressure: str, static: Sequence[float]
) -> None:
    """Note a curve without a stable side, and a level top that hides where the side begins."""
    if len(static) >= LEAST_POINTS and peak_of(static) == len(static) - 1:
        says = (
            f"below the point before: the curve of fan {name} must end on its stable, falling side"
        )
        sheet.wrong(rows[-1], pressure, says)


__all__ = ["COLUMNS", "CaseError", "Catalogue", "read_catalogue", "ready_made_catalogues"]
