"""Survey: field and laboratory files as they really are, read into one house form with the origin of every value."""

from gley.survey.model import Origin, Survey, of_station
from gley.survey.sheet import write_sheet
from gley.survey.survey import read_survey

__all__ = ["Origin", "Survey", "of_station", "read_survey", "write_sheet"]
