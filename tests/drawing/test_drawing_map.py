"""Site maps, read back artist by artist. The places are invented."""

import geopandas
import matplotlib as mpl
import numpy as np
import pytest
import shapely
from charts_made_up import by_gid, markers_of, overlaps, shape_of
from pyproj import Geod

from gley.drawing import SiteMap, style
from gley.drawing.ground import Ground, nice_length
from gley.drawing.spread import side_by_side

PROCESSES = ["O2", "NO3", "Mn(IV)", "Fe(III)", "SO4", "CH4", "undetermined", ""]


def wells(count=24, crs="EPSG:25832", rounds=1, seed=4):
    """Wells of an invented site, every sixth nested beside the one before it."""
    random = np.random.default_rng(seed)
    xy = np.column_stack([500120 + random.uniform(0, 420, count), 5400310 + random.uniform(0, 300, count)])
    for k in range(5, count, 6):
        xy[k] = xy[k - 1] + [1.5, 0.5]
    rows = [(f"MW-{k + 1}-{n + 1}", f"MW-{k + 1}", shapely.Point(xy[k])) for k in range(count) for n in range(rounds)]
    frame = geopandas.GeoDataFrame(
        {"sample": [row[0] for row in rows], "station": [row[1] for row in rows]},
        geometry=[row[2] for row in rows], crs="EPSG:25832",
    )  # fmt: skip
    chosen = random.integers(0, len(PROCESSES), len(frame))
    return frame.to_crs(crs).assign(category=[PROCESSES[k] for k in chosen])


CASES = {
    "utm": wells(), "degrees": wells(crs="EPSG:4326"), "feet": wells(8, crs="EPSG:2263"),
    "mercator": wells(crs="EPSG:3857"),
    "two rounds": wells(16, rounds=2), "one well": wells(1), "five rounds": wells(10, rounds=5),
}  # fmt: skip


@pytest.fixture(autouse=True)
def house_style():
    """Texts are measured as they are saved."""
    with style.look():
        yield


@pytest.fixture(scope="module", params=CASES)
def made(request):
    return SiteMap().draw(CASES[request.param], "category", title="Redox process from chemistry"), CASES[request.param]


def test_every_sample_has_a_marker_and_no_marker_covers_another(made):
    drawn, frame = made
    markers = markers_of(drawn.ax, "place-")
    assert len(markers) == len(frame)
    # stars and triangles reach beyond the common size a little
    assert not overlaps(markers, least=12.0)


def test_names_meet_neither_each_other_nor_markers_nor_the_scale(made):
    drawn, frame = made
    names = by_gid(drawn.ax, "name-")
    assert len(names) == frame["station"].nunique()
    shapes = [shape_of(text) for text in names]
    fixed = [shapely.box(*item.get_window_extent().extents) for item in by_gid(drawn.ax, "scale-")]
    fixed += [shapely.box(*item.get_window_extent().extents) for item in by_gid(drawn.ax, "north")]
    assert not overlaps(shapes)
    assert not overlaps(shapes, markers_of(drawn.ax, "place-"))
    assert not overlaps(shapes, fixed)
    frame_box = shapely.box(*drawn.ax.get_window_extent().extents)
    assert all(frame_box.contains(shape) for shape in shapes)


def test_the_scale_bar_is_as_long_on_the_ground_as_it_says(made):
    drawn, frame = made
    bars = [item for item in by_gid(drawn.ax, "scale-") if item.get_gid() in ("scale-0", "scale-1")]
    words = by_gid(drawn.ax, "scale-length")[0].get_text()
    x0, x1 = bars[0].get_x(), bars[1].get_x() + bars[1].get_width()
    y = np.mean(drawn.ax.get_ylim())
    ends = geopandas.GeoSeries([shapely.Point(x0, y), shapely.Point(x1, y)], crs=frame.crs).to_crs("EPSG:4326")
    *_, length = Geod(ellps="GRS80").inv(ends[0].x, ends[0].y, ends[1].x, ends[1].y)
    assert words.endswith(" m")
    assert length == pytest.approx(float(words[:-2]), rel=0.005)


def test_a_metre_is_as_long_up_as_across(made):
    drawn, frame = made
    x, y = np.mean(drawn.ax.get_xlim()), np.mean(drawn.ax.get_ylim())
    step = 1e-4 if frame.crs.is_geographic else 20.0
    lengths = []
    for dx, dy in ((step, 0.0), (0.0, step)):
        spots = geopandas.GeoSeries([shapely.Point(x, y), shapely.Point(x + dx, y + dy)], crs=frame.crs).to_crs(4326)
        *_, ground = Geod(ellps="GRS80").inv(spots[0].x, spots[0].y, spots[1].x, spots[1].y)
        pixels = np.ptp(drawn.ax.transData.transform([(x, y), (x + dx, y + dy)]), axis=0).max()
        lengths.append(pixels / ground)
    assert lengths[0] == pytest.approx(lengths[1], rel=0.01)


def test_axes_name_the_reference_system_and_show_whole_coordinates(made):
    drawn, frame = made
    drawn.figure.canvas.draw()
    assert frame.crs.name in drawn.ax.get_xlabel()
    assert ":".join(frame.crs.to_authority()) in drawn.ax.get_xlabel()
    for axis in (drawn.ax.xaxis, drawn.ax.yaxis):
        assert axis.get_offset_text().get_text() == ""
        values, words = axis.get_ticklocs(), [text.get_text() for text in axis.get_ticklabels()]
        assert len(values) >= 2
        assert [float(word.replace("−", "-")) for word in words] == pytest.approx(list(values))


def test_everything_fits_the_figure(made):
    drawn, _ = made
    width, height = drawn.figure.get_size_inches() * drawn.figure.dpi
    page = shapely.box(0, 0, width, height)
    drawn.figure.canvas.draw()
    for text in drawn.figure.findobj(mpl.text.Text):
        if text.get_text() and text.get_visible():
            assert page.covers(shapely.box(*text.get_window_extent().extents)), text.get_text()
            assert text.get_fontsize() >= 7.0


def test_labels_of_ticks_do_not_touch(made):
    drawn, _ = made
    drawn.figure.canvas.draw()
    for axis in (drawn.ax.xaxis, drawn.ax.yaxis):
        assert not overlaps([shapely.box(*text.get_window_extent().extents) for text in axis.get_ticklabels()])


def test_samples_without_a_place_are_counted_not_drawn():
    frame = wells(6)
    frame.loc[[1, 4], "geometry"] = None
    drawn = SiteMap().draw(frame, "category")
    assert len(by_gid(drawn.ax, "place-")) == 4
    words = by_gid(drawn.ax, "caption")[0].get_text()
    assert words.startswith("4 samples shown, 2 without a place (MW-2-1, MW-5-1).")


def test_no_sample_with_a_place_still_makes_a_map():
    frame = wells(2)
    frame["geometry"] = geopandas.GeoSeries([None, None], crs=frame.crs)
    drawn = SiteMap().draw(frame, "category")
    assert by_gid(drawn.ax, "caption")[0].get_text().startswith("0 samples shown, 2 without a place")


def test_colour_shape_and_legend_go_by_category_and_those_not_assigned_are_hollow():
    frame = wells(24)
    drawn = SiteMap().draw(frame, "category")
    looks = {}
    for line, category in zip(by_gid(drawn.ax, "place-"), frame["category"], strict=True):
        looks.setdefault(category, set()).add((line.get_marker(), line.get_markerfacecolor()))
    assert all(len(found) == 1 for found in looks.values())
    assert len({next(iter(found)) for found in looks.values()}) == frame["category"].nunique()
    assert next(iter(looks[""]))[1] == "white"
    words = [text.get_text() for text in by_gid(drawn.ax, "legend")[0].get_texts()]
    assert f"Fe(III) ({(frame['category'] == 'Fe(III)').sum()})" in words


def test_rounds_at_one_place_stand_side_by_side_under_one_name():
    frame = wells(1, rounds=2)
    drawn = SiteMap().draw(frame, "category")
    first, second = (line.get_xydata()[0] for line in by_gid(drawn.ax, "place-"))
    assert first[0] < frame.geometry[0].x < second[0]
    assert first[1] == pytest.approx(second[1])
    assert [text.get_text() for text in by_gid(drawn.ax, "name-")] == ["MW-1"]
    assert "side by side" in by_gid(drawn.ax, "caption")[0].get_text().replace("\n", " ")


def test_side_by_side_leaves_lonely_markers_alone():
    points = np.array([[0.0, 0.0], [100.0, 0.0], [101.0, 0.0], [50.0, 50.0]])
    placed, moved, astray = side_by_side(points, 10.0)
    assert moved.tolist() == [False, True, True, False]
    assert placed[0] == pytest.approx(points[0])
    assert placed[2, 0] - placed[1, 0] >= 10.0
    assert placed[1:3].mean(0) == pytest.approx([100.5, 0.0])
    assert not astray.any()


def test_lengths_of_a_degree():
    # one degree of longitude at 60° N is half of one at the equator, of latitude 111.4 km (GRS 80)
    ground = Ground("EPSG:4326", np.array([[10.0, 60.0]]))
    assert ground.metres == pytest.approx([55_800.0, 111_412.0], rel=0.001)
    assert Ground("EPSG:3857", np.array([[0.0, 8_399_737.9]])).metres == pytest.approx([0.5, 0.5], rel=0.005)


@pytest.mark.parametrize(
    ("most", "length"), [(99.0, 50.0), (100.0, 100.0), (260.0, 200.0), (7.0, 5.0), (1999.0, 1000.0)]
)
def test_scale_bars_have_round_lengths(most, length):
    assert nice_length(most) == pytest.approx(length)


def test_station_names_that_are_missing_fall_back_to_the_sample():
    frame = wells(2)
    frame["station"] = ["", "W$1$"]
    drawn = SiteMap().draw(frame, "category")
    drawn.figure.canvas.draw()
    assert {text.get_text() for text in by_gid(drawn.ax, "name-")} == {"MW-1-1", "W$1$"}


def test_same_input_same_bytes(tmp_path):
    first, second = (
        [path.read_bytes() for path in SiteMap().draw(wells(), "category", title="x").save(tmp_path / name, dpi=80)]
        for name in "ab"
    )
    assert first == second
    assert b"<dc:date>" not in first[0]


def test_a_map_is_drawn_once():
    drawn = SiteMap().draw(wells(2), "category")
    with pytest.raises(RuntimeError, match="already drawn"):
        drawn.draw(wells(2), "category")
