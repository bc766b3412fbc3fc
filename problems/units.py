"""Quantities as the user writes them, "40 mm" or "150 m3/h", to SI and back for the eye."""

from __future__ import annotations

# unit of an SI outcome -> suffix of its column in front.csv
_SUFFIX = {
    "": "",
    "1": "",
    "m": "_m",
    "m2": "_m2",
    "m3": "_m3",
    "m/s": "_m_s",
    "m3/s": "_m3_s",
    "kg": "_kg",
    "kg/s": "_kg_s",
    "W": "_W",
    "W/m2": "_W_m2",
    "W/(m2 K)": "_W_m2K",
    "N": "_N",
    "Pa": "_Pa",
    "K": "_K",
}


def suffix(unit: str) -> str:
    """Column suffix of an SI unit: "m/s" -> "_m_s", a bare number -> ""."""
    return _SUFFIX[unit]
