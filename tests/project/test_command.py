"""The command: what it copies, what it prints, and one clear line for everything that is wrong."""

from __future__ import annotations

import csv
import socket
from pathlib import Path

import pytest

from haarloom.cli import lab, main
from haarloom.documents.shipped import first_notebook, shipped_models

EMBER = next(path for path in shipped_models() if path.name == "ember-1.loom.json")


def complaint(capsys: pytest.CaptureFixture[str]) -> str:
    said = capsys.readouterr().err
    assert said.count("\n") == 1
    assert said.startswith("haarloom")
    return said


def test_notebook_is_copied_once_and_user_work_is_kept(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    shipped = first_notebook()
    copy = lab.copy_notebook(shipped, tmp_path)
    assert copy.read_bytes() == shipped.read_bytes()
    lab.copy_notebook(shipped, tmp_path)
    assert capsys.readouterr().out == ""
    copy.write_text("my own work")
    assert lab.copy_notebook(shipped, tmp_path) == copy
    assert copy.read_text() == "my own work"
    assert f"Keeping your {shipped.name}" in capsys.readouterr().out


def test_run_prints_masses_and_writes_tables(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["run", str(EMBER), "--out", str(tmp_path / "new/folder")]) == 0
    said = capsys.readouterr().out
    assert "Invented" in said
    assert "complex pair" in said
    with (tmp_path / "new/folder/ember-1-masses.csv").open() as table:
        rows = list(csv.DictReader(table))
    assert [int(row["level"]) for row in rows] == list(range(1, len(rows) + 1))
    first = complex(float(rows[0]["re_mass"]), float(rows[0]["im_mass"]))
    shown = next(line for line in said.splitlines() if line.split()[:1] == ["1"]).split()
    assert abs(first - complex(float(shown[1]), float(shown[2]))) <= 2 * float(shown[3])
    tex = (tmp_path / "new/folder/ember-1-masses.tex").read_text()
    assert tex.count(r"\\") == len(rows) + 1


@pytest.mark.parametrize("path", shipped_models(), ids=lambda path: path.name)
def test_every_shipped_model_has_masses_with_errors(path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["run", str(path)]) == 0
    rows = [line.split() for line in capsys.readouterr().out.splitlines() if line.split()[0].isdigit()]
    assert len(rows) == 5
    assert all(float(margin) < 1e-4 for _, _, _, margin, *_ in rows)


@pytest.mark.parametrize(
    ("content", "reason"),
    [
        ("", "no JSON"),
        ("{}", "'format' is missing"),
        (EMBER.read_text().replace('"z": "z"', '"z": "__import__(1)"'), "no known function"),
        (EMBER.read_text().replace('"SU(3)"', '"SU(99)"'), "group: "),
        (EMBER.read_text().replace('"t": "1"', '"t": "-1"'), "t = -1"),
        (EMBER.read_text().replace('"t": "1",', ""), "t"),
    ],
)
def test_bad_document_is_one_line(
    content: str, reason: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    path = tmp_path / "x.loom.json"
    path.write_text(content)
    assert main(["run", str(path)]) == 1
    assert reason in complaint(capsys)


def test_missing_file_is_one_line(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["run", str(tmp_path / "none.json")]) == 1
    assert "No such file" in complaint(capsys)


def test_folder_that_is_a_file_is_one_line(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (tmp_path / "taken").write_text("")
    assert main(["run", str(EMBER), "--out", str(tmp_path / "taken")]) == 1
    assert "taken" in complaint(capsys)


@pytest.mark.parametrize(
    "arguments",
    [
        ["--port", "0"],
        ["--port", "x"],
        ["--port", "70000"],
        ["--colour"],
        ["weave"],
        ["run"],
        ["run", "a", "b"],
    ],
)
def test_bad_option_is_one_line(arguments: list[str], capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as stopped:
        main(arguments)
    assert stopped.value.code == 2
    assert "--help" in complaint(capsys)


def test_taken_port_is_one_line(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str], kernel_folder: Path
) -> None:
    pytest.importorskip("jupyterlab")
    monkeypatch.chdir(tmp_path)
    with socket.socket() as taken:
        taken.bind(("127.0.0.1", 0))
        taken.listen()
        port = taken.getsockname()[1]
        assert main(["--no-browser", "--port", str(port)]) == 1
    assert f"port {port}" in complaint(capsys)
    assert not list(tmp_path.glob("*.ipynb"))


def test_absent_kernel_is_one_line(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    pytest.importorskip("jupyterlab")
    monkeypatch.setattr("jupyter_client.kernelspec.KernelSpecManager.find_kernel_specs", lambda self: {})
    monkeypatch.chdir(tmp_path)
    assert main([]) == 1
    assert "kernel is not installed" in complaint(capsys)
