"""The one exception family of the package.

Every message says what was given, what is allowed, and how to mend it. Each class is also a
``ValueError`` or a ``TypeError``, so that code which knows nothing of Haarloom still catches it.
"""

from __future__ import annotations

from typing import Any

__all__ = [
    "ClassFunctionError",
    "ConvergenceError",
    "DocumentError",
    "ExpressionError",
    "GroupError",
    "HaarloomError",
    "LabelError",
    "MissingValueError",
    "ParameterError",
    "ScanError",
    "SizeError",
    "UnknownNameError",
]


class HaarloomError(Exception):
    """Base of every error that Haarloom raises on purpose."""


class GroupError(HaarloomError, ValueError):
    """N out of range, or objects of different groups in one operation."""


class LabelError(HaarloomError, ValueError):
    """Dynkin labels or a Young diagram that name no irrep of the group."""


class UnknownNameError(HaarloomError, ValueError):
    """A name that nothing carries; the message suggests near ones."""


class ParameterError(HaarloomError, ValueError):
    """A parameter outside the domain where the formula holds, or two that contradict."""


class MissingValueError(HaarloomError, ValueError):
    """A symbol was left without a value where a number is needed."""


class ConvergenceError(HaarloomError, ValueError):
    """A series, quadrature or bound that does not close at the given values."""


class ScanError(HaarloomError, ValueError):
    """A scan that could not finish: what was done is in its file, and in ``partial``."""

    partial: Any = None


class SizeError(HaarloomError, ValueError):
    """A result too large for memory; the message states its size before anything is built."""


class ClassFunctionError(HaarloomError, ValueError):
    """An expression or a function that is not a class function of the group."""


class ExpressionError(HaarloomError, ValueError):
    """Text that the safe grammar does not accept."""


class DocumentError(HaarloomError, ValueError):
    """A model document or result file that is damaged, foreign or incomplete."""
