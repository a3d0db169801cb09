"""From a logger's file to channels on a time base."""

from .reading import read_log
from .record import Channels, Column, Log, Reading, Repair
from .timebase import to_channels

__all__ = ["Channels", "Column", "Log", "Reading", "Repair", "read_log", "to_channels"]
