"""The code in README and DEVELOPERS runs as it stands, and what it claims is true."""

from __future__ import annotations

import re
from pathlib import Path
from typing import Any

import numpy as np
import pytest

ROOT = Path(__file__).parents[2]
LINK = re.compile(r"\]\(([^)#:]+)\)")


def run_blocks(guide: str, folder: Path, monkeypatch: pytest.MonkeyPatch) -> dict[str, Any]:
    """Run the Python blocks of a guide one after the other; the names that they leave."""
    blocks = re.findall(r"```python\n(.*?)```", (ROOT / guide).read_text(encoding="utf-8"), re.DOTALL)
    assert blocks
    monkeypatch.chdir(folder)
    names: dict[str, Any] = {"__name__": "guide"}
    for block in blocks:
        exec(compile(block, guide, "exec", dont_inherit=True), names)
    return names


def test_readme_runs_and_its_physics_is_right(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    names = run_blocks("README.md", tmp_path, monkeypatch)
    model, hl = names["model"], names["hl"]
    assert hl.load(tmp_path / "ember.loom.json") == model
    still = model.spectrum(levels=4, t=1, z=0)
    assert np.abs(still.masses - [4 / 3, 4 / 3, 3]).max() < 1e-10
    assert model.spectrum(levels=3, t=1, z=0.01).verdicts == ("complex pair", "complex pair")
    assert model.spectrum(levels=3, t=1, z=1).verdicts == ("real", "real")
    low, high = (model.spectrum(levels=4, t=1, z=z).masses for z in (0.4, 2.5))
    assert np.abs(low - high).max() < 1e-9


def test_recipes_of_developers_run(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    names = run_blocks("DEVELOPERS.md", tmp_path, monkeypatch)
    G, hl = names["G"], names["hl"]
    straight = hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))
    same = names["bent"].spectrum(levels=3, cutoff=4, t=1, bend=0, z=0.3)
    assert np.abs(same.masses - straight.spectrum(levels=3, cutoff=4, t=1, z=0.3).masses).max() < 1e-12
    T = names["leaky"].transfer_matrix(cutoff=1)
    assert T.derivation("1", "3").verify().passed
    pane = names["TensionPane"](hl.heat_kernel(G, "t"))
    assert r"\frac{4 t}{3}" in pane._table.value
    assert not pane.fault


@pytest.mark.parametrize("guide", ["README.md", "DEVELOPERS.md"])
def test_links_and_pictures_exist(guide: str) -> None:
    targets = LINK.findall((ROOT / guide).read_text(encoding="utf-8"))
    assert all((ROOT / target).exists() for target in targets), targets


def test_readme_and_ci_use_the_same_test_command() -> None:
    readme = (ROOT / "README.md").read_text(encoding="utf-8")
    blocks = [block for block in re.findall(r"```bash\n(.*?)```", readme, re.DOTALL) if "pytest" in block]
    assert len(blocks) == 1
    assert blocks[0].splitlines()[-1] == ".venv/bin/python -m pytest"
