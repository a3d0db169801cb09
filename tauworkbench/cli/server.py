"""One Jupyter server, on this machine alone, for the bench."""

from __future__ import annotations

import json
import os
import secrets
import shutil
import socket
import sys
import tempfile
import threading
import time
import urllib.error
import urllib.request
import warnings
import webbrowser
from contextlib import suppress
from dataclasses import dataclass
from importlib import import_module
from importlib.util import find_spec
from pathlib import Path
from typing import Any

from ..errors import InputError
from ..session.doorway import LAB, OPEN, page_templates
from ..session.shipped import notebook

__all__ = ["Door", "check_port", "door_of", "serve"]

HOST = "127.0.0.1"
NOTEBOOK = "workbench.ipynb"
_PIP = 'python -m pip install "tauworkbench[bench]"'
_READY_WITHIN_S = 90.0
_MESSAGE_BYTES = 64 * 2**20  # a piece of an upload has 2 MiB; a picture of the plot less than 1


@dataclass(frozen=True)
class Door:
    """One way in: its path on the server, and a sentence about what is missing."""

    path: str
    words: str = ""


PAGE = Door(f"/voila/render/{NOTEBOOK}")
IN_LAB = Door(f"/lab/tree/{NOTEBOOK}")


def door_of(lab: bool) -> Door:
    """Return the way in that was asked for, or the one that is left.

    Raises
    ------
    InputError
        Where JupyterLab isn't installed: it is the server behind both.
    """
    if find_spec("jupyterlab") is None:
        raise InputError(
            "tauworkbench open",
            "JupyterLab, the server behind the bench, isn't installed",
            f"type: {_PIP}; `new`, `check` and `fit` work without it",
        )
    if lab:
        return IN_LAB
    if find_spec("voila") is None:
        words = f"Voila isn't installed, so the bench opens in JupyterLab. For the page: {_PIP}"
        return Door(IN_LAB.path, words)
    return PAGE


def check_port(port: int) -> None:
    """Refuse a port that can't be had.

    Raises
    ------
    InputError
        Where it is out of range, taken or not allowed.
    """
    where, how = f"--port {port}", "give another, or leave --port out for a free one"
    if not 1 <= port <= 65535:
        raise InputError(where, "is not a port from 1 to 65535", how)
    with socket.socket() as probe:
        probe.setsockopt(socket.SOL_SOCKET, socket.SO_REUSEADDR, 1)
        try:
            probe.bind((HOST, port))
        except OSError as e:
            what = (
                "is taken by another program"
                if e.errno in _TAKEN
                else f"can't be used: {e.strerror}"
            )
            raise InputError(where, what, how) from None


def serve(source: Path, door: Door, *, port: int = 0, browser: bool = True) -> None:
    """Serve the bench on a source until the user stops it.

    Parameters
    ----------
    source : Path
        The log or run file to open.
    door : Door
        From `door_of`.
    port : int
        0 takes a free one.
    browser : bool
        Whether to open the browser.
    """
    port = port or _free_port()
    token = secrets.token_urlsafe(24)
    url = f"http://{HOST}:{port}{door.path}?token={token}"
    room = Path(tempfile.mkdtemp(prefix="tauworkbench-"))
    original = notebook().read_bytes()
    (room / NOTEBOOK).write_bytes(original)
    _link(room / "data", source.parent)
    if door.words:
        print(door.words)
    announcer = threading.Thread(target=_announce, args=(port, url, browser), daemon=True)
    announcer.start()
    try:
        _run_server(room, source, port, token)
    finally:
        _clear(room, original)


def _run_server(room: Path, source: Path, port: int, token: str) -> None:
    places = [str(page_templates()), os.environ.get("JUPYTER_PATH", "")]
    os.environ["JUPYTER_PATH"] = os.pathsep.join(p for p in places if p)
    os.environ["JUPYTERLAB_SETTINGS_DIR"] = str(_settings(room))
    os.environ["JUPYTERLAB_WORKSPACES_DIR"] = str(room / ".workspaces")
    os.environ[OPEN] = str(source)
    os.environ[LAB] = IN_LAB.path
    # The token in the environment, not among the arguments, which every user of the machine sees.
    os.environ["JUPYTER_TOKEN"] = token
    lab: Any = import_module("jupyterlab.labapp")
    if find_spec("voila"):
        import_module("voila")  # it sets warning filters of its own
    if not sys.warnoptions:  # what Jupyter's parts say of each other is of no use to the user
        warnings.simplefilter("ignore")
    settings = {"websocket_max_message_size": _MESSAGE_BYTES, "mathjax_url": "/static/none.js"}
    arguments = [
        f"--ServerApp.ip={HOST}",
        f"--ServerApp.port={port}",
        "--ServerApp.port_retries=0",
        "--ServerApp.open_browser=False",
        f"--ServerApp.root_dir={room}",
        "--ServerApp.answer_yes=True",
        "--ServerApp.log_level=ERROR",
        "--LabApp.log_level=ERROR",
        f"--ServerApp.tornado_settings={settings!r}",
        "--ServerApp.jpserver_extensions={'jupyterlab': True, 'voila.server_extension': True}"
        if find_spec("voila")
        else "--ServerApp.jpserver_extensions={'jupyterlab': True}",
        "--VoilaConfiguration.template=tauworkbench",
        "--LabApp.news_url=None",
        "--LabApp.extension_manager=readonly",
        "--LabApp.check_for_updates_class=jupyterlab.NeverCheckForUpdate",
    ]
    if hasattr(os, "geteuid") and os.geteuid() == 0:
        arguments.append("--ServerApp.allow_root=True")
    with suppress(SystemExit):
        lab.LabApp.launch_instance(argv=arguments)


def _announce(port: int, url: str, browser: bool) -> None:
    """Say the address once the server answers, and open the browser on it."""
    end = time.monotonic() + _READY_WITHIN_S
    while time.monotonic() < end:
        try:
            urllib.request.urlopen(f"http://{HOST}:{port}/api", timeout=2).close()
            break
        except urllib.error.HTTPError:
            break
        except OSError:
            time.sleep(0.1)
    else:
        print(f"The server doesn't answer on port {port}; stop with Ctrl-C", file=sys.stderr)
        return
    print(f"The bench is at {url}\nStop it with Ctrl-C.", flush=True)
    if not browser:
        return
    with suppress(webbrowser.Error):
        if webbrowser.open(url):
            return
    print("No browser could be opened; open the address above in one.", flush=True)


def _settings(room: Path) -> Path:
    """JupyterLab without news and without questions about updates."""
    folder = room / ".settings" / "@jupyterlab" / "apputils-extension"
    folder.mkdir(parents=True)
    text = json.dumps({"fetchNews": "false", "checkForUpdates": False})
    (folder / "notification.jupyterlab-settings").write_text(text, encoding="utf-8")
    return room / ".settings"


def _link(link: Path, folder: Path) -> None:
    """Show the user's folder in JupyterLab's file list; not every system lets us."""
    with suppress(OSError, NotImplementedError):
        link.symlink_to(folder, target_is_directory=True)


def _clear(room: Path, original: bytes) -> None:
    """Take the private folder away, unless the notebook in it was worked on."""
    worked_on = _sources(room / NOTEBOOK) != _sources_of(original)
    others = [p for p in room.iterdir() if p.name not in (NOTEBOOK, "data") and p.name[0] != "."]
    if worked_on or others:
        print(f"What you changed in JupyterLab is kept in {room}")
        return
    with suppress(OSError):
        (room / "data").unlink(missing_ok=True)  # the link alone; never what it points to
    shutil.rmtree(room, ignore_errors=True)


def _sources(path: Path) -> object:
    try:
        return _sources_of(path.read_bytes())
    except OSError:
        return None


def _sources_of(raw: bytes) -> object:
    try:
        cells = json.loads(raw)["cells"]
        return ["".join(cell["source"]) for cell in cells]
    except (ValueError, KeyError, TypeError):
        return raw


def _free_port() -> int:
    with socket.socket() as probe:
        probe.bind((HOST, 0))
        port: int = probe.getsockname()[1]
        return port


_TAKEN = (48, 98, 10048)  # EADDRINUSE of macOS, Linux and Windows
