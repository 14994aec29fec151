"""Every example in a docstring gives what it says."""

from __future__ import annotations

import doctest
import importlib
import pkgutil

import pytest

import haarloom

MODULES = sorted(
    found.name
    for found in pkgutil.walk_packages(haarloom.__path__, "haarloom.")
    if not found.name.endswith("nodelay")  # needs the optional Jupyter server
)
FLAGS = doctest.ELLIPSIS | doctest.NORMALIZE_WHITESPACE


@pytest.mark.parametrize("name", MODULES)
def test_docstring_examples(name: str) -> None:
    result = doctest.testmod(importlib.import_module(name), optionflags=FLAGS)
    assert result.failed == 0


def test_there_are_examples_to_run() -> None:
    tried = sum(
        doctest.testmod(importlib.import_module(name), optionflags=FLAGS).attempted for name in MODULES
    )
    assert tried > 50
