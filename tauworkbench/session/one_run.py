"""One run of a campaign, by itself: from its run file to plain JSON, or to the line that says why.

As a program (``python -m tauworkbench.session.one_run``) it does that for each line that it is
given, so that a campaign can use every core and survives whatever happens to one run.
"""

from __future__ import annotations

import json
import sys
from pathlib import Path
from typing import Any

from ..errors import InputError
from .cache import Cache, result_key
from .run_file import read_choices

__all__ = ["fit_one", "main"]

Outcome = dict[str, Any]


def fit_one(path: str, cache_folder: str | None, *, refit: bool = False) -> Outcome:
    """Fit one run file, unless its result is kept.

    Parameters
    ----------
    path : str
        The run file.
    cache_folder : str or None
        Where results are kept; None for nowhere.
    refit : bool
        Whether to fit also when a result is kept.

    Returns
    -------
    dict
        ``result`` (the content of ``result.json``) and ``kept``, or ``error``: one line.
    """
    try:
        choices = read_choices(path)
        key = None if cache_folder is None else result_key(choices)
        kept = Cache(Path(cache_folder or "."))
        found = None if key is None or refit else kept.get(key)
        if found is not None:
            return {"result": found, "kept": True}
        from .stages import complete

        result = complete(choices).need("result").as_dict()
        if key is not None:
            kept.keep(key, result)
    except InputError as e:
        return {"error": str(e)}
    except Exception as e:  # noqa: BLE001 - one run's fault must not cost the other runs
        return {"error": str(InputError(path, f"{type(e).__name__}: {e}"[:200], _FAULT))}
    return {"result": result, "kept": False}


_FAULT = "this is a fault in tauworkbench; please report it with the log"


def main() -> None:
    """Answer each line of stdin, a JSON list of `fit_one`'s arguments, with a line of JSON."""
    import warnings

    warnings.simplefilter("ignore")  # nobody reads this process's stderr
    for line in sys.stdin:
        path, cache_folder, refit = json.loads(line)
        outcome = fit_one(path, cache_folder, refit=refit)
        sys.stdout.write(json.dumps(outcome) + "\n")
        sys.stdout.flush()


if __name__ == "__main__":
    main()
