"""From a logger's file to channels on a time base."""

from __future__ import annotations

from .channels import to_channels
from .log import Log
from .read import read_log
from .records import Channels, Column, Reading, Repair

__all__ = ["Channels", "Column", "Log", "Reading", "Repair", "read_log", "to_channels"]
