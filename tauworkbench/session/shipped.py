"""The starter notebook and the sample data: where they are, installed or in a source checkout.

The wheel carries them under ``tauworkbench/_shipped``; in a checkout, and in an editable install,
they lie at the project's root. Standard library only, so that asking costs nothing.
"""

from __future__ import annotations

import shutil
from pathlib import Path

from ..errors import InputError

__all__ = ["MAIN_SAMPLE", "copy_samples", "notebook", "sample_data"]

MAIN_SAMPLE = "sheathed_bath_heating.toml"
"""The run that the bench opens when it is given none."""

_PACKAGE = Path(__file__).resolve().parents[1]
_PLACES = (_PACKAGE / "_shipped", _PACKAGE.parent)


def notebook() -> Path:
    """Return the path of the starter notebook; to be read or copied, never written to."""
    return _find("notebooks/workbench.ipynb")


def sample_data() -> Path:
    """Return the folder of the sample logs; to be read or copied, never written to."""
    return _find("sample_data/" + MAIN_SAMPLE).parent


def copy_samples(folder: Path) -> Path:
    """Copy the samples into a folder of the user's and return the main run file there.

    Parameters
    ----------
    folder : Path
        Made if it isn't there. A file that it already holds is left as it is: it may be edited.

    Raises
    ------
    InputError
        When the folder can't be written to.
    """
    try:
        folder.mkdir(parents=True, exist_ok=True)
        for source in sorted(sample_data().iterdir()):
            target = folder / source.name
            if source.is_file() and not target.exists():
                shutil.copyfile(source, target)
    except OSError as error:
        raise InputError(
            str(folder),
            f"the samples can't be copied there ({error.strerror or error})",
            "name a folder that you may write to",
        ) from error
    return folder / MAIN_SAMPLE


def _find(name: str) -> Path:
    """Return the first place that holds the file."""
    for place in _PLACES:
        if (place / name).is_file():
            return place / name
    raise InputError(
        name,
        f"is neither in {_PLACES[0]} nor in {_PLACES[1]}",
        "install the package again from its wheel or its source",
    )
