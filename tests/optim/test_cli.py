"""The command line as its user meets it: what it prints, what it leaves, how it ends."""

from __future__ import annotations

import io
import json
import subprocess
import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from optim import Front, progress, text
from optim.cli import main
from optim.search import Progress
from problems import build, load_case, ready_made

CASE = """\
title = "Invented stack for a test bench"
kind = "stack"

[fluid]
name = "air"
temperature = "20 degC"
turbulence = "3 %"

[plates]
width = "0.5 m"
height = "0.3 m"
length = ["0.1 m", "0.9 m"]
gap = ["4 mm", "30 mm"]
surface = { temperature = "70 degC" }

[flow]
velocity = ["1 m/s", "9 m/s"]

[aims]
most = ["heat"]
least = ["fan_power"]

[limits]
pressure_drop = { at_most = "200 Pa" }
"""
FEW = ["--evaluations", "2000"]

Answer = tuple[int, str, str]
Command = Callable[..., Answer]


@pytest.fixture
def case(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> str:
    """A case file in a folder of its own, which is the current one."""
    monkeypatch.chdir(tmp_path)
    (tmp_path / "bench.toml").write_text(CASE, encoding="utf-8")
    return "bench.toml"


@pytest.fixture
def run(capsys: pytest.CaptureFixture[str]) -> Command:
    """Exit code, stdout and stderr of one command."""

    def called(*argv: str) -> Answer:
        code = main(argv)
        out, err = capsys.readouterr()
        return code, out, err

    return called


def wrong(answer: Answer) -> str:
    """The message of an answer that must be exit 2, nothing printed and no traceback."""
    code, out, err = answer
    assert code == 2
    assert out == ""
    assert err.startswith("platewright: ")
    assert "Traceback" not in err
    return err


def told_by(action: Callable[[Progress], None]) -> Callable[..., object]:
    """In place of the progress bar: `action`, called with each piece of news."""

    @contextmanager
    def shown(*_: object) -> Iterator[Callable[[Progress], None]]:
        yield action

    return shown


def interrupt(news: Progress) -> None:
    if news.generation >= 5:
        raise KeyboardInterrupt


class KilledError(Exception):
    """Stands for whatever ends a process from outside."""


def kill(news: Progress) -> None:
    if news.generation >= 5:
        raise KilledError


def test_help_names_the_commands_and_no_others(run):
    code, out, _ = run("--help")
    assert code == 0
    listed = out.split("COMMAND\n")[1].split("Exit codes")[0].splitlines()
    commands = [line.split()[0] for line in listed if line.startswith("    ") and line[4] != " "]
    assert commands == ["cases", "check", "point", "search", "trips", "robust"]


def test_no_command_prints_the_help(run):
    code, out, _ = run()
    assert code == 0
    assert "search" in out


def test_help_imports_nothing_heavy():
    heavy = "numpy pandas matplotlib pymoo moocore CoolProp pydantic pint rich scipy"
    script = (
        "import sys; from optim.cli import main; main(['--help']); "
        f"sys.exit(' '.join(set('{heavy}'.split()) & set(sys.modules)) or 0)"
    )
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True)
    assert done.returncode == 0, done.stderr


def test_version_is_told(run):
    code, out, _ = run("--version")
    assert code == 0
    assert out.startswith("platewright ")


@pytest.mark.parametrize(
    ("argv", "says"),
    [
        (["serach", "x"], "serach"),
        (["search"], "CASE"),
        (["search", "x", "--evaluations", "0"], "1 or more"),
        (["search", "x", "--evaluations", "-5"], "1 or more"),
        (["search", "x", "--evaluations", "many"], "'many'"),
        (["search", "x", "--seed", "-1"], "0 or more"),
        (["search", "x", "--seed", "1.5"], "'1.5'"),
        (["point", "x", "--colour"], "--colour"),
    ],
)
def test_a_wrong_command_line_is_one_message_that_names_what_is_wrong(run, argv, says):
    assert says in wrong(run(*argv))


def test_cases_lists_names_kinds_and_titles(run):
    code, out, _ = run("cases")
    assert code == 0
    for known in ready_made():
        assert any(
            known.name in line and known.kind in line and known.title in line
            for line in out.splitlines()
        )


def test_cases_as_json_is_a_list_of_objects(run):
    code, out, _ = run("cases", "--json")
    assert code == 0
    listed = json.loads(out)
    assert {frozenset(one) for one in listed} == {frozenset(("name", "kind", "title"))}
    assert [one["name"] for one in listed] == [known.name for known in ready_made()]


def test_a_copied_case_is_the_ready_made_one_and_is_not_replaced_unasked(run, case):
    name = ready_made()[0].name
    code, out, _ = run("cases", "--copy", name)
    copy = Path(f"{name}.toml")
    assert code == 0
    assert str(copy) in out
    assert copy.read_text(encoding="utf-8") == load_case(name).source
    copy.write_text("mine", encoding="utf-8")
    assert "--force" in wrong(run("cases", "--copy", name))
    assert copy.read_text(encoding="utf-8") == "mine"
    assert run("cases", "--copy", name, "--force")[0] == 0
    assert copy.read_text(encoding="utf-8") == load_case(name).source


def test_copying_an_unknown_case_names_the_nearest(run, case):
    name = ready_made()[0].name
    assert f"nearest: {name}" in wrong(run("cases", "--copy", f"{name}x"))


def test_check_tells_ranges_aims_limits_assumptions_laws_and_cautions(run, case):
    code, out, _ = run("check", case)
    assert code == 0
    lines = [" ".join(line.split()) for line in out.splitlines()]
    assert any(line.startswith("gap 4 mm to 30 mm") for line in lines)
    assert any(line.startswith("most heat") for line in lines)
    assert any(line.startswith("pressure drop at most 200 Pa") for line in lines)
    assert any(line.startswith("plates.surface.temperature 70 degC") for line in lines)
    assert any(line.startswith("plates.thickness 1 mm (") for line in lines)
    for word in ("Blasius", "Hot surfaces", "licensed practice", "10 to 25 %"):
        assert word in out


def test_check_as_json_gives_si(run, case):
    code, out, _ = run("check", case, "--json")
    found = json.loads(out)
    assert code == 0
    gap = next(one for one in found["searched"] if one["name"] == "gap")
    assert (gap["column"], gap["low"], gap["high"]) == ("gap_m", 0.004, 0.03)
    assert found["limits"][0]["at_most"] == 200.0
    assert "gap" not in " ".join(found["fixed"])


def test_a_fault_in_a_case_file_names_key_value_and_what_is_allowed(run, case):
    Path(case).write_text(CASE.replace('"4 mm"', '"4 kg"'), encoding="utf-8")
    message = wrong(run("check", case))
    assert "plates.gap" in message
    assert "4 kg" in message


@pytest.mark.parametrize("command", ["check", "point", "search"])
def test_a_missing_case_is_told(run, case, command):
    assert "no-such.toml" in wrong(run(command, "no-such.toml"))


def test_point_prints_every_outcome_with_its_unit(run, case):
    code, out, _ = run("point", case, "--set", "length=0.3", "--set", "gap=8 mm", "--no-picture")
    assert code == 0
    lines = [" ".join(line.split()) for line in out.splitlines()]
    problem = build(load_case(case))
    for outcome in problem.outcomes:
        assert any(line.startswith(f"{text.words(outcome.name)} ") for line in lines)
    assert any(line.startswith("gap 8 mm") for line in lines)
    assert any(line.startswith("length 300 mm") for line in lines)
    for heading in ("Heat and power", "Forces and pressures", "Remarks", "Laws", "Limits"):
        assert any(line.startswith(heading) for line in lines)


def test_point_takes_what_is_free_at_the_middle_and_says_so(run, case):
    code, out, _ = run("point", case, "--no-picture")
    assert code == 0
    assert "3 m/s" in out  # by ratio between 1 and 9
    assert "the middle of 1 m/s to 9 m/s" in out
    code, out, _ = run("point", case, "--no-picture", "--set", "length=0.3 m..0.5 m", "--json")
    taken = {one["name"]: one["value"] for one in json.loads(out)["taken"]}
    assert taken["length"] == pytest.approx(0.4)


def test_point_as_json_is_what_the_problem_evaluates(run, case):
    settings = ("--set", "length=0.3", "--set", "gap=8 mm", "--set", "velocity=4")
    code, out, _ = run("point", case, *settings, "--no-picture", "--json")
    found = json.loads(out)
    problem = build(load_case(case, {"length": 0.3, "gap": "8 mm", "velocity": 4.0}))
    given = problem.evaluate(np.empty((1, 0)))
    assert code == 0
    assert found["settings"]["gap_m"] == pytest.approx(0.008)
    assert found["outcomes"]["heat_W"] == float(given.outcomes["heat"][0])
    assert len(found["outcomes"]) == len(problem.outcomes)
    assert all(isinstance(law["inside"], bool) for law in found["laws"])


def test_point_gives_the_design_with_a_whole_count_too(run, case):
    code, out, _ = run("point", case, "--set", "gap=8 mm", "--no-picture", "--json")
    found = json.loads(out)
    count = 0.3 / 0.009
    assert code == 0
    assert found["settings"]["count"] == pytest.approx(count)
    assert found["whole"]["settings"]["count"] == round(count)
    ratio = found["whole"]["outcomes"]["heat_W"] / found["outcomes"]["heat_W"]
    assert ratio == pytest.approx(round(count) / count)
    assert "with a whole count" in run("point", case, "--no-picture")[1]


def test_point_judges_the_limits(run, case):
    settings = ("--set", "gap=4 mm", "--set", "velocity=9", "--set", "length=0.9")
    code, out, _ = run("point", case, *settings, "--no-picture", "--json")
    verdict = json.loads(out)["limits"][0]
    assert code == 0
    assert verdict["value"] > 200.0
    assert verdict["met"] is False
    assert "BROKEN" in run("point", case, *settings, "--no-picture")[1]


def test_point_answers_no_where_the_design_cannot_be(run, case):
    wired = '\n[trip]\nposition = "30 mm"\nheight = ["0.5 mm", "6 mm"]\n'
    Path(case).write_text(CASE + wired, encoding="utf-8")
    code, out, _ = run("point", case, "--set", "gap=4 mm..13 mm", "--set", "trip.height=6 mm")
    assert code == 1
    assert "cannot be" in out
    assert not Path("results").exists()


def test_point_never_replaces_a_picture_unasked(run, case):
    first = run("point", case)[1]
    picture = Path("results/bench-point/profile.png")
    assert str(picture) in first
    before = picture.read_bytes()
    assert "profile-2.png" in run("point", case, "--set", "gap=5 mm")[1]
    assert picture.read_bytes() == before
    assert run("point", case, "--set", "gap=5 mm", "--force")[0] == 0
    assert picture.read_bytes() != before
    assert len(list(picture.parent.iterdir())) == 2


@pytest.mark.parametrize(
    ("settings", "says"),
    [
        (["length"], "KEY=VALUE"),
        (["length="], "KEY=VALUE"),
        (["=3"], "KEY=VALUE"),
        (["length=0.3", "length=0.4"], "given twice, 0.3 and 0.4"),
        (["lenght=0.3"], "length"),
        (["gap=8 kg"], "8 kg"),
    ],
)
def test_wrong_settings_are_told(run, case, settings, says):
    argv = [part for setting in settings for part in ("--set", setting)]
    assert says in wrong(run("point", case, *argv))


def test_search_leaves_a_run_folder_with_table_case_and_pictures(run, case):
    code, out, err = run("search", case, *FEW)
    folder = Path("results/bench")
    assert code == 0
    assert str(folder) in out
    assert sorted(path.name for path in folder.iterdir()) == [
        "case.toml",
        "front.csv",
        "front.png",
        "run.json",
        "sketch.png",
        "variables.png",
    ]
    assert (folder / "case.toml").read_text(encoding="utf-8") == CASE
    table = pd.read_csv(folder / "front.csv")
    assert {"length_m", "gap_m", "velocity_m_s", "heat_W", "fan_power_W"} <= set(table.columns)
    assert (table["pressure_drop_Pa"] <= 200.0).all()
    told = json.loads((folder / "run.json").read_text(encoding="utf-8"))
    assert told["seed"] == 1
    assert any("licensed practice" in caution for caution in told["safety"])
    assert len(err.splitlines()) < 10


def test_search_prints_designs_from_the_least_power_to_the_most_heat(run, case):
    _, out, _ = run("search", case, *FEW, "--json", "--out", "here")
    found = json.loads(out)
    table = Front.load("here").table
    shown = {one["letter"]: one for one in found["shown"]}
    assert len(found["shown"]) == 7
    assert found["designs"] == len(table)
    assert shown["A"]["fan_power_W"] == pytest.approx(table["fan_power_W"].min())
    assert shown["C"]["heat_W"] == pytest.approx(table["heat_W"].max())
    assert found["run"] == "here"


def test_the_place_of_a_wire_that_is_not_there_is_not_told(run, case):
    code, out, _ = run("search", "lamp-stack", *FEW)
    assert code == 0
    told = {line[:16].strip(): line.split()[2:] for line in out.splitlines()}
    assert set(told["trip share"]) == {"-"}


def test_the_same_seed_gives_the_same_front_and_another_seed_another(run, case):
    for out, seed in (("one", "4"), ("two", "4"), ("three", "5")):
        assert run("search", case, *FEW, "--seed", seed, "--out", out)[0] == 0
    one, two, three = (Path(n, "front.csv").read_bytes() for n in ("one", "two", "three"))
    assert one == two
    assert one != three


def test_a_run_is_never_replaced_unasked(run, case):
    run("search", case, *FEW, "--out", "here")
    before = Path("here/front.csv").read_bytes()
    assert "--force" in wrong(run("search", case, *FEW, "--seed", "7", "--out", "here"))
    assert "finished" in wrong(run("search", case, *FEW, "--resume", "--out", "here"))
    assert Path("here/front.csv").read_bytes() == before
    assert run("search", case, *FEW, "--seed", "7", "--out", "here", "--force")[0] == 0
    assert Path("here/front.csv").read_bytes() != before


def test_no_feasible_design_is_an_answer_with_the_limits_that_stand_in_the_way(run, case):
    limited = CASE + 'heat = { at_least = "900 kW" }\n'
    Path(case).write_text(limited, encoding="utf-8")
    code, out, _ = run("search", case, *FEW)
    assert code == 1
    assert "No feasible design" in out
    row = next(line for line in out.splitlines() if line.strip().startswith("heat  "))
    assert "at least 900 kW" in row
    assert "out of reach" in row
    assert not Path("results/bench").exists()
    code, out, _ = run("search", case, *FEW, "--json")
    assert code == 1
    limit = next(
        one for one in json.loads(out)["nearest_miss"]["limits"] if one["outcome"] == "heat"
    )
    assert limit["best"] < 900e3


@pytest.mark.parametrize("out", ["bench.toml", "bench.toml/deeper"])
def test_a_file_where_the_folder_should_be_is_told_before_the_search(run, case, out):
    assert "bench.toml" in wrong(run("search", case, "--out", out))
    assert "bench.toml" in wrong(run("point", case, "--out", out))


def test_a_folder_that_may_not_be_written_to_is_told(run, case, monkeypatch):
    def refuse(*_: object, **__: object) -> None:
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr("tempfile.TemporaryFile", refuse)
    message = wrong(run("search", case, "--out", "closed"))
    assert "closed" in message
    assert "Permission denied" in message


def test_ctrl_c_keeps_what_was_found_and_resume_goes_on(run, case, monkeypatch):
    with monkeypatch.context() as patched:
        patched.setattr(progress, "shown", told_by(interrupt))
        code, out, err = run("search", case, "--out", "here", "--evaluations", "6000")
    assert code == 0
    assert "interrupted" in out
    assert "--resume" in err
    assert len(Front.load("here")) > 1
    assert "unfinished" not in wrong(run("search", case, "--out", "here"))
    assert run("search", case, "--out", "here", "--evaluations", "6000", "--resume")[0] == 0
    assert run("search", case, "--out", "whole", "--evaluations", "6000")[0] == 0
    assert Path("here/front.csv").read_bytes() == Path("whole/front.csv").read_bytes()
    assert not Path("here/checkpoint.npz").exists()


def test_a_killed_search_is_gone_on_with_only_when_asked(run, case, monkeypatch):
    from optim import course

    monkeypatch.setattr(course, "CHECKPOINT_EVERY", 0.0)
    with monkeypatch.context() as patched:
        patched.setattr(progress, "shown", told_by(kill))
        with pytest.raises(KilledError):
            main(["search", case, "--out", "here", "--evaluations", "6000"])
    assert "--resume" in wrong(run("search", case, "--out", "here", "--evaluations", "6000"))
    assert run("search", case, "--out", "here", "--evaluations", "6000", "--resume")[0] == 0
    assert run("search", case, "--out", "whole", "--evaluations", "6000")[0] == 0
    assert Path("here/front.csv").read_bytes() == Path("whole/front.csv").read_bytes()


def test_resume_without_anything_to_resume_says_so_and_begins(run, case):
    code, _, err = run("search", case, *FEW, "--out", "here", "--resume")
    assert code == 0
    assert "no unfinished search" in err


def test_a_case_without_a_free_variable_has_a_front_of_one(run, case):
    fixed = CASE.replace('["0.1 m", "0.9 m"]', '"0.4 m"').replace('["4 mm", "30 mm"]', '"8 mm"')
    Path(case).write_text(fixed.replace('["1 m/s", "9 m/s"]', '"4 m/s"'), encoding="utf-8")
    code, out, _ = run("search", case)
    assert code == 0
    assert "1 design" in out
    assert not Path("results/bench/variables.png").exists()


def test_a_reader_that_stops_early_is_no_fault(case):
    command = [sys.executable, "-c", "from optim.cli import main; raise SystemExit(main())"]
    root = str(Path(__file__).parents[2])
    with subprocess.Popen(
        [*command, "check", case],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        env={"PYTHONPATH": root, "PATH": "/usr/bin:/bin"},
    ) as process:
        process.stdout.close()
        err = process.stderr.read()
        code = process.wait()
    assert err == b""
    assert code == 141


def test_a_terminal_shows_a_bar_with_generation_front_and_hypervolume(monkeypatch):
    class Terminal(io.StringIO):
        def isatty(self) -> bool:
            return True

    monkeypatch.setenv("TERM", "xterm")
    monkeypatch.setenv("COLUMNS", "160")
    terminal = Terminal()
    with progress.shown(terminal, one_aim=False) as told:
        told(Progress(3, 3000, 60000, 41, 0.512))
    for word in ("generation 3", "3,000 of 60,000", "front 41", "hypervolume 0.512"):
        assert word in terminal.getvalue()


def test_elsewhere_a_few_lines_tell_the_progress():
    stream = io.StringIO()
    with progress.shown(stream, one_aim=True) as told:
        for generation in range(1, 1001):
            told(Progress(generation, 60 * generation, 60000, 5, 12.5))
    lines = stream.getvalue().splitlines()
    assert len(lines) == 5
    assert "best 12.5" in lines[0]
