"""Lines between fields, from the pieces' own edges: which two forms meet, in which ligand state, by which reaction."""

from collections import defaultdict
from collections.abc import Iterator, Mapping
from dataclasses import dataclass

import numpy as np
import shapely

from gley.constants import nernst_slope_mV
from gley.stability.chart_types import Boundary
from gley.stability.data import COMPANION, SULFUR, Species, species
from gley.stability.environment import Environment
from gley.stability.reactions import Reaction, between, shown
from gley.stability.strips import Piece, Plane
from gley.stability.water import features, pool, pool_terms

SNAP = 1e-9
"""Grid on which vertices of neighbouring strips become one, in pH and V."""

_ALIKE = 1e-7
_PARALLEL = 0.35  # sine; pool sums bend an edge away from the straight line of its forms, but not by 20 degrees


@dataclass(frozen=True)
class Edge:
    """A straight piece of the line between two pieces: `ends` (2, 2) of pH and pe."""

    a: Piece
    b: Piece
    ends: np.ndarray


@dataclass(frozen=True)
class Setting:
    """What reactions are written with: the plane, its conditions, log10 totals of ligand channels."""

    plane: Plane
    temperature_C: float
    ionic_strength_M: float
    log_ligands: Mapping[str, float]

    @property
    def X0(self) -> np.ndarray:
        """Features at pH 0."""
        return features(np.zeros(1), self.temperature_C, self.ionic_strength_M)

    def forms(self) -> list[list[dict[str, Species]]]:
        """By environment and strip: the form of each ligand element (largest of its pool, or the companion's field)."""
        nodes = self.plane.nodes
        middle = 0.5 * (nodes[:-1] + nodes[1:])
        X = self.plane.bath_at(middle).X
        table = []
        for environment in self.plane.environments(middle):
            state, _, candidate = environment.state.partition(COMPANION)
            columns = {}
            for channel in self.plane.target.channels:
                if channel == COMPANION and candidate:
                    columns[channel] = self._companion(X, environment, int(candidate))
                elif channel != COMPANION:
                    tied = state.strip() if channel in SULFUR else ""
                    columns[channel] = largest(tied or channel, X)
            table.append([{channel: column[s] for channel, column in columns.items()} for s in range(len(middle))])
        return table

    def _companion(self, X: np.ndarray, environment: Environment, candidate: int) -> list[Species]:
        iron = self.plane.choice.system(COMPANION)
        lines = iron.lines(X, np.full(len(X), self.log_ligands[COMPANION]), environment)
        return [iron.members[k] for k in lines.forms(np.full(len(X), candidate))]


def largest(channel: str, X: np.ndarray) -> list[Species]:
    """The largest form of a ligand channel (or pure sulfur) at each row of features (n, 7)."""
    if channel == "S(0)":
        return [species()["sulfur (rhombic)"]] * len(X)
    return [pool(channel)[k] for k in pool_terms(channel, X).argmax(axis=1)]


def edges(pieces: list[Piece], nodes: np.ndarray) -> Iterator[Edge]:
    """All edges between pieces of different name; `nodes` are the strips' limits."""
    for found in (_rival_edges(pieces), _side_edges(pieces, nodes), _fence_edges(pieces)):
        yield from (edge for edge in found if edge.a.member != edge.b.member)


def _ends(piece: Piece, k: int) -> np.ndarray:
    return piece.points[[k, (k + 1) % len(piece.points)]]


def _rival_edges(pieces: list[Piece]) -> Iterator[Edge]:
    """Edges within one strip and ligand state, each once."""
    by_cell = {(item.strip, item.environment, item.candidate): item for item in pieces}
    for item in pieces:
        for k, label in enumerate(item.labels):
            if label[0] != "rival":
                continue
            other = by_cell.get((item.strip, item.environment, label[1]))
            if other is not None and item.candidate < other.candidate:
                yield Edge(item, other, _ends(item, k))


def _labelled(pieces: list[Piece], word: str) -> dict[int, list[tuple[Piece, np.ndarray]]]:
    found = defaultdict(list)
    for item in pieces:
        for k, label in enumerate(item.labels):
            if label[0] == word:
                found[item.strip].append((item, _ends(item, k)))
    return found


def _sides(pieces: list[Piece], nodes: np.ndarray, side: int) -> dict[int, list[tuple[Piece, np.ndarray]]]:
    """Edges on the left (0) or right (1) limit of each strip, those against a rival included: where a vertical line
    runs along the limit, rounding leaves the rival no piece of its own in this strip.
    """
    found = _labelled(pieces, ("left", "right")[side])
    for strip, own in _labelled(pieces, "rival").items():
        limit = nodes[strip + side]
        found[strip] += [(item, ends) for item, ends in own if np.abs(ends[:, 0] - limit).max() < SNAP]
    return found


def _side_edges(pieces: list[Piece], nodes: np.ndarray) -> Iterator[Edge]:
    """Edges between neighbouring strips: where the largest form of a pool changes, and vertical lines."""
    right, left = _sides(pieces, nodes, 1), _sides(pieces, nodes, 0)
    for strip, own in right.items():
        for item, ends in own:
            for other, others in left.get(strip + 1, []):
                lo = max(ends[:, 1].min(), others[:, 1].min())
                hi = min(ends[:, 1].max(), others[:, 1].max())
                if hi - lo > _ALIKE:
                    yield Edge(item, other, np.array([[ends[0, 0], lo], [ends[0, 0], hi]]))


def _fence_edges(pieces: list[Piece]) -> Iterator[Edge]:
    """Edges where a ligand changes its state and the field with it."""
    for own in _labelled(pieces, "fence").values():
        for n, (item, ends) in enumerate(own):
            for other, others in own[n + 1 :]:
                if other.environment != item.environment:
                    shared = _overlap(ends, others)
                    if shared is not None:
                        yield Edge(item, other, shared)


def _overlap(a: np.ndarray, b: np.ndarray) -> np.ndarray | None:
    """The common part of two segments on one straight line; None where there is none."""
    direction = a[1] - a[0]
    length = float(np.hypot(*direction))
    if length < _ALIKE:
        return None
    unit = direction / length
    off = (b - a[0]) @ np.array([-unit[1], unit[0]])
    if np.abs(off).max() > _ALIKE:
        return None
    along = (b - a[0]) @ unit
    lo, hi = max(0.0, along.min()), min(length, along.max())
    return None if hi - lo < _ALIKE else np.array([a[0] + lo * unit, a[0] + hi * unit])


def boundaries(pieces: list[Piece], setting: Setting, shortest: float) -> tuple[Boundary, ...]:
    """Lines between fields in pH and V, chained; those shorter than `shortest` (pH and V units) are left out."""
    groups: dict[tuple, list[np.ndarray]] = defaultdict(list)
    lines: dict[tuple, Line] = {}
    volt = nernst_slope_mV(setting.temperature_C) / 1000.0
    ligands = setting.forms()
    for edge in edges(pieces, setting.plane.nodes):
        options = [ligands[piece.environment][piece.strip] for piece in (edge.a, edge.b)]
        line = _line(edge, options, setting)
        key = (frozenset(line.between), line.reaction.text, line.ligand_forms)
        lines[key] = line
        groups[key].append(edge.ends * [1.0, volt])
    paths = [(lines[key], path) for key, parts in groups.items() for path in _chains(parts)]
    return tuple(_boundary(line, path, volt) for line, path in paths if path.length > shortest)


@dataclass(frozen=True)
class Line:
    """What one line says: the two fields, the reaction that it follows, and the forms of the ligands on it."""

    between: tuple[str, str]
    reaction: Reaction
    ligand_forms: str


def _line(edge: Edge, options: list[dict[str, Species]], setting: Setting) -> Line:
    """The reaction whose line runs as the edge does.

    Between two fields of one ligand state that is their own reaction. Where the ligand changes its state one side's
    form tells it, or, when the two fields meet there only because a complex of the ligand ends, the ligand's reaction.
    """
    a, b = (setting.plane.target.members[piece.member] for piece in (edge.a, edge.b))
    found = []
    for forms in options:
        reaction = between(a, b, forms, setting.plane.log_total, setting.log_ligands, setting.X0)
        named = {shown(form) for channel, form in forms.items() if channel in a.others or channel in b.others}
        names = (reaction.left.name, reaction.right.name)
        found.append((_miss(reaction, edge), Line(names, reaction, ", ".join(sorted(named)))))
    least, line = min(found, key=lambda item: item[0])
    if least < _PARALLEL:
        return line
    for channel, form in options[0].items():
        other = options[1].get(channel, form)
        if other.name != form.name:
            total = setting.log_ligands[channel]
            reaction = between(form, other, options[0], total, setting.log_ligands, setting.X0)
            names = (a.name, b.name) if reaction.left.name == form.name else (b.name, a.name)
            forms_text = ", ".join(sorted({shown(form), shown(other)}))
            found.append((_miss(reaction, edge), Line(names, reaction, forms_text)))
    return min(found, key=lambda item: item[0])[1]


def _miss(reaction: Reaction, edge: Edge) -> float:
    """Sine of the angle between the reaction's line and the edge, in (pH, pe)."""
    step = edge.ends[1] - edge.ends[0]
    ideal = np.array([reaction.electrons, -reaction.protons])
    size = np.hypot(*ideal) * np.hypot(*step)
    return abs(ideal[0] * step[1] - ideal[1] * step[0]) / size if size else 1.0


def _chains(parts: list[np.ndarray]) -> list[shapely.LineString]:
    """Segments joined to polylines, straight runs reduced to their ends."""
    lines = shapely.set_precision(shapely.multilinestrings([shapely.linestrings(part) for part in parts]), SNAP)
    merged = shapely.line_merge(shapely.union_all([lines]))
    return [shapely.simplify(part, 10 * SNAP) for part in shapely.get_parts(merged)]


def _boundary(line: Line, path: shapely.LineString, volt: float) -> Boundary:
    reaction, points = line.reaction, shapely.get_coordinates(path)
    if tuple(points[0]) > tuple(points[-1]):
        points = points[::-1]
    slope, start = reaction.slope, reaction.pe_at_pH0
    return Boundary(
        between=line.between, ligand_forms=line.ligand_forms, reaction=reaction.text,
        protons=reaction.protons, electrons=reaction.electrons, kind=reaction.kind,
        slope_mV_per_pH=None if slope is None else 1000 * volt * slope + 0.0,  # + 0.0: no minus zero
        E_mV_at_pH0=None if start is None else 1000 * volt * start,
        pH=float(points[:, 0].mean()) if reaction.kind == "vertical" else None, points=points,
    )  # fmt: skip
