"""A Jupyter that sees the kernelspec of this checkout, installed or not."""

from __future__ import annotations

import os
import shutil
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[2]


@pytest.fixture
def kernel_folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """The kernelspecs as shipped, in a Jupyter data folder of their own; the checkout on the path."""
    folder = tmp_path / "jupyter"
    shutil.copytree(ROOT / "share/jupyter/kernels", folder / "kernels")
    monkeypatch.setenv("JUPYTER_DATA_DIR", str(folder))
    monkeypatch.setenv("IPYTHONDIR", str(tmp_path / "ipython"))
    path = os.pathsep.join(filter(None, [str(ROOT / "src"), os.environ.get("PYTHONPATH")]))
    monkeypatch.setenv("PYTHONPATH", path)
    return folder
