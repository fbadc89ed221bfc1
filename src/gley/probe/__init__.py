"""Probe: from an ORP reading against a reference electrode to Eh on the hydrogen scale, with its uncertainty."""

from gley.probe.convert import convert
from gley.probe.eh import to_Eh
from gley.probe.electrodes import electrodes, find_electrode, reference_mV
from gley.probe.solutions import solutions

__all__ = ["convert", "electrodes", "find_electrode", "reference_mV", "solutions", "to_Eh"]
