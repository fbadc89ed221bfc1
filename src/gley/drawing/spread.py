"""Markers that would overlap, set side by side around their common middle."""

import numpy as np

from gley.drawing.room import boxes_meet

MOST_MOVED = 200
"""Points above which all stay where they are: a crowd is read as a crowd."""

_IN_A_ROW = 4
_STRAY = 0.75


def side_by_side(points: np.ndarray, size: float) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Places for markers of a size so that none covers another.

    Parameters
    ----------
    points : ndarray (n, 2)
        True places, pixels.
    size : float
        Width of a marker, pixels.

    Returns
    -------
    (ndarray (n, 2), ndarray of bool (n,), ndarray of bool (n,))
        Where each is drawn (members of a group in their order), which have moved, and which of them belong to a place
        of their own away from the group's middle.
    """
    if len(points) < 2 or len(points) > MOST_MOVED:
        return points.copy(), np.zeros(len(points), bool), np.zeros(len(points), bool)
    groups = [[k] for k in range(len(points))]
    while True:
        boxes = np.array([_box(points, group, size) for group in groups])
        boxes += [1e-6, 1e-6, -1e-6, -1e-6]
        meets = boxes_meet(boxes, boxes)
        np.fill_diagonal(meets, False)
        if not meets.any():
            break
        i, j = (int(k) for k in np.argwhere(meets)[0])
        merged = sorted(groups[i] + groups[j])
        groups = [group for k, group in enumerate(groups) if k not in (i, j)] + [merged]
    placed = points.astype(float).copy()
    astray = np.zeros(len(points), bool)
    for group in groups:
        if len(group) > 1:
            placed[group] = _slots(points, group, size)
            astray[group] = np.hypot(*(points[group] - points[group].mean(0)).T) > _STRAY * size
    return placed, np.hypot(*(placed - points).T) > 0.01 * size, astray


def _slots(points: np.ndarray, group: list[int], size: float) -> np.ndarray:
    """Rows of slots centred on the middle of a group."""
    wide = len(group) if len(group) <= _IN_A_ROW else int(np.ceil(np.sqrt(len(group))))
    rows = [group[k : k + wide] for k in range(0, len(group), wide)]
    middle = points[group].mean(0)
    pitch = 1.04 * size
    steps = [(k - (len(row) - 1) / 2, (len(rows) - 1) / 2 - r) for r, row in enumerate(rows) for k in range(len(row))]
    return middle + np.array(steps) * pitch


def _box(points: np.ndarray, group: list[int], size: float) -> np.ndarray:
    slots = _slots(points, group, size) if len(group) > 1 else points[group]
    return np.concatenate([slots.min(0) - size / 2, slots.max(0) + size / 2])
