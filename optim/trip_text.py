"""The account of forced transition as plain text: the answer, the tables, the wire, the cautions.

Takes an account (see `optim.trip_account`) and returns text; nothing is computed here but the
units that are shown.
"""

from __future__ import annotations

import re
import textwrap
from collections.abc import Iterator, Mapping, Sequence
from typing import Any

from optim.text import WIDTH, section, sentences, table
from optim.trip_answer import celsius, percent
from problems.units import format_value

Account = Mapping[str, Any]
SAVED = ("power_saved_at_equal_merit", "gain_at_equal_area")


def of_trips(account: Account) -> str:
    """What `trips` prints where there is an answer."""
    parts = [
        f"{account['title']}\nkind {account['kind']}, case {account['name']}\n",
        section("Answer", _paragraph(account["answer"])),
        section("Verdicts on the case", sentences(account["verdicts"])),
        *_compared(account),
        section("The wire", _wire(account)),
        section("Ways of comparing", _criteria(account)),
        section("Notes", sentences(account["notes"])),
        section("Cautions for the design of the answer", sentences(account["cautions"])),
        section("Cautions", sentences(account["safety"])),
    ]
    return "\n".join(filter(None, parts)).rstrip()


def _compared(account: Account) -> Iterator[str]:
    """The tables, where there is a plain surface to compare with."""
    if account["shown"] is None:
        rows = [(way["name"], way["meaning"], way["verdict"]) for way in account["ways"]]
        yield section("Ways", table(rows))
        return
    reference = account["references"][account["shown"]]
    power = short(reference["fan_power_W"], "W")
    yield section(f"Ways, at {power} of fan power", _ways(account))
    yield section(f"Over the onset band, at {power}", _bands(account))
    yield section("Gain at equal power, guaranteed gain in brackets", _references(account))
    yield section(f"Even treatment, at {power}", _even(account))


def _ways(account: Account) -> str:
    hot = account["merit"]["outcome"] == "hottest_wall"
    heads = ("", "GAIN AT", "GUARAN-", "POWER", "GAIN AT", "", "", "EVEN-", *(("HOTTEST",) * hot))
    below = ("WAY", "POWER", "TEED", "SAVED", "AREA", "WIRE", "PLACE", "NESS", *(("WALL",) * hot))
    rows = [(*heads, ""), (*below, "VERDICT")]
    for way in account["ways"]:
        design, plain = way["design"], way["name"] == "plain"
        gains = ("gain_at_equal_power", "guaranteed_gain", *SAVED)
        rows.append(
            (
                way["name"],
                *("-" if plain else percent(way[key]) for key in gains),
                _size(design),
                _place(design),
                f"{design['outcomes']['evenness']:.2f}",
                *((celsius(design["outcomes"]["hottest_wall_K"]),) * hot),
                way["verdict"],
            )
        )
    return table(rows, right=(1, 2, 3, 4, 7, *((8,) * hot)))


def _wired(account: Account, which: str) -> list[Account]:
    """The plain way and those that have a wire in their design called `which`."""
    return [way for way in account["ways"] if way["name"] == "plain" or way[which]["wires"]]


def _others(account: Account, told: Sequence[Account]) -> str:
    """A line on the ways that are not told of, because they come to the plain surface."""
    names = [way["name"] for way in account["ways"] if way not in told]
    return "\n" + _paragraph(f"No wire, as plain: {', '.join(names)}.") if names else ""


def _size(design: Account) -> str:
    """Number and diameter of the wires: "2 x 0.9 mm"."""
    if not design["wires"]:
        return "none"
    height = short(design["settings"]["trip_height_m"], "m")
    return height if design["wires"] == 1 else f"{design['wires']} x {height}"


def _place(design: Account) -> str:
    settings = design["settings"]
    if not design["wires"]:
        return "-"
    share = percent(settings["trip_position_m"] / settings["length_m"])
    return f"{short(settings['trip_position_m'], 'm')}, {share}"


def _bands(account: Account) -> str:
    unit = account["merit"]["unit"]
    merit = account["merit"]["outcome"].replace("_", " ").upper()
    rows = [("WAY", merit, "FAN POWER", "GAIN AT EQUAL POWER")]
    ways = _wired(account, "design")
    for way in ways:
        band = way["band"]
        gain = "-" if way["name"] == "plain" else _ends(band["gain"], percent)
        rows.append(
            (
                way["name"],
                _ends(band["merit"], lambda v: _fine(v, unit)),
                _ends(band["fan_power_W"], lambda v: _fine(v, "W")),
                gain,
            )
        )
    return table(rows) + _others(account, ways)


def _ends(ends: Sequence[float], told: Any) -> str:
    low, high = (told(end) for end in ends)
    return str(low) if low == high else f"{low} to {high}"


def _references(account: Account) -> str:
    merit, unit = account["merit"]["outcome"], account["merit"]["unit"]
    names = [way["name"] for way in account["ways"][1:]]
    gained = [
        one["gains"][n]["gain_at_equal_power"] for one in account["references"] for n in names
    ]
    if max(gained) <= 0.0:
        powers = ", ".join(short(one["fan_power_W"], "W") for one in account["references"])
        return _paragraph(f"No way gains anything at {powers}.")
    rows = [("FAN POWER", f"PLAIN {merit.replace('_', ' ').upper()}", *map(str.upper, names))]
    for reference in account["references"]:
        outcomes = reference["plain"]["outcomes"]
        value = next(v for k, v in outcomes.items() if k.startswith(merit))
        gains = [reference["gains"][name] for name in names]
        told = [
            f"{percent(one['gain_at_equal_power'])} ({percent(one['guaranteed_gain'])})"
            for one in gains
        ]
        rows.append((short(reference["fan_power_W"], "W"), _fine(value, unit), *told))
    return table(rows, right=range(2 + len(names)))


def _even(account: Account) -> str:
    """The most even design of each way beside the plain one."""
    heads = ("WAY", "EVENNESS", "HOTTEST WALL", "LEAST H", "HEAT", "FAN POWER", "WIRE", "PLACE")
    rows = [heads]
    ways = _wired(account, "most_even")
    for way in ways:
        design = way["most_even"]
        outcomes = design["outcomes"]
        rows.append(
            (
                way["name"],
                f"{outcomes['evenness']:.3f}",
                celsius(outcomes["hottest_wall_K"]),
                _fine(outcomes["least_h_W_m2K"], "W/(m2 K)"),
                _fine(outcomes["heat_W"], "W"),
                _fine(outcomes["fan_power_W"], "W"),
                _size(design),
                _place(design),
            )
        )
    return table(rows, right=range(1, 6)) + _others(account, ways)


def _wire(account: Account) -> str:
    wire = account["wire"]
    if wire is None:
        return ""
    speed, margin = wire["velocity_m_s"], wire["margin"]
    stock = ", ".join(format_value(size, "m") for size in wire["stock_m"])
    fails = wire["fails_below"]
    smallest = wire["smallest_m"]
    needed = f"smallest that trips with U k/nu {margin - 1.0:.0%} over the design value"
    place, tall = (short(wire[key], "m") for key in ("trip_position_m", "trip_height_m"))
    rows = [
        ("design", f"{wire['way']}, {tall} at {place}, {short(speed, 'm/s')}"),
        (needed, "none that fits" if smallest is None else _fine(smallest, "m")),
        ("from here on more diameter only adds drag", _fine(wire["enough_m"], "m")),
        ("next stock sizes from the smallest on", stock or "none that fits"),
        *_from_stock(account),
        ("at turndown this wire fails below", _turndown(fails, speed)),
        *(
            (f"{_named(name, account)}, place ± 2 mm, diameter ± 10 %", _change(change))
            for name, change in wire["tolerance"].items()
        ),
    ]
    return table(rows)


def _from_stock(account: Account) -> list[tuple[str, str]]:
    wire = account["wire_from_stock"]
    if wire is None:
        return []
    gain, sure = percent(wire["gain_at_equal_power"]), percent(wire["guaranteed_gain"])
    fails = _turndown(wire["fails_below"], account["wire"]["velocity_m_s"])
    size = format_value(wire["trip_height_m"], "m")
    return [(f"gain with {size} from stock", f"{gain}, guaranteed {sure}; fails below {fails}")]


def _turndown(fails: float, speed: float) -> str:
    if fails >= 1.0:
        return "its full speed: it does not set the onset there"
    if fails <= 0.0:
        return "no speed of 5 % or more"
    return f"{percent(fails)} of the velocity, {short(fails * speed, 'm/s')}"


def _named(name: str, account: Account) -> str:
    merit = {"hottest_wall": "cooling of the hottest place"}.get(account["merit"]["outcome"])
    told = merit or str(account["merit"]["outcome"])
    return {"merit": told}.get(name, name).replace("_", " ")


def _change(change: Sequence[float]) -> str:
    low, high = (100.0 * end for end in change)
    return f"{low:+.1f} % to {high:+.1f} %"


def _criteria(account: Account) -> str:
    rows = [(one["name"], one["meaning"]) for one in account["criteria"]]
    source = account["criteria"][0]["source"]
    told = f"The usual performance criteria for enhanced surfaces: {source}."
    return f"{table(rows)}\n{_paragraph(told)}"


def _paragraph(text: str) -> str:
    """A text wrapped and indented; a number keeps its unit."""
    bound = re.sub(r"(?<=\d) (?=%|°|[A-Za-z]{1,3}\b)", "\N{NO-BREAK SPACE}", text)
    filled = textwrap.fill(bound, WIDTH - 2).replace("\N{NO-BREAK SPACE}", " ")
    return textwrap.indent(filled, "  ")


def short(value: float, unit: str) -> str:
    """Two digits, for a sentence."""
    return format_value(float(f"{value:.2g}"), unit)


def _fine(value: float, unit: str) -> str:
    """Three digits, for a table."""
    return celsius(value) if unit == "K" else format_value(float(f"{value:.3g}"), unit)
