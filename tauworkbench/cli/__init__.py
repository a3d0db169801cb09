"""The command line: arguments -> choices -> complete -> report."""

from .main import main

__all__ = ["main"]
