"""Every notebook runs from its first cell to its last, and is kept without outputs."""

from __future__ import annotations

from pathlib import Path

import nbformat
import pytest
from nbclient import NotebookClient

from tauworkbench.session import shipped

FOLDER = Path(__file__).resolve().parents[1] / "notebooks"
NOTEBOOKS = sorted(FOLDER.glob("*.ipynb"))


def test_there_is_the_starter_notebook():
    assert shipped.notebook().name in {p.name for p in NOTEBOOKS}


@pytest.mark.parametrize("path", NOTEBOOKS, ids=lambda p: p.name)
def test_notebook_is_kept_without_outputs(path):
    cells = nbformat.read(path, as_version=4).cells
    code = [c for c in cells if c.cell_type == "code"]
    assert code
    assert not any(c.outputs or c.execution_count for c in code)


@pytest.mark.parametrize("path", NOTEBOOKS, ids=lambda p: p.name)
def test_notebook_runs(path, tmp_path):
    shipped.copy_samples(tmp_path)
    notebook = nbformat.read(path, as_version=4)
    where = {"metadata": {"path": str(tmp_path)}}
    NotebookClient(notebook, timeout=300, kernel_name="python3", resources=where).execute()
