"""Every notebook runs from top to bottom, and is kept without outputs."""

from __future__ import annotations

from pathlib import Path

import nbformat
import pytest
from nbclient import NotebookClient

NOTEBOOKS = sorted((Path(__file__).parents[2] / "notebooks").glob("*.ipynb"))
EACH = pytest.mark.parametrize("path", NOTEBOOKS, ids=lambda path: path.name)


@EACH
@pytest.mark.slow
def test_notebook_runs(path: Path, tmp_path: Path, kernel_folder: Path) -> None:
    notebook = nbformat.read(path, as_version=4)
    NotebookClient(notebook, timeout=300, resources={"metadata": {"path": str(tmp_path)}}).execute()
    assert any(cell.get("outputs") for cell in notebook.cells)


@EACH
def test_notebook_is_kept_clean_and_names_the_kernel(path: Path) -> None:
    notebook = nbformat.read(path, as_version=4)
    assert notebook.metadata.kernelspec.name == "haarloom"
    for cell in notebook.cells:
        assert not cell.get("outputs"), "commit notebooks without outputs"
        assert cell.get("execution_count") is None


def test_there_is_a_first_notebook() -> None:
    assert NOTEBOOKS[0].name.startswith("01-")
