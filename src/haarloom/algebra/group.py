"""The group SU(N), 2 ≤ N ≤ 8: the door to its irreps."""

from __future__ import annotations

from collections.abc import Sequence
from functools import lru_cache
from operator import index
from typing import TYPE_CHECKING, Any, overload

from sympy import Expr, Integer

from haarloom.algebra.bounded_cache import cached_terms
from haarloom.algebra.irrep import Irrep
from haarloom.algebra.labels import count_up_to, labels_up_to, validated_cutoff, validated_labels
from haarloom.algebra.names import labels_from_name
from haarloom.exceptions import GroupError

if TYPE_CHECKING:
    from haarloom.algebra.class_function import ClassFunction
    from haarloom.algebra.symbolic_irrep import SymbolicIrrep

__all__ = ["SU", "same_group"]

_SMALLEST, _LARGEST = 2, 8


class SU:
    """The special unitary group SU(N). One object for each N: ``SU(3) is SU(3)``.

    Parameters
    ----------
    n : int
        Between 2 and 8.

    Raises
    ------
    GroupError
        When n is not such an integer.

    Examples
    --------
    >>> G = SU(3)
    >>> G.irrep(1, 1).dimension, G.irrep("10bar").labels
    (8, (0, 3))
    """

    n: int
    __slots__ = ("n",)

    def __new__(cls, n: int) -> SU:
        return _the_group(_validated_n(n))

    def __setattr__(self, name: str, value: object) -> None:
        raise AttributeError("SU(N) is a constant; for another N write SU(N) anew.")

    def __reduce__(self) -> tuple[type[SU], tuple[int]]:
        return SU, (self.n,)

    def __repr__(self) -> str:
        return f"SU({self.n})"

    def _repr_latex_(self) -> str:
        return rf"$\mathrm{{SU}}({self.n})$"

    @property
    def rank(self) -> int:
        """N − 1, the number of Dynkin labels and of independent eigenphases."""
        return self.n - 1

    @overload
    def irrep(self, *labels: int | str | Irrep | Sequence[int]) -> Irrep: ...
    @overload
    def irrep(self, *labels: Expr | int) -> SymbolicIrrep: ...
    def irrep(self, *labels: Any) -> Irrep | SymbolicIrrep:
        """An irrep by its Dynkin labels or by its trade name.

        Parameters
        ----------
        *labels
            N − 1 integers ≥ 0, or one sequence of them, or one name such as ``"10bar"``, or an irrep of
            this group (returned as it is). SymPy symbols among the labels give a :class:`SymbolicIrrep`
            instead.

        Raises
        ------
        LabelError
            For labels of the wrong number or kind.
        UnknownNameError
            For a name that no irrep carries; the message suggests near ones.
        GroupError
            For an irrep of another group.
        """
        if len(labels) == 1:
            (only,) = labels
            if isinstance(only, str):
                return Irrep(self, labels_from_name(self.n, only))
            if isinstance(only, Irrep):
                return same_group(self, only)
            if isinstance(only, (tuple, list)):
                labels = tuple(only)
        if any(isinstance(label, Expr) and not isinstance(label, Integer) for label in labels):
            from haarloom.algebra.symbolic_irrep import SymbolicIrrep

            return SymbolicIrrep.from_labels(self, labels)
        return Irrep(self, validated_labels(self.rank, labels))

    def irreps(self, cutoff: int) -> tuple[Irrep, ...]:
        """All irreps with Σ a_i ≤ cutoff: by that sum, then by labels descending lexicographically.

        >>> [r.name for r in SU(3).irreps(2)]
        ['1', '3', '3bar', '6', '8', '6bar']
        """
        return _irreps(self, validated_cutoff(cutoff))

    def count_irreps(self, cutoff: int) -> int:
        """How many irreps :meth:`irreps` would return, without building them."""
        return count_up_to(self.rank, validated_cutoff(cutoff))

    @property
    def trivial(self) -> Irrep:
        """The trivial irrep, labels (0, …, 0)."""
        return Irrep(self, (0,) * self.rank)

    @property
    def fundamental(self) -> Irrep:
        """The N-dimensional irrep of the group elements themselves, labels (1, 0, …, 0)."""
        return Irrep(self, (1, *(0,) * (self.rank - 1)))

    @property
    def antifundamental(self) -> Irrep:
        """The conjugate of the fundamental; for SU(2) the same irrep."""
        return self.fundamental.conjugate

    @property
    def adjoint(self) -> Irrep:
        """The irrep of dimension N² − 1, labels (1, 0, …, 0, 1); (2) for SU(2)."""
        return Irrep(self, (2,) if self.n == 2 else (1, *(0,) * (self.rank - 2), 1))

    @property
    def loop(self) -> ClassFunction:
        """The Polyakov loop L = tr P as a class function (not divided by N)."""
        return self.fundamental.character()


def same_group(group: SU, irrep: Irrep) -> Irrep:
    """Return the irrep when it belongs to the group, or raise :class:`GroupError`."""
    if irrep.group is not group:
        raise GroupError(
            f"an irrep of {irrep.group} given where {group} is in use: take it from {group}.irrep(…)."
        )
    return irrep


def _validated_n(n: Any) -> int:
    try:
        if isinstance(n, bool):
            raise TypeError
        value = index(n)
    except TypeError:
        raise GroupError(
            f"SU({n!r}) given; N must be an integer from {_SMALLEST} to {_LARGEST}: SU(3)."
        ) from None
    if not _SMALLEST <= value <= _LARGEST:
        raise GroupError(
            f"SU({value}) given; N must lie between {_SMALLEST} and {_LARGEST}: choose one of them."
        )
    return value


@lru_cache(maxsize=_LARGEST)
def _the_group(n: int) -> SU:
    group = object.__new__(SU)
    object.__setattr__(group, "n", n)
    return group


@cached_terms(limit=200_000)
def _irreps(group: SU, cutoff: int) -> tuple[Irrep, ...]:
    return tuple(Irrep(group, labels) for labels in labels_up_to(group.rank, cutoff))
