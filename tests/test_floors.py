"""The import contracts of pyproject.toml, and the few habits that they can't say."""

from __future__ import annotations

import ast
import subprocess
import sys
from pathlib import Path

import pytest

PACKAGE = Path(__file__).resolve().parents[1] / "tauworkbench"
MODULES = sorted(PACKAGE.rglob("*.py"))


def test_import_contracts_hold(project_root):
    code = (
        "from importlinter.cli import lint_imports; raise SystemExit(lint_imports(no_cache=True))"
    )
    done = subprocess.run(
        [sys.executable, "-c", code], cwd=project_root, capture_output=True, text=True
    )
    assert done.returncode == 0, done.stdout + done.stderr
    assert "0 broken" in done.stdout


def _imports(path: Path) -> list[str]:
    """Absolute names that a module imports, also late ones inside functions."""
    package = ["tauworkbench", *path.relative_to(PACKAGE).parent.parts]
    names = []
    for node in ast.walk(ast.parse(path.read_text(encoding="utf-8"))):
        if isinstance(node, ast.Import):
            names += [alias.name for alias in node.names]
        elif isinstance(node, ast.ImportFrom):
            base = package[: len(package) - node.level + 1] if node.level else []
            stem = ".".join([*base, *([node.module] if node.module else [])])
            names += [f"{stem}.{alias.name}" for alias in node.names]
    return names


@pytest.mark.parametrize("path", MODULES, ids=lambda p: p.relative_to(PACKAGE).as_posix())
def test_module_keeps_the_habits(path):
    names = _imports(path)
    pyplot = [n for n in names if n.startswith("matplotlib.pyplot")]
    assert not pyplot, "pyplot holds global state: build a Figure"
    public = [n for n in names if n == "tauworkbench" or _is_public_name(n)]
    assert not public or path == PACKAGE / "__init__.py", f"nobody inside imports {public}"


def _is_public_name(name: str) -> bool:
    """Whether this is ``from tauworkbench import name`` with a name that is no module."""
    head, _, tail = name.partition(".")
    if head != "tauworkbench" or not tail or "." in tail:
        return False
    return not ((PACKAGE / tail).is_dir() or (PACKAGE / f"{tail}.py").is_file())


@pytest.mark.parametrize(
    "words",
    ["import tauworkbench", "import tauworkbench.cli", "import tauworkbench.session.shipped"],
)
def test_import_is_light(words):
    code = f"{words}, sys; print(*sys.modules)".replace(", sys;", "; import sys;")
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True)
    assert done.returncode == 0, done.stderr
    heavy = {"lmfit", "matplotlib", "pandas", "scipy", "ipywidgets"} & set(done.stdout.split())
    assert not heavy
