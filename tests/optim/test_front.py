"""Fronts: what their tables say, and that a run folder gives back what was put in."""

from __future__ import annotations

import json
from dataclasses import replace

import numpy as np
import pandas as pd
import pytest

from optim import Front, search
from optim.errors import RunError, RunExistsError
from optim.front import TEXTS
from problems.problem import Limit
from tests.optim import toy

FEW = 3000


@pytest.fixture(scope="module")
def front() -> Front:
    return search(toy.trade(), evaluations=FEW)


def test_columns_are_settings_outcomes_and_texts(front):
    assert list(front.table.columns) == [
        "length_m",
        "speed_m_s",
        "output_W",
        "effort_W",
        "strain_Pa",
        "group",
        "outside",
        "cautions",
    ]


def test_laws_outside_their_range_are_joined(front):
    low = front.table[front.table["length_m"] < 0.1]
    middle = front.table[front.table["length_m"].between(0.2, 0.9)]
    assert len(low)
    assert len(middle)
    assert set(low["outside"]) == {"law one; law two"}
    assert set(middle["outside"]) == {""}


def test_cautions_and_groups_are_texts(front):
    long = front.table["length_m"] > 0.9
    assert set(front.table.loc[long, "cautions"]) == {"mind the edge"}
    assert set(front.table.loc[~long, "cautions"]) == {""}
    assert set(front.table["group"]) == {"large", "small"}


def test_saved_front_comes_back_exactly(front, tmp_path):
    front.save(tmp_path / "run")
    back = Front.load(tmp_path / "run")
    pd.testing.assert_frame_equal(back.table, front.table, check_exact=True)
    assert back.provenance == front.provenance
    assert back.source == front.source


def test_figures_of_all_sizes_come_back_exactly(front, tmp_path):
    table = front.table.copy()
    odd = [0.1 + 0.2, 1e-300, 5e-324, 1.7976931348623157e308, -0.0, 1 / 3, np.inf, 2.0**53]
    table.loc[table.index[: len(odd)], "effort_W"] = odd
    replace(front, table=table).save(tmp_path)
    pd.testing.assert_frame_equal(Front.load(tmp_path).table, table, check_exact=True)


def test_texts_with_commas_quotes_and_empty_ones_come_back_exactly(front, tmp_path):
    table = front.table.iloc[:4].copy()
    table["cautions"] = pd.Series(['a, "b"', "", "NA", "line\nbreak; ümlaut"], dtype="str")
    replace(front, table=table).save(tmp_path)
    pd.testing.assert_frame_equal(Front.load(tmp_path).table, table)


def test_front_without_a_design_comes_back(tmp_path):
    front = search(toy.trade(limits=(Limit("output", at_least=9.0),)), evaluations=FEW)
    front.save(tmp_path)
    back = Front.load(tmp_path)
    pd.testing.assert_frame_equal(back.table, front.table)
    assert back.provenance["nearest_miss"] == front.provenance["nearest_miss"]


def test_case_is_kept_exactly_as_given(front, tmp_path):
    front.save(tmp_path)
    assert (tmp_path / "case.toml").read_bytes() == toy.trade().source.encode()


def test_provenance_tells_all_that_is_promised(front, tmp_path):
    front.save(tmp_path)
    told = json.loads((tmp_path / "run.json").read_text())
    assert told["seed"] == 1
    assert told["evaluations"] == FEW
    assert told["wall_time_s"] > 0.0
    assert {"python", "platewright", "numpy", "pymoo", "CoolProp"} <= told["versions"].keys()
    assert told["aims"][0] == {"outcome": "output", "sense": "most"}
    assert told["limits"] == [{"outcome": "strain", "at_least": None, "at_most": 40.0}]
    assert told["units"]["speed_m_s"] == "m/s"
    assert told["units"].keys() == {c for c in front.table.columns if c not in TEXTS}
    assert told["cautions"][0]["text"] == "mind the edge"
    assert told["notes"] == ["a note"]
    assert told["date"].endswith("+00:00")
    assert told["stopped_because"]
    assert told["history"]


def test_folder_that_holds_a_run_is_not_replaced(front, tmp_path):
    front.save(tmp_path)
    before = (tmp_path / "run.json").read_bytes()
    with pytest.raises(RunExistsError, match="holds a run already"):
        front.save(tmp_path)
    with pytest.raises(FileExistsError):
        front.save(tmp_path)
    assert (tmp_path / "run.json").read_bytes() == before


def test_folder_that_holds_a_run_is_replaced_on_request(front, tmp_path):
    front.save(tmp_path)
    replace(front, source="other").save(tmp_path, force=True)
    assert Front.load(tmp_path).source == "other"


def test_other_files_in_the_folder_are_left_alone(front, tmp_path):
    (tmp_path / "notes.txt").write_text("mine")
    front.save(tmp_path)
    assert (tmp_path / "notes.txt").read_text() == "mine"
    assert {path.name for path in tmp_path.iterdir()} == {
        "notes.txt",
        "front.csv",
        "case.toml",
        "run.json",
    }


def test_failed_save_leaves_no_scraps_and_no_run(front, tmp_path):
    broken = replace(front, provenance={"bad": object()})
    with pytest.raises(TypeError):
        broken.save(tmp_path)
    assert not (tmp_path / "run.json").exists()
    assert not [path for path in tmp_path.iterdir() if path.name.startswith(".")]
    with pytest.raises(RunError, match="holds no run"):
        Front.load(tmp_path)


def test_place_that_is_a_file_is_refused(front, tmp_path):
    (tmp_path / "file").write_text("")
    with pytest.raises(RunError, match="is a file"):
        front.save(tmp_path / "file")


def test_folder_without_a_run_is_refused(tmp_path):
    with pytest.raises(RunError, match="holds no run"):
        Front.load(tmp_path)
    with pytest.raises(RunError, match="no such folder"):
        Front.load(tmp_path / "nowhere")


@pytest.mark.parametrize("name", ["run.json", "front.csv"])
def test_damaged_run_is_refused(front, tmp_path, name):
    front.save(tmp_path)
    (tmp_path / name).write_text('"a,b\n1,{x\n')
    with pytest.raises(RunError, match="damaged"):
        Front.load(tmp_path)


def test_front_cannot_be_changed(front):
    with pytest.raises(AttributeError):
        front.source = "other"
