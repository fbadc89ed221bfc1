"""Evidence: what the chemistry says about redox beside the measured Eh, and how far assumptions carry."""

from gley.evidence.couples import Eh_from, couples_table
from gley.evidence.process import process_table
from gley.evidence.scenarios import scenario_table, with_robust
from gley.evidence.speciation import with_measured

__all__ = ["Eh_from", "couples_table", "process_table", "scenario_table", "with_measured", "with_robust"]
