"""What an assignment comes to, in words."""

import numpy as np

from gley.settings import StabilitySettings
from gley.stability.certainty import Odds
from gley.stability.solve import Solved
from gley.stability.systems import System


def saturation(target: System, solved: Solved, stated: StabilitySettings) -> np.ndarray:
    """under, near or over for the solid with the highest SI; '' where there is none (n,)."""
    fresh = np.array([item.set == "fresh" for item in target.members])[solved.solid]
    near = np.where(fresh, stated.near_SI_fresh, stated.near_SI)
    with np.errstate(invalid="ignore"):
        words = np.where(np.abs(solved.SI) <= near, "near", np.where(solved.SI > 0, "over", "under"))
    return np.where(np.isnan(solved.SI), "", words).astype(object)


def outcomes(
    target: System, solved: Solved, following: np.ndarray, second: np.ndarray, odds: Odds, bounded: np.ndarray,
    stated: StabilitySettings,
) -> np.ndarray:  # fmt: skip
    """The outcome of n samples: a sample that sits on a solid's line is buffered there; that is evidence, not doubt.

    `following` and `second` are the next field along E and the second most probable one (members, −1 = none);
    `bounded` (n, S) says where a solid rests on a limit, which proves no solid: there the outcome stays open.
    """
    names = np.array([item.name for item in target.members], dtype=object)
    rows, field, solid = np.arange(len(solved.field)), solved.field, solved.solid
    is_solid = np.array([not item.dissolved for item in target.members])[field]
    near = saturation(target, solved, stated) == "near"
    on_line = near & ((solid == field) | (solid == following)) & ~bounded[rows, solid]
    probability = odds.of(field)
    other = np.where(second >= 0, second, following)
    words = ("between " + names)[field] + (" and " + names)[other]
    words = np.where(other >= 0, words, "likely")
    words = np.where(probability >= stated.likely, "likely", words)
    words = np.where(probability >= stated.clear, "clear", words)
    words = np.where(on_line, ("at equilibrium with " + names)[solid], words)
    return np.where(is_solid & bounded[rows, field], "open: rests on a limit", words)
