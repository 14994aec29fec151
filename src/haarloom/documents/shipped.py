"""Where the files that come with Haarloom are: inside an installed wheel, or beside ``src`` in a checkout."""

from __future__ import annotations

from pathlib import Path

from haarloom.exceptions import UnknownNameError

__all__ = ["first_notebook", "shipped_models", "shipped_notebooks"]

_PACKAGE = Path(__file__).parents[1]
_INSTALLED = _PACKAGE / "shipped"
_CHECKOUT = _PACKAGE.parents[1]


def shipped_notebooks() -> tuple[Path, ...]:
    """The worked notebooks, in reading order."""
    return _files("notebooks", "notebooks", "*.ipynb")


def shipped_models() -> tuple[Path, ...]:
    """The model documents of the demo scenario (invented; parameters for illustration only)."""
    return _files("models", "share/haarloom/models", "*.loom.json")


def first_notebook() -> Path:
    """The notebook that the ``haarloom`` command opens."""
    return shipped_notebooks()[0]


def _files(installed: str, checkout: str, pattern: str) -> tuple[Path, ...]:
    for folder in (_INSTALLED / installed, _CHECKOUT / checkout):
        found = tuple(sorted(folder.glob(pattern)))
        if found:
            return found
    raise UnknownNameError(
        f"no {pattern} beside {_PACKAGE}: this copy of Haarloom is incomplete; install it again with pip."
    )
