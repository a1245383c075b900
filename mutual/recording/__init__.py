"""Recordings: files of readings with everything needed to evaluate them again."""

from mutual.recording.model import Recording
from mutual.recording.overrides import Overrides
from mutual.recording.reader import from_readings, read
from mutual.recording.sheet import sheet
from mutual.recording.together import Together, common_device
from mutual.recording.write import dumps

__all__ = ["Overrides", "Recording", "Together", "common_device", "dumps", "from_readings", "read", "sheet"]
