"""``tauworkbench open``: what it says where it can't serve; serving is tested in a browser."""

from __future__ import annotations

import json
import socket

import pytest

from tauworkbench.cli import bench, main, server


def refused(capsys, *arguments):
    assert main(["open", *arguments]) == 2
    err = capsys.readouterr().err
    assert err.startswith("tauworkbench: ")
    assert err.count("\n") == 1
    return err


@pytest.fixture
def installed(monkeypatch):
    """Choose what is installed."""

    def choose(*names):
        monkeypatch.setattr(server, "find_spec", lambda name: name if name in names else None)

    return choose


def test_no_such_file(capsys, tmp_path):
    assert "there is no such file" in refused(capsys, str(tmp_path / "a.csv"))
    assert "is a folder" in refused(capsys, str(tmp_path))


def test_port_taken(capsys, tmp_path):
    log = tmp_path / "a.csv"
    log.write_text("t,y\n")
    with socket.socket() as other:
        other.bind(("127.0.0.1", 0))
        other.listen()
        port = other.getsockname()[1]
        assert "is taken by another program" in refused(capsys, str(log), "--port", str(port))


@pytest.mark.parametrize("port", ["70000", "-1"])
def test_port_out_of_range(capsys, port, tmp_path):
    log = tmp_path / "a.csv"
    log.write_text("t,y\n")
    assert "is not a port from 1 to 65535" in refused(capsys, str(log), "--port", port)


def test_without_jupyterlab_the_pip_line_is_said(capsys, installed):
    installed("voila")
    said = refused(capsys)
    assert 'pip install "tauworkbench[bench]"' in said
    assert "`fit` work without it" in said


def test_without_voila_the_bench_opens_in_jupyterlab(installed):
    installed("jupyterlab")
    door = server.door_of(lab=False)
    assert door.path == server.IN_LAB.path
    assert 'pip install "tauworkbench[bench]"' in door.words
    installed("jupyterlab", "voila")
    assert server.door_of(lab=False) == server.PAGE
    assert server.door_of(lab=True) == server.IN_LAB


def test_samples_are_copied_to_a_folder_that_is_named(capsys, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    source = bench._source(None)
    assert source.is_file()
    assert source.parent == tmp_path / "tauworkbench-samples"
    assert str(source.parent) in capsys.readouterr().out


def test_private_folder_goes_and_the_users_own_stays(tmp_path):
    room, data = tmp_path / "room", tmp_path / "data"
    for folder in (room, data):
        folder.mkdir()
    (data / "log.csv").write_text("precious")
    original = json.dumps({"cells": [{"source": ["a"]}]}).encode()
    (room / server.NOTEBOOK).write_bytes(original)
    server._link(room / "data", data)
    server._clear(room, original)
    assert not room.exists()
    assert (data / "log.csv").read_text() == "precious"


def test_notebook_that_was_worked_on_is_kept(tmp_path, capsys):
    room = tmp_path / "room"
    room.mkdir()
    (room / server.NOTEBOOK).write_text(json.dumps({"cells": [{"source": "mine"}]}))
    server._clear(room, json.dumps({"cells": [{"source": "a"}]}).encode())
    assert (room / server.NOTEBOOK).exists()
    assert str(room) in capsys.readouterr().out
