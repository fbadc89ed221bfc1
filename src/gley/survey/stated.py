"""What the user stated about headers and units, checked before any file is read."""

from difflib import get_close_matches

from gley.columns import constituents
from gley.errors import UsageError
from gley.settings import SurveySettings
from gley.survey.headers import KINDS, targets
from gley.units import recognise


def check_stated(stated: SurveySettings) -> None:
    """Refuse columns and units that don't exist, all at once.

    Raises
    ------
    UsageError
        Naming each wrong word and the nearest right one.
    """
    known = {name for kind in KINDS for name in targets(kind)} | {"ignore", *constituents()}
    problems = []
    for header, target in stated.columns.items():
        if target not in known:
            near = get_close_matches(str(target), known, 1)
            problems.append(
                f"[survey.columns] '{header}' = '{target}' is no column" + (f"; did you mean {near[0]}" if near else "")
            )
    for name, unit in stated.units.items():
        if recognise(str(unit)) is None:
            problems.append(f"[survey.units] '{name}' = '{unit}' is no unit")
    if problems:
        message = "; ".join(problems) + "."
        raise UsageError(
            message, "DEVELOPERS.md and data/columns.csv list the columns; units are written like mg/L, µg/L, mV."
        )
