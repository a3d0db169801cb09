"""What ``tauworkbench open`` tells the bench: the command line and the bench don't know each other.

Standard library only.
"""

from __future__ import annotations

from pathlib import Path

__all__ = ["LAB", "OPEN", "page_templates"]

OPEN = "TAUWORKBENCH_OPEN"
"""Environment variable: the log or run file that the bench opens when it is given none."""

LAB = "TAUWORKBENCH_LAB"
"""Environment variable: where the same notebook is in JupyterLab, on the same server."""


def page_templates() -> Path:
    """Return the folder in Jupyter's search path that holds the page's template."""
    return Path(__file__).resolve().parents[1] / "ui" / "share" / "jupyter"
