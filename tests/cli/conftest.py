"""The samples, copied to where a command may write."""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest

from tauworkbench.session import shipped


@pytest.fixture
def samples(tmp_path: Path) -> Path:
    """A folder with the sample logs and their run files."""
    return shutil.copytree(shipped.sample_data(), tmp_path / "samples")


@pytest.fixture
def run_file(samples: Path) -> Path:
    """The run file of the fastest sample to fit."""
    return samples / "bare_bath_heating.toml"
