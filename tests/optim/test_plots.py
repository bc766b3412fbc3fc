"""The pictures: what they show, in which units, and that nothing on them collides."""

from __future__ import annotations

import struct
from collections.abc import Callable, Iterator
from itertools import combinations
from pathlib import Path

import numpy as np
import pytest
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.collections import PathCollection
from matplotlib.figure import Figure
from matplotlib.text import Text
from matplotlib.transforms import Bbox

from optim import Front, ink, picks, plots, search
from problems import build, load_case, ready_made
from problems.problem import Aim, Problem
from tests.optim import fake

Drawn = Callable[[Figure], list[tuple[str, Bbox]]]
MOST_HEAT, LEAST_POWER = Aim("heat", "most"), Aim("fan_power", "least")


@pytest.fixture(scope="module")
def problem() -> fake.FakePlates:
    return fake.FakePlates()


@pytest.fixture(scope="module")
def front(problem: fake.FakePlates) -> Front:
    return fake.sampled(problem)


@pytest.fixture
def drawn(monkeypatch: pytest.MonkeyPatch) -> Iterator[Drawn]:
    """What a figure writes when it is drawn: every text with its box in pixels."""
    found: list[tuple[str, Bbox]] = []
    original = Text.draw

    def spied(self: Text, renderer: object) -> None:
        if self.get_visible() and self.get_text().strip():
            found.append((self.get_text(), Text.get_window_extent(self, renderer)))
        original(self, renderer)

    def draw(figure: Figure) -> list[tuple[str, Bbox]]:
        found.clear()
        with ink.style():
            FigureCanvasAgg(figure).draw()
        return list(found)

    monkeypatch.setattr(Text, "draw", spied)
    return draw


def assert_legible(texts: list[tuple[str, Bbox]], figure: Figure) -> None:
    """Every text lies on the sheet and none overlaps another."""
    sheet = figure.bbox
    outside = [t for t, box in texts if box.x0 < 0 or box.y0 < 0 or box.x1 > sheet.x1]
    over = [t for t, box in texts if box.y1 > sheet.y1]
    assert not outside + over
    pairs = [
        (one, other)
        for (one, a), (other, b) in combinations(texts, 2)
        if min(a.x1, b.x1) - max(a.x0, b.x0) > 1.0 and min(a.y1, b.y1) - max(a.y0, b.y0) > 1.0
    ]
    assert not pairs


def pictures(front: Front, problem: Problem) -> list[Figure]:
    figures = [plots.front_picture(front, problem), plots.sketch_picture(front, problem)]
    if problem.variables:
        figures.append(plots.variables_picture(front, problem))
    rows = picks.spread(front, problem, 4)
    designs = picks.designs(front, problem)
    return figures + [plots.profile_picture(problem, designs[row]) for row in rows]


def labels(figure: Figure) -> set[str]:
    found = {ax.get_xlabel() for ax in figure.axes} | {ax.get_ylabel() for ax in figure.axes}
    return {label.replace("\n", " ").replace("\N{NO-BREAK SPACE}", " ") for label in found}


def test_axes_of_the_front_carry_units_and_what_is_better(problem, front):
    figure = plots.front_picture(front, problem)
    assert labels(figure) >= {"heat, kW (more is better)", "fan power, W (less is better)"}


def test_fan_power_stands_over_heat_whatever_the_order_of_the_aims():
    aims = (LEAST_POWER, Aim("drag", "least"), MOST_HEAT)
    assert [aim.outcome for aim in picks.leading(fake.FakePlates(aims=aims))] == [
        "heat",
        "fan_power",
        "drag",
    ]


def test_first_two_aims_are_the_axes_where_heat_and_fan_power_are_not_both_aims():
    problem = fake.FakePlates(aims=(Aim("plate_mass", "least"), MOST_HEAT))
    figure = plots.front_picture(fake.sampled(problem), problem)
    assert labels(figure) >= {"plate mass, kg (less is better)", "heat, kW (more is better)"}


def test_a_wide_span_is_logarithmic_and_a_narrow_one_is_not(problem, front):
    ax = plots.front_picture(front, problem).axes[0]
    power = picks.column(front, problem, "fan_power")
    assert power.max() > 30 * power.min()
    assert ax.get_yscale() == "log"
    temperature = Aim("outlet_temperature", "least")
    narrow = fake.FakePlates(aims=(temperature, LEAST_POWER))
    assert plots.front_picture(fake.sampled(narrow), narrow).axes[0].get_xscale() == "linear"


def test_temperatures_are_shown_in_degrees_celsius():
    problem = fake.FakePlates(aims=(Aim("outlet_temperature", "most"), LEAST_POWER))
    figure = plots.front_picture(fake.sampled(problem), problem)
    assert "outlet temperature, °C (more is better)" in labels(figure)
    low, high = figure.axes[0].get_xlim()
    assert 0.0 < low < high < 100.0


def test_sorts_of_design_differ_by_the_shape_of_their_markers(problem, front):
    for figure in (plots.front_picture(front, problem), plots.variables_picture(front, problem)):
        scatters = [c for c in figure.axes[0].collections if isinstance(c, PathCollection)]
        assert {str(c.get_label()) for c in scatters} == {"plain", "tripped"}
        first, second = (c.get_paths()[0].vertices for c in scatters)
        assert first.shape != second.shape


def test_an_unknown_sort_of_design_has_a_marker_of_its_own():
    known = ink.markers(np.array(["plain", "ribbed", "tripped", "dimpled", "dimpled"]))
    assert len({marker for marker, _ in known.values()}) == 4
    assert next(iter(known)) == "dimpled"


def test_a_third_aim_shows_in_size_as_well_as_in_colour(problem, front):
    ax = plots.front_picture(front, problem).axes[0]
    drag = picks.column(front, problem, "drag")
    groups = front.table["group"].to_numpy(dtype=str)
    for scatter in ax.collections:
        rows = groups == scatter.get_label()
        sizes = np.sort(np.asarray(scatter.get_sizes()))
        share = np.log(drag[rows] / drag.min()) / np.log(drag.max() / drag.min())
        assert np.ptp(sizes) > 0.5 * np.ptp(share) * sizes.max()
        assert len(np.unique(scatter.get_facecolor(), axis=0)) > 5


def test_every_design_of_the_front_is_drawn_once(problem, front):
    ax = plots.front_picture(front, problem).axes[0]
    shown = np.concatenate([np.asarray(c.get_offsets()) for c in ax.collections])
    heat = 1e-3 * picks.column(front, problem, "heat")
    assert np.allclose(np.sort(shown[:, 0]), np.sort(heat))


def test_each_free_variable_has_a_panel_with_the_ends_of_its_range(problem, front):
    figure = plots.variables_picture(front, problem)
    assert len(figure.axes) == len(problem.variables)
    gap = figure.axes[1]
    assert gap.get_ylabel() == "gap, mm"
    ends = sorted(float(line.get_ydata()[0]) for line in gap.lines)
    assert ends == pytest.approx([3.0, 40.0])


def test_aims_beyond_the_third_have_panels_too():
    more = (Aim("plate_mass", "least"), Aim("pressure_drop", "least"))
    problem = fake.FakePlates(aims=(MOST_HEAT, LEAST_POWER, Aim("drag", "least"), *more))
    figure = plots.variables_picture(fake.sampled(problem), problem)
    assert {"plate mass, kg", "pressure drop, Pa"} <= labels(figure)


def test_side_views_share_one_scale(problem, front):
    figure = plots.sketch_picture(front, problem)
    wholes = [ax for ax in figure.axes if ax.get_xlim()[0] == 0.0 and ax.collections]
    assert len(wholes) == 3
    widths = {round(float(np.ptp(ax.get_xlim())), 9) for ax in wholes}
    assert len(widths) == 1
    for ax in wholes:
        box = ax.get_window_extent()
        tall = float(np.ptp(ax.get_ylim()))
        assert box.height / tall == pytest.approx(box.width / widths.copy().pop(), rel=1e-6)


def test_the_whole_stack_is_drawn_plate_by_plate(problem, front):
    figure = plots.sketch_picture(front, problem)
    wholes = [ax for ax in figure.axes if ax.get_xlim()[0] == 0.0 and ax.collections]
    counts = [len(ax.collections[0].get_paths()) for ax in wholes]
    rows = [pick.row for pick in picks.picked(front, problem)]
    expected = np.round(front.table["count"].to_numpy()[rows])
    assert counts == expected.astype(int).tolist()


def test_the_wire_is_at_least_two_millimetres_wide_in_the_detail(problem, front):
    figure = plots.sketch_picture(front, problem)
    details = [ax for ax in figure.axes if len(ax.collections) == 2]
    assert len(details) == 3
    for ax in details:
        wire = ax.collections[1].get_paths()[0].get_extents()
        across = wire.width / np.ptp(ax.get_xlim()) * ax.get_window_extent().width
        assert across / ink.DPI * 25.4 >= 2.0


def test_curves_of_one_unit_share_a_panel_of_the_profile(problem):
    figure = plots.profile_picture(problem, np.array([0.8, 8e-3, 6.0, 0.1, 1e-3]))
    assert labels(figure) >= {"h, W/(m² K)", "shear, Pa", "distance from the leading edge, mm"}
    panels = [len(ax.lines) - 2 for ax in figure.axes[1:]]
    assert panels == [1, 1, 2, 2]


def test_regions_differ_by_hatching_and_marks_by_name(problem, drawn):
    figure = plots.profile_picture(problem, np.array([0.8, 8e-3, 6.0, 0.4, 1e-3]))
    hatches = {patch.get_hatch() for patch in figure.axes[1].patches}
    assert len(hatches) == 3
    written = [text for text, _ in drawn(figure)]
    assert {"laminar", "transitional", "turbulent", "trip wire", "onset"} <= set(written)


@pytest.mark.parametrize("seed", range(4))
def test_no_text_overlaps_or_leaves_the_sheet(problem, drawn, seed):
    for figure in pictures(fake.sampled(problem, seed=seed), problem):
        assert_legible(drawn(figure), figure)


@pytest.mark.parametrize("share", [0.011, 0.2, 0.5, 0.899])
def test_names_along_the_plate_stay_apart_wherever_the_wire_is(problem, drawn, share):
    figure = plots.profile_picture(problem, np.array([0.8, 8e-3, 6.0, share, 1e-3]))
    assert_legible(drawn(figure), figure)


@pytest.mark.parametrize(
    "changed",
    [
        {"aims": (MOST_HEAT,)},
        {"variables": (fake.GAP,), "aims": (MOST_HEAT, LEAST_POWER)},
        {"aims": (MOST_HEAT, LEAST_POWER, *(Aim(n, "least") for n in ("drag", "plate_mass")))},
    ],
    ids=["one aim", "one variable", "four aims"],
)
def test_pictures_of_other_tasks_are_legible(drawn, changed):
    problem = fake.FakePlates(**changed)
    for figure in pictures(fake.sampled(problem), problem):
        assert_legible(drawn(figure), figure)


@pytest.mark.parametrize("name", [case.name for case in ready_made()])
def test_pictures_of_ready_made_cases_are_legible(drawn, name):
    problem = build(load_case(name))
    for figure in pictures(search(problem, evaluations=3000), problem):
        assert_legible(drawn(figure), figure)


def test_a_long_title_keeps_to_the_sheet(front, drawn):
    problem = fake.FakePlates()
    problem.title = "Cooling stack for the third of four walnut-hulling lines " * 4
    figure = plots.front_picture(front, problem)
    assert_legible(drawn(figure), figure)


def test_saved_pictures_are_png_files_as_wide_as_a_page(problem, front, tmp_path: Path):
    written = plots.save_pictures(front, problem, tmp_path)
    assert [path.name for path in written] == ["front.png", "variables.png", "sketch.png"]
    for path in written:
        head = path.read_bytes()[:24]
        assert head[:8] == b"\x89PNG\r\n\x1a\n"
        wide, tall = struct.unpack(">II", head[16:24])
        assert wide == int(170.0 / 25.4 * 200.0)
        assert 600 < tall < 2.0**0.5 * 1.05 * 200.0 * 210.0 / 25.4
    assert len(list(tmp_path.iterdir())) == 3


def test_an_empty_front_leaves_no_pictures(problem, front, tmp_path: Path):
    empty = Front(front.table.iloc[:0], {}, "")
    assert plots.save_pictures(empty, problem, tmp_path) == []
    assert not list(tmp_path.iterdir())


def test_drawing_leaves_the_users_settings_alone(problem, front):
    import matplotlib as mpl

    with mpl.rc_context({"font.size": 17.0}):
        plots.front_picture(front, problem)
        assert mpl.rcParams["font.size"] == 17.0


def test_the_place_of_a_wire_that_is_not_there_is_not_drawn():
    problem = build(load_case("lamp-stack"))
    front = search(problem, seed=1, evaluations=3000, size=40)
    assert (front.table["trip_height_m"] == 0.0).all()
    figure = plots.variables_picture(front, problem)
    panels = {ax.get_ylabel().split(",")[0]: ax for ax in figure.axes}
    drawn = {
        name: sum(
            int(np.isfinite(np.ma.filled(dots.get_offsets(), np.nan)).all(axis=1).sum())
            for dots in panels[name].collections
        )
        for name in ("trip share", "gap")
    }
    assert drawn == {"trip share": 0, "gap": len(front)}
