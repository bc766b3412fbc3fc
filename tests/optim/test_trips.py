"""`platewright trips` as its user meets it: the answer, the figures, the folder."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from matplotlib.image import imread

from optim import contest
from optim.cli import main

ONLY_TRIPPED = """
title = "Invented plate that only a wire brings to its duty"
kind = "plate"
[fluid]
name = "air"
temperature = "20 degC"
turbulence = "0.4 %"
[plates]
width = "1 m"
length = "1 m"
surface = { temperature = "80 degC" }
[flow]
velocity = ["5 m/s", "10 m/s"]
[trip]
position = ["3 %", "60 %"]
height = ["0 mm", "4 mm"]
[aims]
most = ["heat"]
least = ["fan_power"]
[limits]
mean_h = { at_least = "18 W/(m2 K)" }
"""


def asked(*argv: str) -> int:
    return main(["trips", *argv])


@pytest.fixture(scope="module")
def told(tmp_path_factory):
    """The account of `trips` on a ready-made case and its folder, each case searched once."""
    known: dict[str, tuple[dict, Path]] = {}
    patch = pytest.MonkeyPatch()
    patch.setattr(contest, "FRONT_EVALUATIONS", 12_000)
    patch.setattr(contest, "EVALUATIONS", 2500)

    def of(name: str) -> tuple[dict, Path]:
        if name not in known:
            folder = tmp_path_factory.mktemp("trips") / name
            assert asked(name, "--out", str(folder)) == 0
            known[name] = (json.loads((folder / "trips.json").read_text("utf-8")), folder)
        return known[name]

    yield of
    patch.undo()


@pytest.fixture
def short(monkeypatch):
    monkeypatch.setattr(contest, "FRONT_EVALUATIONS", 6000)
    monkeypatch.setattr(contest, "EVALUATIONS", 1500)


@pytest.mark.slow
def test_a_wire_pays_on_a_long_plate_in_a_quiet_stream(told):
    account, _ = told("kiln-shield")
    assert account["pays"]
    best = next(way for way in account["ways"] if way["name"] == account["best"])
    assert best["gain_at_equal_power"] > 0.05
    assert best["power_saved_at_equal_merit"] > 0.05
    assert best["gain_at_equal_area"] > 0.05
    assert "more heat" in account["answer"]
    assert account["wire"]["smallest_m"] > 1e-3


@pytest.mark.slow
def test_no_wire_pays_in_narrow_gaps(told):
    account, _ = told("lamp-stack")
    assert not account["pays"]
    assert account["best"] == "plain"
    for reference in account["references"]:
        for gains in reference["gains"].values():
            assert gains["gain_at_equal_power"] < 0.01
    assert "cannot keep up turbulence" in account["answer"]


@pytest.mark.slow
@pytest.mark.parametrize("name", ["kiln-shield", "lamp-stack"])
def test_no_way_does_worse_than_a_plain_surface(told, name):
    account, _ = told(name)
    assert account["references"]
    for reference in account["references"]:
        for gains in reference["gains"].values():
            assert gains["gain_at_equal_power"] >= 0.0
            assert gains["power_saved_at_equal_merit"] >= 0.0
            assert gains["gain_at_equal_area"] >= 0.0
            assert gains["guaranteed_gain"] <= gains["gain_at_equal_power"]
            low, high = gains["band"]["gain"]
            assert low <= high
            assert gains["guaranteed_gain"] == min(gains["gain_at_equal_power"], low)


@pytest.mark.slow
def test_even_treatment_wins_by_a_wire_that_meets_the_same_power(told):
    account, _ = told("kiln-shield")
    ways = {way["name"]: way["most_even"] for way in account["ways"]}
    evenness = {name: design["outcomes"]["evenness"] for name, design in ways.items()}
    assert evenness["one wire"] > 1.2 * evenness["plain"]
    shown = account["references"][account["shown"]]["fan_power_W"]
    for design in ways.values():
        assert design["outcomes"]["fan_power_W"] <= shown * (1.0 + 1e-6)


@pytest.mark.slow
def test_the_folder_holds_the_table_the_pictures_and_the_case(told):
    account, folder = told("kiln-shield")
    table = pd.read_csv(folder / "trips.csv")
    assert set(table["criterion"]) == {"equal power", "equal merit", "equal area", "even"}
    assert set(table["way"]) == {way["name"] for way in account["ways"]}
    first = table[table["criterion"] == "equal power"].set_index(["reference", "way"])
    plain = first.xs("plain", level="way")["heat_W"]
    for (place, _), row in first.iterrows():
        assert row["gain"] == pytest.approx(row["heat_W"] / plain[place] - 1.0, abs=1e-9)
    for name in ("strategies.png", "gain.png", "map.png", "wire.png"):
        assert name in account["files"]
        pixels = imread(folder / name)[..., :3]
        assert np.ptp(pixels) > 0.5
        assert (pixels.min(axis=2) < 0.9).mean() > 0.01
    assert (folder / "case.toml").read_text("utf-8").startswith("# A shield plate")


def test_the_same_seed_gives_the_same_answer(short, tmp_path, capsys):
    accounts = []
    for name in ("a", "b"):
        assert asked("kiln-shield", "--json", "--seed", "3", "--out", str(tmp_path / name)) == 0
        accounts.append(json.loads(capsys.readouterr().out))
    first, second = ({k: v for k, v in one.items() if k != "run"} for one in accounts)
    assert first == second


def test_a_duty_that_only_a_wire_meets_is_told_so(short, tmp_path, capsys):
    (tmp_path / "only.toml").write_text(ONLY_TRIPPED, encoding="utf-8")
    assert asked(str(tmp_path / "only.toml"), "--json", "--out", str(tmp_path / "out")) == 0
    account = json.loads(capsys.readouterr().out)
    assert account["answer"].startswith("Only a tripped surface meets the limits here")
    ways = {way["name"]: way["verdict"] for way in account["ways"]}
    assert ways["one wire"] == "meets the limits"


def test_a_duty_that_nothing_meets_ends_with_1_and_leaves_nothing(short, tmp_path, capsys):
    text = ONLY_TRIPPED.replace("18 W/(m2 K)", "180 W/(m2 K)")
    (tmp_path / "never.toml").write_text(text, encoding="utf-8")
    out = tmp_path / "out"
    assert asked(str(tmp_path / "never.toml"), "--out", str(out)) == 1
    assert "mean h" in capsys.readouterr().out
    assert not out.exists()


@pytest.mark.parametrize("levels", ["5", "4..1", "0..3", "a..b", "1..400"])
def test_a_wrong_band_of_turbulence_is_told(levels, tmp_path, capsys):
    code = asked("kiln-shield", "--turbulence", levels, "--out", str(tmp_path / "out"))
    assert code == 2
    err = capsys.readouterr().err
    assert "--turbulence" in err
    assert "Traceback" not in err


def test_nothing_is_replaced_without_force(tmp_path, capsys):
    (tmp_path / "trips.csv").write_text("mine", encoding="utf-8")
    assert asked("kiln-shield", "--out", str(tmp_path)) == 2
    assert "--force" in capsys.readouterr().err
    assert (tmp_path / "trips.csv").read_text("utf-8") == "mine"


def test_a_band_of_turbulence_takes_the_place_of_the_factor(short, tmp_path, capsys):
    out = str(tmp_path / "out")
    assert asked("kiln-shield", "--json", "--turbulence", "0.3%..3%", "--out", out) == 0
    account = json.loads(capsys.readouterr().out)
    assert any("0.3 to 3 %" in note for note in account["notes"])
    best = next(way for way in account["ways"] if way["name"] == account["best"])
    assert best["guaranteed_gain"] < best["gain_at_equal_power"]
