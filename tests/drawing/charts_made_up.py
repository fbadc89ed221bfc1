"""Invented samples and small helpers that read a finished drawing back."""

import numpy as np
import pandas as pd
import shapely
from matplotlib.text import Text

from gley.stability import Boundary, Chart, Conditions, Field, chart

WINDOW = (4.0, 10.0, -0.4, 0.8)
LIGANDS = {"As": {"S": 6.4e-4}, "Fe": {"C": 5e-3, "S": 6.4e-4}, "Mn": {"C": 5e-3}}
TOTALS = {"As": 1e-6, "Fe": 2.5e-5, "Mn": 1e-5}
FIELDS = {
    "As": (("HAsO4^2-", "dissolved"), ("H3AsO3(aq)", "dissolved"), ("arsenic trisulfide (amorphous)", "solid")),
    "Fe": (("ferrihydrite (2-line)", "solid"), ("Fe^2+", "dissolved"), ("siderite", "solid"), ("mackinawite", "solid")),
    "Mn": (("birnessite", "solid"), ("Mn^2+", "dissolved"), ("rhodochrosite", "solid"), ("", "")),
}


def chart_of(element, factor=1.0, window=WINDOW, **more):
    return chart(
        element, factor * TOTALS[element], 12.0, ionic_strength_M=0.008, ligands=LIGANDS[element], window=window, **more
    )


def samples(count, element="Fe", seed=1):
    """Half of them in a tight cluster, the rest spread over natural waters."""
    random = np.random.default_rng(seed)
    pH, Eh = random.normal(7.1, 0.4, count), random.normal(80.0, 150.0, count)
    half = count // 2
    pH[:half], Eh[:half] = random.normal(6.9, 0.08, half), random.normal(210.0, 18.0, half)
    chosen = [FIELDS[element][k] for k in random.integers(0, len(FIELDS[element]), count)]
    return pd.DataFrame({
        "sample": [f"S{k + 1}-24" for k in range(count)], "station": [f"MW-{k + 1}" for k in range(count)],
        "pH": pH, "pH_sd": 0.1, "Eh_mV": Eh, "Eh_sd_mV": 30.0,
        "field": [name for name, _ in chosen], "kind": [kind for _, kind in chosen], "outcome": "clear",
    })  # fmt: skip


def sliver_chart():
    """Hand-made: a broad field, a narrow upright one, a narrow slanting one and one too small for any name."""
    water = {"O2/H2O": np.array([[0, 1.23], [14, 0.40]]), "H2O/H2": np.array([[0, 0.0], [14, -0.83]])}
    rings = {
        "Fe^2+": [[0, -1], [8, -1], [8, 1.5], [0, 1.5], [0, -1]],
        "siderite": [[8, -1], [8.8, -1], [8.8, 1.5], [8, 1.5], [8, -1]],
        "goethite": [[8.8, -1], [14, 0.9], [14, 1.5], [8.8, 1.5], [8.8, -1]],
        "Fe(OH)3^-": [[8.8, -1], [14, 0.65], [14, 0.9], [8.8, -1]],
        "pyrite": [[8.8, -1], [13.8, -1], [13.8, 0.5865384615], [8.8, -1]],
        "mackinawite": [[13.8, -1], [14, -1], [14, 0.65], [13.8, 0.5865384615], [13.8, -1]],
    }
    kinds = {"Fe^2+": ("Fe^2+", "dissolved"), "Fe(OH)3^-": ("Fe(OH)3^-", "dissolved"), "siderite": ("FeCO3", "solid")}
    kinds |= {"goethite": ("FeO(OH)", "solid"), "pyrite": ("FeS2", "solid"), "mackinawite": ("FeS", "solid")}
    fields = tuple(
        Field(name, *kinds[name], "Fe(III)" if name == "goethite" else "Fe(II)", ((np.array(ring, float),),))
        for name, ring in rings.items()
    )
    edges = tuple(
        Boundary(pair, "", "", 0.0, 1.0, kind, 0.0, 0.0, None, np.array(points, float))
        for pair, kind, points in (
            (("Fe^2+", "siderite"), "vertical", [[8, -1], [8, 1.5]]),
            (("siderite", "goethite"), "vertical", [[8.8, -1], [8.8, 1.5]]),
            (("goethite", "Fe(OH)3^-"), "sloped", [[8.8, -1], [14, 0.9]]),
            (("Fe(OH)3^-", "pyrite"), "sloped", [[8.8, -1], [13.8, 0.5865384615]]),
            (("pyrite", "mackinawite"), "vertical", [[13.8, -1], [13.8, 0.5865384615]]),
        )
    )
    return Chart("Fe", Conditions(25.0, 0.01, 1e-5), (0.0, 14.0, -1.0, 1.5), fields, edges, water)


def by_gid(ax, start):
    """Artists of an axes whose id starts so."""
    return [item for item in ax.get_children() if (item.get_gid() or "").startswith(start)]


def shape_of(text: Text, margin=0.0):
    """The turned rectangle a text covers, pixels."""
    angle = text.get_rotation()
    text.set_rotation(0.0)
    extent = text.get_window_extent()
    text.set_rotation(angle)
    flat = shapely.box(extent.x0 - margin, extent.y0 - margin, extent.x1 + margin, extent.y1 + margin)
    middle = shapely.Point((extent.x0 + extent.x1) / 2, (extent.y0 + extent.y1) / 2)
    return shapely.affinity.rotate(flat, angle, origin=middle)


def markers_of(ax, start):
    """Boxes of single markers with their edge, pixels."""
    found = []
    for line in by_gid(ax, start):
        reach = (line.get_markersize() + line.get_markeredgewidth()) / 2 * ax.figure.dpi / 72
        x, y = ax.transData.transform(np.column_stack(line.get_data()))[0]
        found.append(shapely.box(x - reach, y - reach, x + reach, y + reach))
    return found


def overlaps(shapes, others=None, least=1.0):
    """Pairs of shapes that share more than `least` square pixels."""
    pairs = []
    for i, a in enumerate(shapes):
        for j, b in enumerate(shapes[i + 1 :] if others is None else others):
            if a.intersection(b).area > least:
                pairs.append((i, j))
    return pairs
