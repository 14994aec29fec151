"""Haarloom in a fresh environment, from a wheel and editable: everything a user needs arrives with it."""

from __future__ import annotations

import json
import os
import signal
import socket
import subprocess
import sys
import time
import urllib.error
import urllib.request
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]
pytestmark = pytest.mark.slow

KERNEL = """
import json, sys
from jupyter_client.manager import start_new_kernel
manager, client = start_new_kernel(kernel_name="haarloom")
try:
    said = []
    def listen(message):
        if message["msg_type"] in ("stream", "execute_result", "error"):
            said.append(message["content"])
    code = "import sys; r = hl.SU(3).irrep(1, 1); print(r.dimension, sys.prefix); r.casimir(2) / 7"
    client.execute_interactive(code, timeout=60, output_hook=listen)
    print(json.dumps(said))
finally:
    client.stop_channels()
    manager.shutdown_kernel(now=True)
"""
SHIPPED = """
import haarloom
from haarloom.documents.shipped import first_notebook, shipped_models
print(haarloom.__file__)
print(first_notebook())
print(*(path.name for path in shipped_models()))
"""


@dataclass(frozen=True)
class Environment:
    """A virtual environment with Jupyter folders of its own."""

    prefix: Path

    def run(self, *command: str, cwd: Path | None = None) -> str:
        """Output of a program of the environment."""
        done = subprocess.run(
            [str(self.prefix / "bin" / command[0]), *command[1:]],
            cwd=cwd or self.prefix,
            env=self.variables,
            capture_output=True,
            text=True,
            timeout=600,
        )
        assert done.returncode == 0, f"{command}\n{done.stdout}\n{done.stderr}"
        return done.stdout

    @property
    def variables(self) -> dict[str, str]:
        """The surroundings without what would let this checkout or the user's settings leak in."""
        kept = {name: value for name, value in os.environ.items() if name != "PYTHONPATH"}
        own = {f"JUPYTER_{name}_DIR": str(self.prefix / name) for name in ("CONFIG", "DATA", "RUNTIME")}
        return {**kept, **own, "IPYTHONDIR": str(self.prefix / "ipython")}

    @property
    def kernelspec(self) -> Path:
        """Where Jupyter looks for our kernelspec."""
        return self.prefix / "share/jupyter/kernels/haarloom"


@pytest.fixture(scope="module")
def fresh(tmp_path_factory: pytest.TempPathFactory) -> Environment:
    environment = Environment(tmp_path_factory.mktemp("fresh") / "env")
    subprocess.run([sys.executable, "-m", "venv", str(environment.prefix)], check=True)
    return environment


@pytest.fixture(scope="module", params=["wheel", "editable"])
def installed(
    request: pytest.FixtureRequest, fresh: Environment, tmp_path_factory: pytest.TempPathFactory
) -> Iterator[Environment]:
    if request.param == "wheel":
        folder = tmp_path_factory.mktemp("wheel")
        fresh.run("pip", "wheel", "-q", "--no-deps", "-w", str(folder), str(ROOT))
        (wheel,) = folder.glob("haarloom-*.whl")
        fresh.run("pip", "install", "-q", f"{wheel}[lab]")
    else:
        fresh.run("pip", "install", "-q", "-e", f"{ROOT}[lab]")
    yield fresh
    fresh.run("pip", "uninstall", "-q", "-y", "haarloom")
    assert not fresh.kernelspec.exists(), "uninstalling must take the kernelspec along"


def test_kernelspec_is_known_and_complete(installed: Environment) -> None:
    listed = json.loads(installed.run("jupyter", "kernelspec", "list", "--json"))["kernelspecs"]["haarloom"]
    assert Path(listed["resource_dir"]).samefile(installed.kernelspec)
    assert listed["spec"]["display_name"] == "Haarloom"
    for logo in ("logo-32x32.png", "logo-64x64.png", "logo-svg.svg"):
        shipped = ROOT / "share/jupyter/kernels/haarloom" / logo
        assert (installed.kernelspec / logo).read_bytes() == shipped.read_bytes()


def test_kernel_starts_with_haarloom_loaded_and_latex_printing(installed: Environment) -> None:
    stream, result = json.loads(installed.run("python", "-c", KERNEL))
    assert stream["text"].split() == ["8", str(installed.prefix)]
    assert result["data"]["text/latex"] == r"$\displaystyle \frac{3}{7}$"


def test_lab_settings_save_widget_state(installed: Environment) -> None:
    code = "from jupyterlab.commands import get_app_dir; print(get_app_dir())"
    settings = Path(installed.run("python", "-c", code).strip()) / "settings/overrides.d/haarloom.json"
    assert json.loads(settings.read_text()) == {
        "@jupyter-widgets/jupyterlab-manager:plugin": {"saveState": True}
    }


def test_notebooks_and_models_are_found(installed: Environment) -> None:
    home, notebook, models = installed.run("python", "-c", SHIPPED).splitlines()
    assert Path(home).parents[1] in {ROOT / "src", *installed.prefix.glob("lib/python*/site-packages")}
    assert Path(notebook).read_bytes() == (ROOT / "notebooks" / Path(notebook).name).read_bytes()
    assert models.split() == sorted(
        path.name for path in (ROOT / "share/haarloom/models").glob("*.loom.json")
    )


def test_command_runs_a_document(installed: Environment, tmp_path: Path) -> None:
    document = ROOT / "share/haarloom/models/ember-1.loom.json"
    printed = installed.run("haarloom", "run", str(document), "--out", str(tmp_path), cwd=tmp_path)
    assert "complex pair" in printed
    assert sorted(path.name for path in tmp_path.iterdir()) == ["ember-1-masses.csv", "ember-1-masses.tex"]


def test_command_serves_the_first_notebook(installed: Environment, tmp_path: Path) -> None:
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        port = probe.getsockname()[1]
    command = [str(installed.prefix / "bin/haarloom"), "--no-browser", "--port", str(port)]
    with subprocess.Popen(
        command,
        cwd=tmp_path,
        env=installed.variables,
        stdout=subprocess.PIPE,
        stderr=subprocess.DEVNULL,
        text=True,
    ) as process:
        try:
            assert process.stdout is not None
            address = process.stdout.readline().removeprefix("Haarloom: ").strip()
            assert f":{port}/lab/tree/01-" in address
            assert _status(address) == 200
            assert [path.name for path in tmp_path.glob("*.ipynb")] == [address.split("/")[-1].split("?")[0]]
        finally:
            process.send_signal(signal.SIGTERM)
            assert process.wait(30) == 0
    with socket.socket() as probe:  # the server has ended with the command
        assert probe.connect_ex(("127.0.0.1", port)) != 0


def _status(address: str) -> int:
    for _ in range(50):
        try:
            with urllib.request.urlopen(address, timeout=10) as answer:
                return int(answer.status)
        except urllib.error.URLError:
            time.sleep(0.2)
    return 0
