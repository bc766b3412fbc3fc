"""Case files: good ones give what they say, bad ones get one line for every fault.

`good` holds whole cases, `bad` what is changed in one of them; the comments at the top of each file
say what must come out.
"""

import ast
import re
import subprocess
import sys
import tomllib
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from problems import CaseError, build, load_case, ready_made
from problems.case import Case, Span, parse_case, ready_made_text
from problems.kinds.outcomes import OUTCOMES
from problems.overrides import written

HERE = Path(__file__).parent
GOOD = sorted((HERE / "good").glob("*.toml"))
BAD = sorted((HERE / "bad").glob("*.toml"))
FOREIGN_WORDS = re.compile(
    r"pydantic|pint|validation|traceback|input should|field required|type=|<class|errno", re.I
)


def stated(path: Path, word: str) -> list[list[str]]:
    """The comments `# word: a | b | c` of a file, each split at its bars."""
    found = re.findall(rf"^# {word}: (.+)$", path.read_text("utf-8"), re.M)
    return [[part.strip() for part in line.split(" | ")] for line in found]


def reached(thing, path):
    """The attribute or item of `thing` at a dotted path."""
    for part in path.split("."):
        thing = thing[int(part)] if part.isdigit() else getattr(thing, part)
    return thing


def merged(base: dict, change: dict) -> dict:
    both = {
        key: merged(base[key], change[key])
        for key in base.keys() & change.keys()
        if isinstance(base[key], dict) and isinstance(change[key], dict)
    }
    return {**base, **change, **both}


def without(raw: dict, path: str) -> dict:
    head, _, rest = path.partition(".")
    if rest:
        return {**raw, head: without(raw[head], rest)}
    return {key: value for key, value in raw.items() if key != head}


def bad_case(path: Path) -> str:
    """The text of a whole case with the fault of `path` in it."""
    raw = tomllib.loads((HERE / "good" / f"{stated(path, 'base')[0][0]}.toml").read_text("utf-8"))
    for line in stated(path, "without"):
        for key in line[0].split(", "):
            raw = without(raw, key)
    return written(merged(raw, tomllib.loads(path.read_text("utf-8"))))


def refusal(text: str, overrides=None) -> list[str]:
    """The lines of the message with which a case is refused."""
    with pytest.raises(CaseError) as caught:
        parse_case(text, "bad", overrides)
    return str(caught.value).splitlines()


def good(name: str) -> str:
    return (HERE / "good" / f"{name}.toml").read_text("utf-8")


@pytest.mark.parametrize("path", GOOD, ids=lambda path: path.stem)
def test_a_good_case_gives_what_it_says_in_si(path):
    case = load_case(path)
    assert stated(path, "gives")
    for key, value in stated(path, "gives"):
        number, _, within = value.partition(" +- ")
        wanted = ast.literal_eval(number)
        if isinstance(wanted, float):
            tolerance = float(within) if within else 1e-12 * abs(wanted)
            wanted = pytest.approx(wanted, abs=tolerance)
        assert reached(case, key) == wanted, key


@pytest.mark.parametrize("path", BAD, ids=lambda path: path.stem)
def test_a_bad_case_is_told_key_value_and_what_is_allowed_for_every_fault(path):
    head, *lines = refusal(bad_case(path))
    faults = stated(path, "fault")
    assert head == f"bad: {len(faults)} fault{'s' * (len(faults) > 1)}"
    assert len(lines) == len(faults), lines
    for key, value, allowed in faults:
        start = f"  {key}: {value}"
        assert [line for line in lines if line.startswith(start) and allowed in line], lines
    assert not FOREIGN_WORDS.search("\n".join(lines))


def test_the_bases_of_the_bad_cases_are_good_once_written_again():
    for name in ("plate", "stack"):
        text = good(name)
        again = parse_case(written(tomllib.loads(text)), name)
        assert dict(again) == dict(parse_case(text, name))


@pytest.mark.parametrize(
    ("text", "place"),
    [
        ('title = "a"\nkind = \n', "line 2, column 8"),
        ('title = "a\n', "line 1, column 11"),
        ("[fluid\n", "line 1, column 7"),
        ("a = 1\na = 2\n", "line 2, column 6"),
        ("a = [1,", "line 1, column 8"),
    ],
)
def test_unreadable_toml_is_told_with_line_and_column(text, place):
    (line,) = refusal(text)
    assert f"bad: not TOML -- {place}: " in line


@pytest.mark.parametrize("text", ["", "# nothing\n"])
def test_an_empty_case_is_refused(text):
    assert refusal(text) == ["bad: empty -- a case begins with title and kind"]


@pytest.mark.parametrize("text", ["a = " + "[" * 5000 + "]" * 5000, "a = " + "9" * 5000])
def test_monstrous_toml_is_refused(text):
    assert refusal(text)[0].startswith("bad: not TOML -- ")


def test_what_is_no_text_file_is_refused(tmp_path):
    wide = tmp_path / "wide.toml"
    wide.write_bytes('title = "ä"'.encode("latin-1"))
    with pytest.raises(CaseError, match=r"not UTF-8 text \(byte 10\)"):
        load_case(wide)
    with pytest.raises(CaseError, match=r"a folder -- give a case file or a ready-made case$"):
        load_case(tmp_path)
    (tmp_path / "case.toml").write_text(good("plate"), "utf-8")
    with pytest.raises(CaseError, match=r"a folder .*case\.toml is one$"):
        load_case(tmp_path)
    for name in ("", "x" * 5000, "a\0b", tmp_path / "case.toml" / "x"):
        with pytest.raises(CaseError) as caught:
            load_case(name)
        assert not FOREIGN_WORDS.search(str(caught.value))


def test_a_missing_case_names_the_nearest(tmp_path):
    with pytest.raises(CaseError, match="ready-made case -- nearest: hulling-stack"):
        load_case("huling-stack")
    (tmp_path / "shelf.toml").write_text(good("plate"), "utf-8")
    with pytest.raises(CaseError, match=r"nearest: .*shelf\.toml"):
        load_case(tmp_path / "shelv.toml")
    with pytest.raises(CaseError, match="ready-made: cellar-water, citrus-oil"):
        load_case("zzzz")


def test_a_file_with_windows_marks_is_read(tmp_path):
    path = tmp_path / "windows.toml"
    path.write_bytes(b"\xef\xbb\xbf" + good("stack").replace("\n", "\r\n").encode())
    assert dict(load_case(path)) == dict(parse_case(good("stack"), "windows"))


def test_a_case_keeps_its_name_and_its_text(tmp_path):
    path = tmp_path / "my case.toml"
    path.write_text(good("stack"), "utf-8")
    case = load_case(path)
    assert (case.name, case.source) == ("my case", good("stack"))
    with pytest.raises(Exception, match="frozen"):
        case.title = "other"


@pytest.mark.parametrize("made", ready_made(), ids=lambda made: made.name)
def test_a_ready_made_case_is_sound_and_leaves_something_to_search(made):
    case = load_case(made.name)
    assert (case.name, case.kind, case.title) == (made.name, made.kind, made.title)
    assert len(case.free) >= 2
    assert case.source == ready_made_text(made.name)
    assert case.source.startswith("# ")


def test_the_ready_made_cases_cover_both_kinds_liquids_and_flux():
    cases = [load_case(made.name) for made in ready_made()]
    assert {case.kind for case in cases} == set(OUTCOMES)
    assert {"air", "water", "INCOMP::TCO"} <= {case.fluid.name for case in cases}
    assert any(case.plates.surface.flux for case in cases)
    assert any(case.fluid.altitude for case in cases)


def test_what_was_assumed_is_told_with_its_reason():
    assumed = dict(parse_case(good("plate"), "plate").assumed)
    assert assumed["fan.efficiency"] == "0.55 (fan, drive and motor together)"
    assert assumed["plates.thickness"] == "1 mm (common sheet)"
    assert assumed["plates.material_density"] == "2700 kg/m³ (aluminium)"
    assert assumed["fluid.pressure"] == "101.3 kPa (standard atmosphere)"
    assert dict(parse_case(good("mountain"), "m").assumed)["fluid.pressure"].endswith("at 1000 m)")
    stack = dict(parse_case(good("stack"), "stack").assumed)
    assert stack.keys() == {"plates.feed", "plates.roughness", "plates.material_density"}


# Values set by hand


def set_by_hand(name: str, **values: str | float) -> Case:
    return parse_case(good(name), name, {key.replace("__", "."): v for key, v in values.items()})


@pytest.mark.parametrize(
    ("key", "value", "path", "wanted"),
    [
        ("length", "0.3", "plates.length", Span(0.3, 0.3)),
        ("length", 0.3, "plates.length", Span(0.3, 0.3)),
        ("plates.length", "300 mm", "plates.length", Span(0.3, 0.3)),
        ("gap", "3 mm..5 mm", "plates.gap", Span(0.003, 0.005)),
        ("gap", "0.25..0.5", "plates.gap", Span(0.25, 0.5)),
        ("plates_height", "0.5 m", "plates.height", 0.5),
        ("fluid_temperature", "300 K", "fluid.temperature", 300.0),
        ("surface_temperature", "360 K", "plates.surface.temperature", 360.0),
        ("ends", "none", "plates.ends", "none"),
        ("efficiency", "50 %", "fan.efficiency", 0.5),
        ("limits.drag.at_most", "2 N", "limits.5.at_most", 2.0),
        ("aims.most", "heat, mean_h", "aims.1.outcome", "mean_h"),
    ],
)
def test_a_value_set_by_hand_replaces_that_of_the_file(key, value, path, wanted):
    found = reached(parse_case(good("stack"), "stack", {key: value}), path)
    if isinstance(wanted, Span):
        assert (found.low, found.high) == pytest.approx((wanted.low, wanted.high))
    else:
        assert found == wanted


@pytest.mark.parametrize(
    ("key", "value", "gone", "there"),
    [
        ("count", "40", "plates.height", "plates.count"),
        ("altitude", "500 m", None, "fluid.altitude"),
        ("flux", "300 W/m2", "plates.surface.temperature", "plates.surface.flux"),
        ("critical_reynolds", "5e5", "fluid.turbulence", "fluid.critical_reynolds"),
    ],
)
def test_of_two_keys_that_exclude_each_other_the_one_set_by_hand_stands(key, value, gone, there):
    case = parse_case(good("stack"), "stack", {key: value})
    assert reached(case, there) is not None
    assert gone is None or reached(case, gone) is None


def test_both_of_two_excluding_keys_set_by_hand_are_refused():
    lines = refusal(good("stack"), {"count": 40, "height": "0.5 m", "plates.height": "0.5 m"})
    assert any("could be plates.height or trip.height" in line for line in lines)
    lines = refusal(good("stack"), {"count": 40, "plates.height": "0.5 m"})
    assert '  plates.height: "0.5 m" -- give this or count, not both' in lines


def test_an_ambiguous_short_name_is_told_its_meanings():
    (_, line) = refusal(good("stack"), {"temperature": "20 degC"})
    assert 'temperature: "20 degC" -- could be' in line
    assert "fluid.temperature or plates.surface.temperature" in line


def test_an_unknown_short_name_is_told_the_nearest():
    (head, *lines) = refusal(good("stack"), {"lenght": "1 m", "trip_hight": "1 mm"})
    assert head == "values set by hand: 2 faults"
    assert '"length" (plates.length)' in lines[0]
    assert '"trip_height" (trip.height)' in lines[1]


def test_a_trip_set_by_hand_on_a_case_without_one_asks_for_the_other_key():
    (_, line) = refusal(good("plate"), {"trip_position": "6 %"})
    assert line.startswith("  trip.height: missing -- a wire diameter")
    trip = parse_case(good("plate"), "p", {"trip_position": "6 %", "trip_height": "1 mm"}).trip
    assert trip is not None
    assert (trip.position.low, trip.position_is_share, trip.height.low) == (0.06, True, 0.001)


def test_a_wrong_value_set_by_hand_is_told_like_one_in_the_file():
    (_, line) = refusal(good("stack"), {"gap": "3 parsecs"})
    assert line.startswith('  plates.gap: "3 parsecs" -- a length such as "8 mm"')


def test_a_value_set_by_hand_where_no_table_stands_is_refused():
    lines = refusal(
        good("stack")
        .replace("[fan]\nefficiency", "[fans]\nx")
        .replace('kind = "stack"', 'kind = "stack"\nfan = 5'),
        {"fan.efficiency": 0.5},
    )
    assert any("fan is no table in this case" in line for line in lines)


def test_the_text_of_a_case_set_by_hand_gives_the_same_case_again():
    case = parse_case(good("stack"), "stack", {"gap": "3 mm..5 mm", "count": "40", "length": 0.3})
    assert dict(parse_case(case.source, "again")) == dict(case)


@given(
    st.recursive(
        st.booleans() | st.integers(-(2**62), 2**62) | st.floats(allow_nan=False) | st.text(),
        lambda inner: st.lists(inner) | st.dictionaries(st.text(), inner),
    ),
    st.text(),
)
def test_tables_written_as_toml_are_read_back_the_same(value, key):
    raw = {"first": value, "table": {key: value}}
    assert tomllib.loads(written(raw)) == raw


@given(
    st.dictionaries(
        st.sampled_from(["kind", "fluid", "plates", "flow", "aims", "trip", "x"]),
        st.recursive(
            st.integers() | st.text(max_size=5) | st.booleans(),
            lambda inner: (
                st.lists(inner, max_size=3)
                | st.dictionaries(
                    st.sampled_from(["name", "gap", "velocity", "most", "heat"]), inner, max_size=3
                )
            ),
            max_leaves=8,
        ),
        min_size=1,
    )
)
def test_whatever_the_tables_hold_the_answer_is_one_message(raw):
    assert refusal(written(raw))


def test_a_state_without_properties_is_refused_when_the_problem_is_built():
    case = parse_case(good("plate"), "ice", {"name": "water", "fluid.temperature": "-20 degC"})
    with pytest.raises(CaseError, match=r"ice: 1 fault\n  fluid\.temperature: .* -- .*known from"):
        build(case)


def test_a_problem_built_from_a_case_has_its_free_variables_and_aims():
    case = load_case("hulling-stack")
    problem = build(case)
    assert len(problem.variables) == len(case.free)
    assert problem.aims == case.aims
    assert problem.source == case.source
    middle = np.array([[0.5 * (v.low + v.high) for v in problem.variables]])
    assert problem.evaluate(middle).outcomes["heat"][0] > 0.0


def test_importing_problems_imports_nothing_heavy():
    code = (
        "import problems, sys; problems.CaseError; "
        "print([m for m in ('pydantic', 'pint', 'CoolProp', 'numpy', 'scipy') if m in sys.modules])"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"


def test_reading_a_case_in_air_needs_no_property_library():
    code = (
        "import problems, sys; problems.load_case('hulling-stack'); "
        "print([m for m in ('CoolProp', 'matplotlib', 'pandas') if m in sys.modules])"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"


def test_ranges_that_no_design_will_want_are_cautioned():
    assert [text[:24] for text in parse_case(good("stack"), "stack").cautions] == [
        "Wires of up to 4 mm on b"
    ]
    fixed = {"length": "0.1 m", "velocity": 3, "trip_position": "0.2 m", "trip_height": "1 mm"}
    texts = parse_case(good("plate"), "plate", fixed).cautions
    assert [text[:23] for text in texts] == ["Nothing is left to sear", "A wire at up to 200 mm "]
    assert parse_case(good("plate"), "plate").cautions == ()


def test_one_key_set_under_two_names_is_a_fault():
    with pytest.raises(CaseError, match="the same as length"):
        load_case("hulling-stack", {"length": "0.3 m", "plates.length": "0.4 m"})
