"""What the Haarloom kernel loads before the first cell: ``hl``, and mathematics typeset as mathematics."""

from __future__ import annotations

from typing import Any

__all__ = ["load_ipython_extension"]


def load_ipython_extension(shell: Any) -> None:
    """Give the session the name ``hl`` and switch on LaTeX output of exact expressions."""
    from sympy import init_printing

    import haarloom

    init_printing(use_latex="mathjax", ip=shell)
    shell.push({"hl": haarloom})
