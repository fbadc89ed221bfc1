"""Charts, read back artist by artist."""

import matplotlib as mpl
import numpy as np
import pandas as pd
import pytest
import shapely
from charts_made_up import by_gid, chart_of, markers_of, overlaps, samples, shape_of, sliver_chart
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

from gley.drawing import EphChart, style

WHOLE = (0.0, 14.0, -1.0, 1.5)


def drawn(element, count=0, **more):
    made = EphChart().draw(chart_of(element, **more))
    return (made.points(samples(count, element)) if count else made).finish()


CASES = {
    **{f"{element}-{count}": (element, count, {}) for element in ("As", "Fe", "Mn") for count in (12, 40)},
    "Fe-50": ("Fe", 50, {}),
    **{f"{element}-whole": (element, 0, {"window": WHOLE}) for element in ("As", "Fe", "Mn")},
}


@pytest.fixture(autouse=True)
def house_style():
    """Texts are measured as they are saved."""
    with style.look():
        yield


@pytest.fixture(scope="module", params=CASES)
def made(request):
    element, count, more = CASES[request.param]
    return drawn(element, count, **more)


def names_of(chart):
    return by_gid(chart.ax, "name-")


def test_no_name_meets_another_name_or_a_marker(made):
    shapes = [shape_of(text) for text in names_of(made)]
    assert not overlaps(shapes)
    assert not overlaps(shapes, markers_of(made.ax, "point-"))


def test_names_stay_on_the_axes(made):
    frame = shapely.box(*made.ax.get_window_extent().extents)
    assert all(frame.contains(shape_of(text)) for text in names_of(made))


def test_every_field_in_sight_is_named_inside_or_by_a_leader(made):
    assert made.names.unnamed_fields == []
    leaders = {line.get_gid(): line for line in by_gid(made.ax, "leader-name-field")}
    texts = {text.get_gid(): text for text in by_gid(made.ax, "name-field-")}
    patches = by_gid(made.ax, "field-")
    assert patches
    for patch in patches:
        own = {gid: text for gid, text in texts.items() if gid.startswith(f"name-{patch.get_gid()}")}
        if not own:
            size = shapely.box(*patch.get_window_extent().extents).area
            assert size < 500.0, patch.get_gid()
        for gid, text in own.items():
            spot = text.get_position() if f"leader-{gid}" not in leaders else leaders[f"leader-{gid}"].get_xydata()[1]
            assert patch.get_path().contains_point(spot), gid


def test_names_of_fields_lie_on_no_line(made):
    inside = [text for text in by_gid(made.ax, "name-field-") if not by_gid(made.ax, f"leader-{text.get_gid()}")]
    lines = [*by_gid(made.ax, "boundary-"), *by_gid(made.ax, "water-")]
    paths = [shapely.LineString(made.ax.transData.transform(line.get_xydata())) for line in lines]
    for text in inside:
        shape = shape_of(text)
        assert not any(path.intersects(shape) for path in paths), text.get_gid()


def test_type_is_large_enough(made):
    sizes = [text.get_fontsize() for text in made.figure.findobj(mpl.text.Text) if text.get_text()]
    assert min(sizes) >= 7.0


def test_the_figure_is_as_wide_as_a_report_and_holds_all_its_text(made):
    width, height = made.figure.get_size_inches()
    assert width * 25.4 == pytest.approx(160.0)
    made.figure.canvas.draw()
    ink = made.figure.get_tightbbox()
    assert shapely.box(0, 0, width, height).contains(shapely.box(*ink.extents))


def test_fields_boundaries_and_points_carry_ids_once_each(made):
    gids = [item.get_gid() for item in made.figure.findobj() if item.get_gid()]
    assert len(gids) == len(set(gids))


def test_ids_name_the_chemistry():
    gids = {item.get_gid() for item in drawn("Fe", 12).ax.get_children()}
    assert {"field-siderite", "field-Fe-2plus", "field-ferrihydrite-2-line", "point-S1-24", "water-O2-H2O"} <= gids
    assert "boundary-siderite-mackinawite" in gids


def test_counts_of_artists():
    chart = chart_of("As")
    made = EphChart().draw(chart).points(samples(12, "As")).finish()
    assert len(by_gid(made.ax, "field-")) == len(chart.fields)
    assert len(by_gid(made.ax, "boundary-")) == len(chart.boundaries)
    assert len(by_gid(made.ax, "point-")) == 12
    assert len(by_gid(made.ax, "name-point-")) == 12
    bars = {item.get_gid(): item.get_segments() for item in by_gid(made.ax, "bars-")}
    assert {gid: len(lines) for gid, lines in bars.items()} == {"bars-pH": 12, "bars-Eh": 12}
    first = samples(12, "As").iloc[0]
    assert bars["bars-Eh"][0][:, 1] == pytest.approx([first.Eh_mV - 30.0, first.Eh_mV + 30.0])


def test_above_forty_points_none_is_named_but_all_are_drawn():
    made = drawn("Fe", 50)
    assert len(by_gid(made.ax, "point-")) == 50
    assert by_gid(made.ax, "name-point-") == []


def test_markers_are_filled_by_their_own_field_and_shaped_by_kind():
    frame = samples(12, "Fe")
    made = EphChart().draw(chart_of("Fe")).points(frame)
    by_name = {line.get_gid(): line for line in by_gid(made.ax, "point-")}
    patches = {patch.get_gid(): patch for patch in by_gid(made.ax, "field-")}
    for row in frame.itertuples():
        line = by_name[f"point-{row.sample}"]
        assert line.get_marker() == {"dissolved": "o", "solid": "s"}[row.kind]
        if row.field == "siderite":
            face = patches["field-siderite"].get_facecolor()
            assert mpl.colors.to_rgba(line.get_markerfacecolor()) == pytest.approx(face)


def test_points_outside_or_incomplete_are_counted_in_the_caption():
    frame = samples(6)
    frame.loc[0, "Eh_mV"], frame.loc[1, "pH"], frame.loc[2, "pH"] = 2000.0, np.nan, 13.0
    made = EphChart().draw(chart_of("Fe")).points(frame).caption(["Drawn at sample S7."]).finish()
    words = by_gid(made.ax, "caption")[0].get_text().replace("\n", " ")
    assert "3 samples shown, 2 outside the axes (S1-24, S3-24), 1 without pH or Eh (S2-24)." in words
    assert "Drawn at sample S7." in words
    assert len(by_gid(made.ax, "point-")) == 3


def test_the_caption_states_the_conditions():
    words = by_gid(drawn("Fe").ax, "caption")[0].get_text().replace("\u00a0", " ").replace("\n", " ")
    for part in (
        "12 °C",
        "total Fe 25 µmol/L (1.4 mg/L)",
        "I 0.008 mol/L",
        "C 5.0 mmol/L",
        "tied by Eh",
        "fresh solids",
    ):
        assert part in words


def test_pe_on_the_right_follows_the_temperature():
    made = drawn("Fe")
    right = next(axis for axis in made.ax.child_axes if axis.get_gid() == "axis-pe")
    made.figure.canvas.draw()
    # RT ln10/F at 12 °C: 8.314462618 · 285.15 · 2.302585 / 96485.33 V
    assert right.get_ylim() == pytest.approx((-400.0 / 56.580, 800.0 / 56.580), rel=1e-4)
    assert right.get_ylabel() == "pe at 12 °C"


def test_water_lines_stand_where_they_are_and_are_named():
    made = drawn("Mn")
    line = by_gid(made.ax, "water-H2O-H2")[0]
    assert line.get_xydata()[0] == pytest.approx([4.0, -56.580 * 4], abs=0.5)
    assert len(by_gid(made.ax, "name-water-")) == 2
    assert len(by_gid(made.ax, "veil-")) == 2


def test_narrow_fields_get_turned_names_and_tiny_ones_a_leader():
    made = EphChart().draw(sliver_chart()).finish()
    turned = {text.get_gid(): text.get_rotation() for text in by_gid(made.ax, "name-field-")}
    assert turned["name-field-siderite"] == pytest.approx(90.0)
    assert turned["name-field-Fe-2plus"] == 0.0
    assert by_gid(made.ax, "leader-name-field-mackinawite")
    shapes = [shape_of(text) for text in names_of(made)]
    assert not overlaps(shapes)


def test_a_second_element_lies_over_the_first():
    over = chart_of("As")
    made = EphChart().draw(chart_of("Fe")).over(over).points(samples(20, "As", 3)).finish()
    assert len(by_gid(made.ax, "over-")) == len(over.boundaries)
    boxed = by_gid(made.ax, "name-over-")
    assert len(boxed) == len(over.fields)
    assert all(text.get_bbox_patch() is not None for text in boxed)
    shapes = [shape_of(text, margin=1.0) for text in names_of(made)]
    assert not overlaps(shapes)
    assert made.ax.get_title(loc="left") == "Arsenic over iron"


def test_the_fan_shades_what_changes_between_two_totals():
    low, high = chart_of("Fe", 0.1), chart_of("Fe", 10.0)
    made = EphChart().draw(chart_of("Fe")).fan(low, high).finish()
    fan = by_gid(made.ax, "fan")[0].get_path()
    middle = next(item for item in chart_of("Fe").boundaries if set(item.between) == {"Fe^2+", "ferrihydrite (2-line)"})
    spot = middle.points.mean(0) * [1.0, 1000.0]
    # one decade of total moves the line by 57 mV at 12 °C
    within = [bool(fan.contains_point((spot[0], spot[1] + shift))) for shift in (-80.0, -40.0, 40.0, 80.0)]
    assert within == [False, True, True, False]
    words = by_gid(made.ax, "caption")[0].get_text()
    assert "P10 and P90" in words


def test_a_fan_without_movement_says_so():
    same = chart_of("Mn")
    made = EphChart().draw(same).fan(same, same).finish()
    assert by_gid(made.ax, "fan") == []
    assert "No line moves" in by_gid(made.ax, "caption")[0].get_text()


def test_a_thousand_points_are_drawn_in_groups():
    made = drawn("Fe", 1000)
    groups = by_gid(made.ax, "points-")
    inside = samples(1000)
    shown = inside["Eh_mV"].between(-400, 800) & inside["pH"].between(4, 10)
    assert sum(len(line.get_xdata()) for line in groups) == shown.sum()
    assert len(groups) <= 4


def test_no_points_at_all():
    made = EphChart().draw(chart_of("Fe")).points(samples(3).iloc[:0]).finish()
    assert "0 samples shown" in by_gid(made.ax, "caption")[0].get_text()


def test_names_with_dollar_signs_are_text_not_formulas():
    frame = samples(2)
    frame["station"], frame["sample"] = ["a$b$", "c_{d}$"], ["x$y$", "z^{"]
    frame.loc[1, "Eh_mV"] = 3000.0
    frame2 = pd.concat([frame, frame.assign(sample=["p$^{", "q"], Eh_mV=[5000.0, 100.0])], ignore_index=True)
    made = EphChart().draw(chart_of("Fe")).points(frame2).finish()
    made.figure.canvas.draw()
    assert len(by_gid(made.ax, "name-point-")) == 2


@pytest.mark.parametrize("suffix", ["svg", "png"])
def test_same_input_same_bytes(tmp_path, suffix):
    def write(folder):
        folder.mkdir()
        made = EphChart().draw(chart_of("As")).fan(chart_of("As", 0.2), chart_of("As", 5.0)).points(samples(12, "As"))
        return {path.suffix[1:]: path.read_bytes() for path in made.caption(["x"]).save(folder / "As.v1", dpi=80)}

    first = write(tmp_path / "a")
    with mpl.rc_context({"font.size": 20, "svg.hashsalt": None, "axes.grid": True, "savefig.bbox": "tight"}):
        second = write(tmp_path / "b")
    assert first[suffix] == second[suffix]
    assert b"2026" not in first["svg"].split(b"<defs>")[0]


def test_saved_files_carry_title_and_ids(tmp_path):
    paths = EphChart().draw(chart_of("Fe")).save(tmp_path / "Fe.1")
    assert [path.name for path in paths] == ["Fe.1.svg", "Fe.1.png"]
    svg = paths[0].read_text(encoding="utf-8")
    assert 'id="field-siderite"' in svg
    assert "Iron: E-pH chart" in svg
    assert "<dc:date>" not in svg


def test_an_axes_of_ones_own_is_used_as_it_is():
    figure = Figure(figsize=(5, 4))
    FigureCanvasAgg(figure)
    ax = figure.add_subplot()
    made = EphChart(ax, window=(5.0, 9.0, -0.3, 0.5)).draw(chart_of("Fe")).finish()
    assert figure.get_size_inches() == pytest.approx([5, 4])
    assert ax.get_xlim() == (5.0, 9.0)
    assert ax.get_ylim() == (-300.0, 500.0)
    assert by_gid(ax, "caption") == []
    assert not overlaps([shape_of(text) for text in names_of(made)])


def test_steps_out_of_order_are_refused():
    with pytest.raises(RuntimeError, match="call `draw` first"):
        EphChart().points(samples(3))
    with pytest.raises(RuntimeError, match="nothing is drawn"):
        EphChart().finish()
    made = drawn("Fe")
    with pytest.raises(RuntimeError, match="already laid out"):
        made.points(samples(3))
    with pytest.raises(RuntimeError, match="already drawn"):
        made.draw(chart_of("Fe"))
