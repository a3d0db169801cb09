"""What is shipped: the wheel, the source distribution, the version, the files beside the code."""

from __future__ import annotations

import subprocess
import sys
import tarfile
import tomllib
import zipfile
from importlib.metadata import metadata, version
from pathlib import Path

import pytest
from hatchling.builders.sdist import SdistBuilder
from hatchling.builders.wheel import WheelBuilder

import tauworkbench
from tauworkbench.errors import InputError
from tauworkbench.session import shipped

SHIPPED = "tauworkbench/_shipped/"


@pytest.fixture(scope="module")
def wheel(project_root, tmp_path_factory) -> Path:
    folder = tmp_path_factory.mktemp("wheel")
    return Path(next(WheelBuilder(str(project_root)).build(directory=str(folder))))


@pytest.fixture(scope="module")
def wheel_names(wheel) -> set[str]:
    with zipfile.ZipFile(wheel) as archive:
        return set(archive.namelist())


def test_wheel_holds_every_module_and_nothing_strange(wheel_names, project_root):
    package = project_root / "tauworkbench"
    kept = {
        p.relative_to(project_root).as_posix()
        for p in package.rglob("*")
        if p.is_file() and "__pycache__" not in p.parts
    }
    inside = {n for n in wheel_names if n.startswith("tauworkbench/")}
    assert {n for n in inside if not n.startswith(SHIPPED)} == kept
    assert {n.split("/")[0] for n in wheel_names} == {
        "tauworkbench",
        f"tauworkbench-{tauworkbench.__version__}.dist-info",
    }


def test_wheel_carries_notebook_samples_types_and_licence(wheel_names, project_root):
    samples = {p.name for p in (project_root / "sample_data").iterdir() if p.is_file()}
    assert {f"{SHIPPED}sample_data/{n}" for n in samples} <= wheel_names
    assert f"{SHIPPED}notebooks/workbench.ipynb" in wheel_names
    assert "tauworkbench/py.typed" in wheel_names
    assert any(n.endswith("licenses/LICENSE") for n in wheel_names)


def test_installed_wheel_runs_from_another_folder(wheel, tmp_path):
    place, elsewhere = tmp_path / "site", tmp_path / "elsewhere"
    elsewhere.mkdir()
    with zipfile.ZipFile(wheel) as archive:
        archive.extractall(place)
    code = (
        f"import sys; sys.path.insert(0, {str(place)!r})\n"
        "from pathlib import Path\n"
        "from tauworkbench.session import shipped\n"
        "print(shipped.notebook()); print(shipped.copy_samples(Path('mine')))"
    )
    done = subprocess.run(
        [sys.executable, "-I", "-c", code], cwd=elsewhere, capture_output=True, text=True
    )
    assert done.returncode == 0, done.stderr
    found, main = done.stdout.split("\n")[:2]
    assert Path(found).is_relative_to(place)
    assert (elsewhere / main).is_file()
    log = tomllib.loads((elsewhere / main).read_text(encoding="utf-8"))["log"]["file"]
    assert (elsewhere / "mine" / log).is_file()


def test_source_distribution_makes_the_same_wheel(project_root, wheel_names, tmp_path):
    made = next(SdistBuilder(str(project_root)).build(directory=str(tmp_path)))
    with tarfile.open(made) as archive:
        archive.extractall(tmp_path, filter="data")
    source = tmp_path / f"tauworkbench-{tauworkbench.__version__}"
    assert (source / "tests" / "synthetic.py").is_file()
    assert (source / "README.md").is_file()
    again = next(WheelBuilder(str(source)).build(directory=str(tmp_path)))
    with zipfile.ZipFile(again) as archive:
        assert set(archive.namelist()) == wheel_names


def test_version_stands_in_one_place(project_root):
    assert version("tauworkbench") == tauworkbench.__version__
    written = f'"{tauworkbench.__version__}"'
    files = [*project_root.glob("*.toml"), *(project_root / "tauworkbench").rglob("*.py")]
    holders = [p.name for p in files if written in p.read_text(encoding="utf-8")]
    assert holders == ["errors.py"]


def test_dependencies_have_reasons_and_lower_bounds(project_root):
    text = (project_root / "pyproject.toml").read_text(encoding="utf-8")
    block = text.split("dependencies = [\n", 1)[1].split("\n]", 1)[0].splitlines()
    assert len(block) == len(tomllib.loads(text)["project"]["dependencies"])
    assert all(">=" in line and "#" in line for line in block)


def test_metadata_says_what_the_project_says():
    said = metadata("tauworkbench")
    assert said["License-Expression"] == "MIT"
    assert said["Requires-Python"] == ">=3.11"


def test_checkout_or_installation_holds_the_samples():
    folder = shipped.sample_data()
    assert (folder / shipped.MAIN_SAMPLE).is_file()
    assert (folder / "known_answers.json").is_file()


def test_copy_leaves_the_users_files_alone(tmp_path):
    main = shipped.copy_samples(tmp_path)
    main.write_text("mine")
    (tmp_path / "campaign.toml").unlink()
    assert shipped.copy_samples(tmp_path) == main
    assert main.read_text() == "mine"
    assert (tmp_path / "campaign.toml").is_file()


def test_copy_into_a_file_is_refused_in_one_line(tmp_path):
    (tmp_path / "taken").write_text("")
    with pytest.raises(InputError, match="name a folder") as caught:
        shipped.copy_samples(tmp_path / "taken")
    assert "\n" not in str(caught.value)
