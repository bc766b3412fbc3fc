"""Property tables against CoolProp asked directly, against published values, and as a cache."""

from __future__ import annotations

import csv
import os
import re
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
from CoolProp import CoolProp
from numpy.testing import assert_allclose

from problems.convection import fluids
from problems.convection.fluids import (
    CACHE_VARIABLE,
    Fluid,
    FluidError,
    check_name,
    fluid,
    standard_pressure,
)

ROOT = Path(__file__).parents[3]
PUBLISHED = ROOT / "tests" / "published"
ATM = 101325.0

# fluid, pressure [Pa], low and high [K]; the carbon dioxide is just above its critical pressure
SPANS = [
    ("air", ATM, 280.0, 360.0),
    ("air", 80e3, 150.0, 1900.0),
    ("water", ATM, 275.0, 371.0),
    ("water", 1e6, 280.0, 450.0),
    ("water", ATM, 380.0, 600.0),
    ("CarbonDioxide", 8e6, 295.0, 340.0),
    ("n-Heptane", ATM, 290.0, 360.0),
    ("Toluene", ATM, 290.0, 360.0),
    ("INCOMP::MEG[0.3]", ATM, 265.0, 360.0),
    ("INCOMP::T66", ATM, 280.0, 600.0),
]


@pytest.fixture(autouse=True)
def cache(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A cache of its own for every test."""
    monkeypatch.setenv(CACHE_VARIABLE, str(tmp_path / "tables"))
    return tmp_path / "tables"


def published(name: str) -> list[dict[str, str]]:
    with (PUBLISHED / name).open(encoding="utf-8") as file:
        return list(csv.DictReader(file))


def one(made: Fluid, symbol: str, temperature: float) -> float:
    """One property by its symbol in the published tables."""
    if symbol == "beta":
        return float(made.expansion(temperature))
    if symbol == "sound":
        return float(made.sound_speed(temperature))
    return float(getattr(made.at(temperature), symbol))


def direct(symbol: str, temperature: np.ndarray, made: Fluid) -> np.ndarray:
    return np.asarray(CoolProp.PropsSI(symbol, "T", temperature, "P", made.pressure, made.name))


# The world outside


@pytest.mark.parametrize("name", ["air", "water"])
def test_table_agrees_with_published_values(name: str) -> None:
    for row in published(f"{name}_properties.csv"):
        temperature = float(row["temperature_K"])
        made = fluid(name, float(row["pressure_Pa"]), temperature, temperature + 20.0)
        found = one(made, row["property"], temperature)
        assert_allclose(found, float(row["value"]), float(row["tolerance"]), err_msg=str(row))


@pytest.mark.parametrize("row", published("humid_air.csv"))
def test_humid_air_has_the_published_humidity_ratio_and_dew_point(row: dict[str, str]) -> None:
    inlet = float(row["temperature_C"]) + 273.15
    made = fluid("humid air", ATM, inlet - 10.0, inlet + 10.0, float(row["humidity"]), inlet)
    tolerance = float(row["tolerance"])
    assert made.humidity_ratio == pytest.approx(float(row["humidity_ratio"]), rel=tolerance)
    assert made.dew_point == pytest.approx(float(row["dew_point_C"]) + 273.15, abs=0.01)


@pytest.mark.parametrize("row", published("standard_atmosphere.csv"))
def test_standard_pressure_agrees_with_published_values(row: dict[str, str]) -> None:
    found = standard_pressure(float(row["altitude_m"]))
    assert_allclose(found, float(row["pressure_Pa"]), float(row["tolerance"]))


def test_standard_pressure_takes_arrays_and_refuses_other_heights() -> None:
    found = standard_pressure(np.array([[0.0, 350.0], [11e3, 20e3]]))
    assert found.shape == (2, 2)
    assert np.all(np.diff(found.ravel()) < 0.0)
    with pytest.raises(FluidError, match="25000") as caught:
        standard_pressure(25000.0)
    assert caught.value.key == "altitude"


def test_water_boils_at_99_97_celsius_at_one_atmosphere() -> None:
    made = fluid("water", ATM, 280.0, 300.0)
    assert made.saturation_temperature == pytest.approx(373.124, abs=0.002)  # IAPWS, from memory
    assert made.freezing_point == pytest.approx(273.1525, abs=0.002)  # IAPWS, from memory


# Accuracy


@pytest.mark.parametrize(("name", "pressure", "low", "high"), SPANS)
def test_table_is_within_a_twentieth_of_a_permille_of_coolprop(
    name: str, pressure: float, low: float, high: float
) -> None:
    made = fluid(name, pressure, low, high)
    temperature = np.random.default_rng(1).uniform(made.low, made.high, 1500)
    found = made.at(temperature)
    for symbol, values in (("D", found.rho), ("V", found.mu), ("L", found.k), ("C", found.cp)):
        assert_allclose(values, direct(symbol, temperature, made), rtol=5e-5, err_msg=symbol)
    assert_allclose(found.nu, found.mu / found.rho, rtol=1e-12)
    assert_allclose(found.pr, found.mu * found.cp / found.k, rtol=1e-12)


@pytest.mark.parametrize(("name", "pressure", "low", "high"), SPANS[:5] + SPANS[6:8])
def test_expansion_and_sound_speed_agree_with_coolprop(
    name: str, pressure: float, low: float, high: float
) -> None:
    made = fluid(name, pressure, low, high)
    temperature = np.random.default_rng(2).uniform(made.low, made.high, 300)
    beta = direct("isobaric_expansion_coefficient", temperature, made)
    assert_allclose(made.expansion(temperature), beta, rtol=2e-4, atol=1e-7)
    assert_allclose(made.sound_speed(temperature), direct("A", temperature, made), rtol=5e-5)


def test_humid_air_agrees_with_coolprop_at_one_humidity_ratio() -> None:
    made = fluid("humid air", 95e3, 300.0, 400.0, 0.4, 320.0)
    temperature = np.random.default_rng(3).uniform(made.low, made.high, 500)
    found = made.at(temperature)
    for symbol, values in (("Vha", 1 / found.rho), ("M", found.mu), ("K", found.k)):
        there = CoolProp.HAPropsSI(symbol, "T", temperature, "P", 95e3, "W", made.humidity_ratio)
        assert_allclose(values, there, rtol=1e-6, err_msg=symbol)
    there = CoolProp.HAPropsSI("cp_ha", "T", temperature, "P", 95e3, "W", made.humidity_ratio)
    assert_allclose(found.cp, there, rtol=1e-6)


def test_humid_air_without_moisture_is_dry_air() -> None:
    dry, humid = fluid("air", ATM, 290.0, 400.0), fluid("humid air", ATM, 290.0, 400.0, 0.0)
    temperature = np.linspace(290.0, 400.0, 50)
    assert humid.dew_point is None
    for symbol in ("rho", "mu", "k", "cp"):
        at_dry, at_humid = (getattr(made.at(temperature), symbol) for made in (dry, humid))
        assert_allclose(at_humid, at_dry, rtol=1e-4, err_msg=symbol)
    assert_allclose(humid.sound_speed(temperature), dry.sound_speed(temperature), rtol=2e-3)


def test_moisture_makes_air_lighter_and_its_heat_capacity_greater() -> None:
    dry, humid = (fluid("humid air", ATM, 320.0, 360.0, share).at(330.0) for share in (0.0, 0.5))
    assert humid.rho < dry.rho
    assert humid.cp > dry.cp


# The shape of a table


@pytest.mark.parametrize("shape", [(), (12,), (3, 4), (0,)])
def test_properties_have_the_shape_of_the_temperature(shape: tuple[int, ...]) -> None:
    made = fluid("air", ATM, 290.0, 350.0)
    temperature = np.random.default_rng(4).uniform(280.0, 360.0, shape)
    found = made.at(temperature)
    for symbol in ("rho", "mu", "k", "cp", "nu", "pr"):
        values = getattr(found, symbol)
        assert np.shape(values) == shape
        singly = [getattr(made.at(t), symbol) for t in temperature.ravel()]
        assert_allclose(np.ravel(values), singly, rtol=1e-15)
    assert np.shape(made.expansion(temperature)) == shape


def test_properties_are_continuous_and_steady_along_the_temperature() -> None:
    made = fluid("air", ATM, 290.0, 350.0)
    found = made.at(np.linspace(made.low - 5.0, made.high + 5.0, 200_001))
    for values in (found.rho, -found.mu, -found.k):
        assert np.all(np.diff(values) <= 0.0)
    for values in (found.rho, found.mu, found.k, found.cp, found.pr):
        assert np.max(np.abs(np.diff(values) / values[1:])) < 1e-5


def test_beyond_its_ends_a_table_holds_the_value_at_the_end() -> None:
    made = fluid("water", ATM, 290.0, 360.0)
    below, above = made.at([1.0, made.low]), made.at([made.high, 5000.0])
    assert below.mu[0] == below.mu[1]
    assert above.mu[0] == above.mu[1]


def test_table_covers_the_span_asked_for() -> None:
    made = fluid("air", ATM, 293.15, 353.15, reference_temperature=288.0)
    assert made.low <= 288.0
    assert made.high >= 353.15
    assert fluid("air", ATM, 300.0, 300.0).at(300.0).rho == pytest.approx(1.177, rel=1e-4)


# Phase, boiling, freezing, dew point


def test_inlet_decides_between_water_and_steam() -> None:
    water = fluid("water", ATM, 350.0, 420.0, reference_temperature=350.0)
    steam = fluid("water", ATM, 350.0, 420.0, reference_temperature=420.0)
    assert (water.phase, steam.phase) == ("liquid", "gas")
    assert water.saturation_temperature is not None
    assert steam.saturation_temperature is not None
    assert water.high < water.saturation_temperature < 420.0
    assert steam.low > steam.saturation_temperature > 350.0
    assert water.at(420.0).rho > 900.0
    assert steam.at(350.0).rho < 1.0


def test_table_of_humid_air_ends_at_the_dew_point() -> None:
    made = fluid("humid air", ATM, 280.0, 350.0, 0.6, 310.0)
    assert made.dew_point is not None
    assert 280.0 < made.dew_point < 310.0
    assert made.low == pytest.approx(made.dew_point, abs=0.01)


def test_incompressible_liquid_knows_freezing_and_boiling_and_carries_no_sound() -> None:
    brine, oil = (
        fluid("INCOMP::MEG[0.3]", ATM, 280.0, 340.0),
        fluid("INCOMP::T66", ATM, 300.0, 640.0),
    )
    assert brine.freezing_point == pytest.approx(
        CoolProp.PropsSI("T_freeze", "T", 300, "P", ATM, brine.name)
    )
    assert oil.saturation_temperature is not None
    boiling = CoolProp.PropsSI("P", "T", oil.saturation_temperature, "Q", 0, oil.name)
    assert boiling == pytest.approx(ATM, rel=1e-6)
    assert oil.high < oil.saturation_temperature
    assert np.all(np.isinf(oil.sound_speed([300.0, 400.0])))
    assert np.all(oil.expansion([300.0, 400.0]) > 0.0)


def test_water_just_above_freezing_may_be_asked_for_at_zero_celsius() -> None:
    assert fluid("water", ATM, 273.15, 290.0).at(273.15).rho == pytest.approx(999.8, abs=0.1)


# What is refused

REFUSED = [
    (("Benezne", ATM, 300.0, 320.0), "name", "Benzene"),
    (("humid-air", ATM, 300.0, 320.0), "name", "humid air"),
    (("MEG[0.3]", ATM, 300.0, 320.0), "name", "INCOMP::MEG"),
    (("INCOMP::meg[0.3]", ATM, 300.0, 320.0), "name", "INCOMP::MEG"),
    (("INCOMP::MEG", ATM, 300.0, 320.0), "name", "0 to 0.6"),
    (("INCOMP::MEG[0.9]", ATM, 300.0, 320.0), "name", "0 to 0.6"),
    (("INCOMP::MEG[x]", ATM, 300.0, 320.0), "name", "INCOMP::MEG"),
    (("INCOMP::LiBr[0.3]", ATM, 300.0, 320.0), "name", "thermal conductivity"),
    (("Acetone", ATM, 300.0, 320.0), "name", "viscosity"),
    (("Methane&Ethane", ATM, 300.0, 320.0), "name", "Methane"),
    (("", ATM, 300.0, 320.0), "name", "humid air"),
    (("CO2", 7.4e6, 295.0, 320.0), "name", "too sharply"),
    (("air", -1.0, 300.0, 320.0), "pressure", "above 0"),
    (("air", float("nan"), 300.0, 320.0), "pressure", "above 0"),
    (("air", 1e10, 300.0, 320.0), "pressure", "up to"),
    (("air", ATM, 0.0, 320.0), "temperature", "above 0 K"),
    (("air", ATM, 320.0, 300.0), "temperature", "300 K"),
    (("air", ATM, 20.0, 320.0), "temperature", "59.77 K"),
    (("air", ATM, 80.0, 320.0), "temperature", "boils"),
    (("water", ATM, 263.15, 320.0), "temperature", "273.16 K to 373.07 K"),
    (("air", ATM, 300.0, 320.0, 0.5), "humidity", "only for it"),
    (("humid air", ATM, 300.0, 320.0), "humidity", "must be given"),
    (("humid air", ATM, 300.0, 320.0, 50.0), "humidity", "between 0 and 1"),
    (("humid air", ATM, 700.0, 720.0, 0.5), "temperature", "623.10 K"),
    (("humid air", ATM, 420.0, 440.0, 0.9), "humidity", "no such humid air"),
]


@pytest.mark.parametrize(("arguments", "key", "allowed"), REFUSED)
def test_refusal_names_key_value_and_what_is_allowed(
    arguments: tuple[object, ...], key: str, allowed: str
) -> None:
    with pytest.raises(FluidError) as caught:
        fluid(*arguments)  # type: ignore[arg-type]
    assert caught.value.key == key
    assert allowed in caught.value.allowed
    assert repr(caught.value.value) in str(caught.value)


def test_names_can_be_checked_before_any_table_is_built(cache: Path) -> None:
    for name in ("air", "Humid Air", "R134a", "propane", "INCOMP::MEG[0.3]", "INCOMP::T66"):
        check_name(name)
    for name in ("airr", "INCOMP::MEG", "INCOMP::T67", "REFPROP::Water"):
        with pytest.raises(FluidError, match=re.escape(repr(name))):
            check_name(name)
    assert kept(cache) == []


# The cache


def same(one: Fluid, other: Fluid) -> bool:
    facts = [name for name in Fluid.__dataclass_fields__ if name != "values"]
    alike = all(getattr(one, fact) == getattr(other, fact) for fact in facts)
    return alike and np.array_equal(one.values, other.values)


def kept(folder: Path) -> list[Path]:
    return sorted(folder.glob("*")) if folder.exists() else []


def test_second_call_reads_the_same_table_from_the_cache(
    cache: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    first = fluid("humid air", ATM, 300.0, 350.0, 0.5)
    assert [path.suffix for path in kept(cache)] == [".npz"]
    monkeypatch.setattr(fluids, "source_of", None)  # would fail if it were asked
    assert same(fluid("humid air", ATM, 300.0, 350.0, 0.5), first)


def test_reading_a_kept_table_imports_neither_coolprop_nor_scipy(cache: Path) -> None:
    fluid("water", 2e5, 290.0, 350.0)
    code = (
        "import sys; from problems.convection.fluids import fluid; "
        "print(fluid('water', 2e5, 290.0, 350.0).at(300.0).rho); "
        "print(sorted({m.split('.')[0] for m in sys.modules} & {'CoolProp', 'scipy'}))"
    )
    told = subprocess.run(
        [sys.executable, "-c", code], capture_output=True, text=True, check=True, cwd=ROOT
    )
    rho, heavy = told.stdout.split()
    assert float(rho) == pytest.approx(996.6, abs=0.1)
    assert heavy == "[]"


@pytest.mark.parametrize(
    "damage", ["emptied", "cut", "rotten", "foreign", "bare array", "pickled", "not a number"]
)
def test_damaged_file_is_rebuilt_without_a_word(cache: Path, damage: str) -> None:
    first = fluid("air", ATM, 290.0, 340.0)
    (place,) = kept(cache)
    whole = place.read_bytes()
    with np.load(place) as content:
        parts = dict(content)
    if damage == "emptied":
        place.write_bytes(b"")
    elif damage == "cut":
        place.write_bytes(whole[: len(whole) // 2])
    elif damage == "rotten":
        middle = len(whole) // 2
        place.write_bytes(whole[:middle] + bytes([whole[middle] ^ 255]) + whole[middle + 1 :])
    elif damage == "foreign":
        np.savez(
            place,
            texts=np.array(["another", "air", "gas"]),
            **{k: parts[k] for k in ("numbers", "values")},
        )
    elif damage == "bare array":
        with place.open("wb") as file:
            np.save(file, parts["values"])
    elif damage == "pickled":
        np.savez(place, **{**parts, "texts": np.array([{}], dtype=object)}, allow_pickle=True)
    else:
        np.savez(place, **{**parts, "values": np.full_like(parts["values"], np.nan)})
    assert same(fluid("air", ATM, 290.0, 340.0), first)
    with np.load(place, allow_pickle=False) as content:
        assert np.array_equal(content["values"], first.values)


def test_tables_of_different_cases_are_kept_apart(cache: Path) -> None:
    for pressure in (ATM, 90e3):
        for share in (0.3, 0.4):
            fluid("humid air", pressure, 300.0, 340.0, share)
    fluid("air", ATM, 300.0, 340.0)
    fluid("air", ATM, 300.0, 390.0)
    assert len(kept(cache)) == 6


def test_empty_variable_keeps_no_tables(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv(CACHE_VARIABLE, "")
    monkeypatch.chdir(tmp_path)
    fluid("air", ATM, 300.0, 340.0)
    assert kept(tmp_path) == []


def test_cache_that_cannot_be_written_is_done_without(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    blocker = tmp_path / "file"
    blocker.write_text("not a folder", encoding="utf-8")
    monkeypatch.setenv(CACHE_VARIABLE, str(blocker / "tables"))
    assert fluid("air", ATM, 300.0, 340.0).at(300.0).rho == pytest.approx(1.177, rel=1e-4)


def test_failed_write_leaves_no_draft_behind(cache: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def full(*_: object) -> None:
        raise OSError("no space left")

    monkeypatch.setattr(os, "replace", full)
    fluid("air", ATM, 300.0, 340.0)
    assert kept(cache) == []


def test_oldest_tables_leave_the_cache(cache: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(fluids, "_MOST_KEPT", 2)
    for high in (310.0, 330.0, 350.0):
        fluid("air", ATM, 300.0, high)
    assert len(kept(cache)) == 2
