"""Evidence: what the chemistry says about the redox process, beside and apart from the measured Eh."""

from gley.evidence.process import process_table

__all__ = ["process_table"]
