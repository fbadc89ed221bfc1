"""One map over another: regions tile the window, and a point in a region lies in both of its fields."""

import numpy as np
import pytest
import shapely

from gley.errors import UsageError
from gley.stability import chart, overlay

LIGANDS = {"C": 2e-3, "S": 1e-3}


@pytest.fixture(scope="module")
def pair():
    return chart("Fe", 1e-5, ligands=LIGANDS), chart("As", 1e-7, ligands=LIGANDS)


def shape_of(item):
    return shapely.union_all([shapely.Polygon(rings[0], rings[1:]) for rings in item.polygons])


def test_regions_tile_the_window_and_are_named_by_both_fields(pair):
    under, over = pair
    found = overlay(under, over)
    assert sum(item.share for item in found) == pytest.approx(1.0, abs=1e-4)
    assert [item.share for item in found] == sorted((item.share for item in found), reverse=True)
    assert {item.over for item in found} <= {field.name for field in over.fields}
    assert {item.under for item in found} <= {field.name for field in under.fields}
    assert len({(item.over, item.under) for item in found}) == len(found)


def test_a_point_in_a_region_lies_in_both_fields(pair):
    under, over = pair
    shapes = [{item.name: shape_of(item) for item in part.fields} for part in (over, under)]
    rng = np.random.default_rng(5)
    for item in overlay(under, over)[:12]:
        region = shapely.union_all([shapely.Polygon(rings[0], rings[1:]) for rings in item.polygons])
        low_x, low_y, high_x, high_y = region.bounds
        points = shapely.points(rng.uniform(low_x, high_x, 400), rng.uniform(low_y, high_y, 400))
        inside = points[shapely.contains(region.buffer(-1e-6), points)]
        assert len(inside)
        for names, shape in zip((item.over, item.under), shapes, strict=True):
            assert shapely.covers(shape[names].buffer(1e-6), inside).all()


def test_arsenate_lies_over_ferrihydrite_where_practice_finds_it_sorbed(pair):
    # common practice: at pH 7.5 and +200 mV arsenate meets ferric oxide, at −100 mV and pH 6.5 arsenite dissolved iron
    under, over = pair
    at = {}
    for pH, E in ((7.5, 0.2), (6.5, -0.1)):
        for item in overlay(under, over):
            region = shapely.union_all([shapely.Polygon(rings[0], rings[1:]) for rings in item.polygons])
            if shapely.contains_xy(region, pH, E):
                at[pH, E] = (item.over, item.under)
    assert at == {(7.5, 0.2): ("HAsO4^2-", "ferrihydrite (2-line)"), (6.5, -0.1): ("H3AsO3(aq)", "Fe^2+")}


def test_charts_that_do_not_fit_are_refused(pair):
    under, _ = pair
    with pytest.raises(UsageError, match="over itself"):
        overlay(under, chart("Fe", 1e-6))
    with pytest.raises(UsageError, match="same range"):
        overlay(under, chart("As", 1e-6, window=(4.0, 10.0, -0.4, 0.8)))
