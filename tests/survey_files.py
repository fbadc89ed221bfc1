"""Small text files for tests of the reader, and what it said about them."""

from gley.settings import Settings
from gley.survey import read_survey

FIELD = ("Sample;ORP (mV);pH;T (°C)", "W1;100;7,1;11", "W2;-20;6,9;10")


def write(tmp_path, name, *lines):
    """A text file of these lines."""
    path = tmp_path / name
    path.write_text("\n".join(lines) + "\n", encoding="utf-8")
    return path


def read(tmp_path, *lines, **survey):
    """The survey in a text file of these lines; `survey` are settings of that group."""
    return read_survey(write(tmp_path, "s.csv", *lines), Settings().replace(survey=survey))


def said(survey, rule):
    """Cell and value of each finding of a rule."""
    return [(item.place.cell, item.value) for item in survey.findings if item.rule == rule]


def places(survey, rule):
    """File, cell and value of each finding of a rule."""
    return [(item.place.file, item.place.cell, item.value) for item in survey.findings if item.rule == rule]
