"""Where the names of fields and lines go: inside their field, clear of all else, or beside it and pointing to it."""

import numpy as np
import shapely

from gley.drawing.room import Room, Spot, Words
from gley.drawing.style import NAME_PT, SMALL_PT

_STEPS = 44
_NARROW = 2.2
_MOST_AIR_PT = 16.0
_IN_WATER_PT = 12.0


def name_variants(name: str, formula: str, style: str = "normal") -> list[Words]:
    """Ways to set a field's name, the best first: name over formula, wrapped, on one line, smaller, formula alone."""
    if not name:
        return [Words(formula, size, style=style) for size in (NAME_PT + 0.5, NAME_PT, SMALL_PT)]
    wrapped = name.replace(" (", "\n(")
    ways = [f"{name}\n{formula}", f"{wrapped}\n{formula}", _stacked(name, formula), f"{name}  {formula}", name, wrapped]
    found = [Words(way, size, style=style) for size in (NAME_PT, SMALL_PT) for way in dict.fromkeys(ways)]
    return [*found, Words(formula, SMALL_PT, style=style)]


def _stacked(name: str, formula: str) -> str:
    return "\n".join([*name.split(" "), formula])


def field_spot(
    room: Room, shape: shapely.Polygon, variants: list[Words], prefer: shapely.Polygon | None
) -> Spot | None:
    """Room for a name inside its field.

    Parameters
    ----------
    room : Room
        What is taken already.
    shape : Polygon
        The visible part of the field, pixels.
    variants : list of Words
        Ways to set the name, the best first.
    prefer : Polygon or None
        Where names read best (inside water's stability), pixels.

    Returns
    -------
    Spot or None
        Of the first variant that fits clear of everything, level or turned along a narrow field; None when none does.
    """
    inner = shape.buffer(-0.3 * room.pt)
    if inner.is_empty:
        return None
    inner = max(shapely.get_parts(inner), key=lambda part: part.area)
    angle = _long_angle(inner)
    turned = [Words(w.text, w.size, angle, w.style) for w in variants] if angle is not None else []
    turned = [words for words in turned if words.text.count("\n") < 2]
    split = next((k for k, words in enumerate(variants) if words.size <= SMALL_PT), len(variants))
    for words in (*variants[:split], *turned[:split], *variants[split:], *turned[split:]):
        centre = _best(room, inner, words, prefer)
        if centre is not None:
            return Spot(words, centre, room.shapes(words, np.array([centre]))[0])
    return None


def _long_angle(shape: shapely.Polygon) -> float | None:
    """Direction of a narrow shape's long side in degrees, −90 < angle ≤ 90; None when it isn't narrow."""
    corners = shapely.get_coordinates(shapely.oriented_envelope(shape))
    if len(corners) < 5:
        return None
    sides = np.diff(corners[:3], axis=0)
    lengths = np.hypot(*sides.T)
    if lengths.max() < _NARROW * max(lengths.min(), 1e-9):
        return None
    dx, dy = sides[lengths.argmax()]
    angle = float(np.rad2deg(np.arctan2(dy, dx)))
    angle = (angle + 90.0) % 180.0 - 90.0
    return 90.0 if abs(abs(angle) - 90.0) < 6.0 else (None if abs(angle) < 4.0 else round(angle, 2))


def _best(
    room: Room, inner: shapely.Polygon, words: Words, prefer: shapely.Polygon | None
) -> tuple[float, float] | None:
    """The centre with most air around, if there is any free one."""
    centres = _grid(inner, room.size(words))
    shapes = room.shapes(words, centres)
    shapely.prepare(inner)
    keep = shapely.contains_properly(inner, shapes) & room.within(shapes)
    centres, shapes = centres[keep], shapes[keep]
    keep = ~(room.blocked(shapes) | room.crossed(shapes)) if len(shapes) else np.zeros(0, bool)
    centres, shapes = centres[keep], shapes[keep]
    if not len(centres):
        return None
    air = np.minimum(shapely.distance(shapes, inner.boundary), room.air(shapes))
    score = np.minimum(air, _MOST_AIR_PT * room.pt)
    if prefer is not None:
        shapely.prepare(prefer)
        score = score + _IN_WATER_PT * room.pt * shapely.contains(prefer, shapes)
    middle = shapely.get_coordinates(shapely.centroid(inner))[0]
    score = np.round(score - 0.03 * np.hypot(*(centres - middle).T), 6)
    best = centres[score.argmax()]
    return float(best[0]), float(best[1])


def _grid(shape: shapely.Polygon, size: tuple[float, float]) -> np.ndarray:
    """Centres (n, 2) over a shape's bounds, denser in small shapes, with the pole of inaccessibility."""
    x0, y0, x1, y1 = shape.bounds
    xs, ys = np.linspace(x0, x1, _STEPS), np.linspace(y0, y1, _STEPS)
    grid = np.column_stack([part.ravel() for part in np.meshgrid(xs, ys)])
    return np.vstack([[pole(shape)], grid])


def pole(shape: shapely.Polygon) -> tuple[float, float]:
    """Pole of inaccessibility: the point of a polygon farthest from its edge."""
    circle = shapely.maximum_inscribed_circle(shape, tolerance=max(0.5, 0.01 * np.sqrt(shape.area)))
    x, y = shapely.get_coordinates(circle)[0]
    return float(x), float(y)


def beside_spot(room: Room, target: tuple[float, float], variants: list[Words]) -> tuple[float, Spot] | None:
    """Room near a place that has none itself: words with a leader line to `target` (pixels), free of all that is taken.

    Returns its cost with it: length of the leader in pt, and more on a line; None when the whole axes is full.
    """
    best: tuple[float, Spot] | None = None
    angles = np.deg2rad(np.arange(0, 360, 12))
    reach = np.arange(8.0, 170.0, 6.0) * room.pt
    for rank, words in enumerate(variants):
        width, height = room.size(words)
        ring = np.column_stack([np.cos(angles), np.sin(angles)])
        centres = (np.array(target) + reach[:, None, None] * ring + ring * [width / 2, height / 2]).reshape(-1, 2)
        shapes = room.shapes(words, centres)
        leaders = shapely.shortest_line(shapes, shapely.Point(target))
        free = room.within(shapes) & ~room.blocked(shapes) & ~room.blocked(leaders)
        cost = shapely.length(leaders) / room.pt + 140.0 * room.crossed(shapes) + 4.0 * rank
        cost = np.where(free, np.round(cost, 6), np.inf)
        k = int(cost.argmin())
        if np.isfinite(cost[k]) and (best is None or cost[k] < best[0]):
            spot = Spot(words, (float(centres[k, 0]), float(centres[k, 1])), shapes[k], target)
            best = (float(cost[k]), spot)
    return best


def line_spot(room: Room, line: np.ndarray, text: str, side: int) -> Spot | None:
    """Room for a name along a straight line (2, 2) in pixels, above (side +1) or below (−1) it, from the right."""
    start, end = line if line[0, 0] < line[1, 0] else line[::-1]
    along = end - start
    length = float(np.hypot(*along))
    angle = float(np.rad2deg(np.arctan2(along[1], along[0])))
    words = Words(text, SMALL_PT, round(angle, 3))
    width, height = room.size(words)
    if length < 1.2 * width:
        return None
    unit = along / length
    normal = np.array([-unit[1], unit[0]])
    places = np.linspace(length - 0.6 * width - 2 * room.pt, 0.6 * width, 60)
    best: tuple[float, Spot] | None = None
    for rank, sign in enumerate((side, -side)):
        centres = start + places[:, None] * unit + sign * (height / 2 + 0.5 * room.pt) * normal
        shapes = room.shapes(words, centres)
        free = room.within(shapes) & ~room.blocked(shapes)
        cost = np.arange(len(places)) + 100.0 * room.crossed(shapes) + 45.0 * rank
        cost = np.where(free, cost, np.inf)
        k = int(cost.argmin())
        if np.isfinite(cost[k]) and (best is None or cost[k] < best[0]):
            best = (float(cost[k]), Spot(words, (float(centres[k, 0]), float(centres[k, 1])), shapes[k]))
    return best[1] if best else None
