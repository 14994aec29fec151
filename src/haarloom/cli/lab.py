"""Start JupyterLab on a copy of the first notebook, and end with it."""

from __future__ import annotations

import contextlib
import importlib.util
import json
import os
import signal
import socket
import subprocess
import sys
import time
import urllib.parse
from collections.abc import Iterator
from pathlib import Path
from typing import Any

from haarloom.documents.shipped import first_notebook
from haarloom.exceptions import HaarloomError

__all__ = ["copy_notebook", "open_lab"]

_PATIENCE = 120.0  # seconds that a server on a slow disk may take to come up


class LabError(HaarloomError, RuntimeError):
    """JupyterLab cannot be started."""


def open_lab(folder: Path, *, port: int | None = None, browser: bool = True) -> int:
    """Serve ``folder`` with its copy of the first notebook until the server ends; its exit status.

    Raises
    ------
    LabError
        If JupyterLab or the Haarloom kernel is not installed, the port is taken, or the server fails.
    """
    _require_lab()
    _require_kernel()
    if port is not None:
        _require_free(port)
    notebook = copy_notebook(first_notebook(), folder)
    server = subprocess.Popen(_command(folder, notebook, port, browser))
    with _ending(server):
        print(f"Haarloom: {_address(server, notebook)}", flush=True)
        print("Stop with Ctrl-C.", flush=True)
        return server.wait()
    return 0  # interrupted, which is the ordinary end


def copy_notebook(shipped: Path, folder: Path) -> Path:
    """Copy a shipped notebook into ``folder``; a file of that name that is there already stays as it is."""
    copy = folder / shipped.name
    try:
        with copy.open("xb") as out:
            out.write(shipped.read_bytes())
    except FileExistsError:
        if copy.read_bytes() != shipped.read_bytes():
            print(f"Keeping your {copy.name}; the original is {shipped}")
    return copy


def _command(folder: Path, notebook: Path, port: int | None, browser: bool) -> list[str]:
    command = [
        sys.executable,
        "-m",
        "jupyterlab",
        str(notebook),
        f"--ServerApp.root_dir={folder}",
        f"--ServerApp.port={port or 0}",
        "--ServerApp.port_retries=0",
        "--ServerApp.answer_yes=True",
        "--ServerApp.log_level=ERROR",
        "--LabApp.log_level=ERROR",
        # By default Lab asks another host for a newer version of itself at every start.
        "--LabApp.check_for_updates_class=jupyterlab.NeverCheckForUpdate",
        "--ServerApp.kernel_websocket_connection_class=haarloom.cli.nodelay.PromptConnection",
    ]
    if not browser:
        command.append("--no-browser")
    if hasattr(os, "geteuid") and os.geteuid() == 0:
        command.append("--allow-root")
    return command


def _require_lab() -> None:
    if importlib.util.find_spec("jupyterlab") is None:
        raise LabError("JupyterLab is not installed in this environment: pip install 'haarloom[lab]'")


def _require_kernel() -> None:
    from jupyter_client.kernelspec import KernelSpecManager

    if "haarloom" not in KernelSpecManager().find_kernel_specs():
        raise LabError("the Haarloom kernel is not installed in this environment: install haarloom with pip")


def _require_free(port: int) -> None:
    with socket.socket() as probe:
        if os.name == "posix":  # elsewhere the option would let two servers share a port
            probe.setsockopt(socket.SOL_SOCKET, socket.SO_REUSEADDR, 1)
        try:
            probe.bind(("127.0.0.1", port))
        except OSError as problem:
            raise LabError(
                f"port {port} cannot be used ({problem.strerror}): choose another --port"
            ) from None


def _address(server: subprocess.Popen[bytes], notebook: Path) -> str:
    info = _wait_for_info(server)
    page = urllib.parse.quote(f"lab/tree/{notebook.name}")
    return f"{info['url']}{page}?token={info['token']}"


def _wait_for_info(server: subprocess.Popen[bytes]) -> dict[str, Any]:
    from jupyter_core.paths import jupyter_runtime_dir

    path = Path(jupyter_runtime_dir()) / f"jpserver-{server.pid}.json"
    deadline = time.monotonic() + _PATIENCE
    while time.monotonic() < deadline and server.poll() is None:
        with contextlib.suppress(FileNotFoundError, ValueError):  # not there yet, or half written
            info: dict[str, Any] = json.loads(path.read_text())
            return info
        time.sleep(0.1)
    raise LabError("JupyterLab did not start: its own message is above")


@contextlib.contextmanager
def _ending(server: subprocess.Popen[bytes]) -> Iterator[None]:
    """Whatever happens here, the server ends too; Ctrl-C and a polite kill are an ordinary end."""
    previous = signal.signal(signal.SIGTERM, _interrupt)
    try:
        yield
    except KeyboardInterrupt:
        pass
    finally:
        signal.signal(signal.SIGTERM, previous)
        if server.poll() is None:
            server.terminate()
            with contextlib.suppress(subprocess.TimeoutExpired):
                server.wait(20)
            if server.poll() is None:
                server.kill()


def _interrupt(*_: object) -> None:
    raise KeyboardInterrupt
