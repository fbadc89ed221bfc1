"""Names beside points: near their marker, clear of all markers and names, with a leader line where they stand off."""

import numpy as np
import shapely

from gley.drawing.room import Room, Spot, Words, boxes_meet, segments_cross, segments_meet_boxes

MOST_LABELS = 40
"""Points up to which each is named."""

_ANGLES = np.deg2rad([0, 180, 30, 330, 150, 210, 60, 300, 120, 240, 90, 270, 15, 345, 165, 195, 45, 315, 135, 225])
_REACH_PT = np.array([0.5, 3.0, 7.0, 12.0, 18.0, 26.0, 36.0, 48.0, 62.0, 78.0, 96.0])
_LEADER_FROM_PT = 5.0
_LINE, _LEADER, _ALONG, _CROSSING, _NEVER = 45.0, 6.0, 40.0, 60.0, 1e6


class _Candidates:
    """All places one name may take: boxes (n, 4), leader ends (n, 2), cost (n,) by what doesn't move."""

    def __init__(self, room: Room, words: Words, point: np.ndarray, radius: float, away: np.ndarray) -> None:
        width, height = room.size(words)
        ring = np.column_stack([np.cos(_ANGLES), np.sin(_ANGLES)])
        reach = radius + _REACH_PT * room.pt
        centres = (reach[:, None, None] * ring + ring * [width / 2, height / 2]).reshape(-1, 2) + point
        self.centres, self.point = centres, point
        half = np.array([width / 2, height / 2])
        self.boxes = np.hstack([centres - half, centres + half])
        self.ends = np.clip(point, self.boxes[:, :2], self.boxes[:, 2:])
        gap = np.hypot(*(self.ends - point).T) - radius
        self.far = gap > _LEADER_FROM_PT * room.pt
        turn = 1.0 - np.tile(ring, (len(reach), 1)) @ away
        order = np.tile(np.arange(len(_ANGLES)), len(reach))
        self.cost = gap / room.pt + 4.0 * turn + 0.05 * order + _LEADER * self.far


def label_points(room: Room, points: np.ndarray, names: list[str], radius: float, size: float) -> list[Spot | None]:
    """A place for each name.

    Parameters
    ----------
    room : Room
        With the markers and all other words marked as taken, and the lines to keep off.
    points : ndarray (n, 2)
        Marker centres, pixels.
    names : list of str
        One per point.
    radius : float
        Half the width of a marker, pixels.
    size : float
        Type size, pt.

    Returns
    -------
    list of Spot or None
        None for a name that found no free place; `target` is the point itself where a leader line is needed.
    """
    if not len(points):
        return []
    words = [Words(name, size, math=False) for name in names]
    tables = [
        _Candidates(room, word, point, radius, away)
        for word, point, away in zip(words, points, _away(points), strict=True)
    ]
    edges = shapely.union_all(room.lines).buffer(room.pt) if room.lines else None
    for table in tables:
        _fixed_cost(room, table, points, radius, edges)
    chosen: dict[int, int] = {}
    order = sorted(range(len(tables)), key=lambda i: (int((tables[i].cost < _NEVER).sum()), i))
    for _ in range(4):
        before = dict(chosen)
        for i in order:
            chosen.pop(i, None)
            cost = tables[i].cost + _moving_cost(tables, chosen, i)
            k = int(np.round(cost, 6).argmin())
            if cost[k] < _NEVER:
                chosen[i] = k
        if chosen == before:
            break
    return [_spot(words[i], tables[i], chosen.get(i)) for i in range(len(tables))]


def _spot(words: Words, table: _Candidates, k: int | None) -> Spot | None:
    if k is None:
        return None
    target = (float(table.point[0]), float(table.point[1])) if table.far[k] else None
    return Spot(words, (float(table.centres[k, 0]), float(table.centres[k, 1])), shapely.box(*table.boxes[k]), target)


def _away(points: np.ndarray) -> np.ndarray:
    """Unit directions (n, 2) away from the near neighbours, zero where a point stands alone."""
    offset = points[:, None] - points[None]
    distance = np.hypot(offset[..., 0], offset[..., 1])
    near = np.exp(-((distance / 60.0) ** 2))
    np.fill_diagonal(near, 0.0)
    pull = (offset * near[..., None]).sum(1)
    length = np.hypot(*pull.T)[:, None]
    return np.where(length > 1.0, pull / np.maximum(length, 1e-9), 0.0)


def _fixed_cost(room: Room, table: _Candidates, points: np.ndarray, radius: float, edges) -> None:
    """Add what the axes, taken shapes, lines (`edges`, a strip along them) and other markers make of each candidate."""
    shapes = shapely.box(*table.boxes.T)
    table.cost += _NEVER * ~room.within(shapes)
    table.cost += _NEVER * room.blocked(shapes)
    table.cost += _LINE * room.crossed(shapes)
    leaders = shapely.linestrings(np.stack([np.broadcast_to(table.point, table.ends.shape), table.ends], axis=1))
    table.cost += 2 * _CROSSING * (table.far & room.over_words(leaders))
    if edges is not None:
        on_line = shapely.length(shapely.intersection(leaders, edges))
        table.cost += _ALONG * (table.far & (on_line > 10.0 * room.pt))
    others = points[np.hypot(*(points - table.point).T) > 1e-9]
    if len(others):
        boxes = np.hstack([others - radius, others + radius])
        through = segments_meet_boxes(table.ends, np.broadcast_to(table.point, table.ends.shape), boxes).any(1)
        table.cost += _CROSSING * (through & table.far)


def _moving_cost(tables: list[_Candidates], chosen: dict[int, int], own: int) -> np.ndarray:
    """What the names placed so far make of each candidate of one name."""
    table = tables[own]
    if not chosen:
        return np.zeros(len(table.cost))
    placed = [(tables[i], k) for i, k in chosen.items()]
    boxes = np.array([other.boxes[k] for other, k in placed])
    ends = np.array([other.ends[k] for other, k in placed])
    starts = np.array([other.point for other, _ in placed])
    far = np.array([other.far[k] for other, k in placed])
    point = np.broadcast_to(table.point, table.ends.shape)
    cost = _NEVER * boxes_meet(table.boxes, boxes).any(1)
    own_leader = segments_meet_boxes(point, table.ends, boxes).any(1) & table.far
    on_leader = (segments_meet_boxes(starts, ends, table.boxes) & far[:, None]).any(0)
    crossing = (segments_cross(point, table.ends, starts, ends) & far[None]).any(1) & table.far
    return cost + _CROSSING * (own_leader.astype(float) + on_leader + crossing)
