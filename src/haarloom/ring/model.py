"""The ring model: a link weight, a site weight, and everything that follows from the two."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Any

import sympy

from haarloom.exceptions import GroupError, ParameterError
from haarloom.ring.basis import irrep_basis
from haarloom.ring.transfer import TransferMatrix, build_transfer_matrix

if TYPE_CHECKING:
    import xarray

    from haarloom.actions.protocols import LinkWeight, SiteWeight
    from haarloom.algebra.group import SU
    from haarloom.algebra.irrep import Irrep
    from haarloom.numerics.boundary import ComplexBoundary
    from haarloom.numerics.certify import Certificate
    from haarloom.numerics.exceptional import ExceptionalPoint
    from haarloom.numerics.series import MassSeries
    from haarloom.numerics.spectrum import Spectrum
    from haarloom.numerics.stretches import ProvenStretches

__all__ = ["RingModel"]

OPTIONS = frozenset(
    [
        *("self", "model", "levels", "level", "cutoff", "digits", "irrep_limit", "precision_limit"),
        *("parameter", "order", "between", "prove", "step", "lines", "most_points"),
        *("tolerance", "executor", "file", "resume", "progress"),
    ]
)
"""Names that mean something else than a parameter in spectrum(…), certify(…), scan(…) and their like."""


@dataclass(frozen=True)
class RingModel:
    """Sites on a ring, one Polyakov loop each, joined by a link weight.

    Its transfer matrix is T = K^{1/2} W K^{1/2} in the orthonormal basis of irreducible
    characters, T_rs = √k_r ⟨r|W|s⟩ √k_s, and a ring of S sites has Z = Tr T^S.

    Parameters
    ----------
    link
        Weight between neighbouring loops, e.g. ``heat_kernel(G, "t")``.
    site
        Weight of the matter on a site, e.g. ``static_fermions(G, "z")``; weights multiply.

    Raises
    ------
    GroupError
        If link and site belong to different groups.
    ParameterError
        If one of them is no weight, or has a parameter with the name of an option such as ``levels``.

    Examples
    --------
    >>> import haarloom as hl
    >>> G = hl.SU(3)
    >>> model = hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))
    >>> model.transfer_matrix(cutoff=1)["1", "3bar"]
    z*exp(-2*t/3)
    """

    link: LinkWeight
    site: SiteWeight

    def __post_init__(self) -> None:
        for role, weight, attribute in (
            ("link", self.link, "largest_outside"),
            ("site", self.site, "norm_bound"),
        ):
            if not hasattr(weight, attribute):
                raise ParameterError(
                    f"{role} = {weight!r} is no {role} weight: "
                    f"build one with the functions of haarloom.actions, and pass link first, site second."
                )
        taken = sorted({symbol.name for symbol in self.parameters} & OPTIONS)
        if taken:
            raise ParameterError(
                f"the weights have parameters named {', '.join(taken)}, which are options of the model's own "
                f"methods, so that no value could be given by name: rename them, for instance {taken[0]}_1."
            )
        if self.link.group != self.site.group:
            raise GroupError(
                f"the link weight lives on {self.link.group}, the site weight on {self.site.group}: "
                "build both on the same group."
            )

    @property
    def group(self) -> SU:
        """The gauge group."""
        return self.link.group

    @property
    def parameters(self) -> tuple[sympy.Symbol, ...]:
        """The symbols that need values before a number comes out, sorted by name."""
        symbols = {symbol.name: symbol for symbol in (*self.link.parameters, *self.site.parameters)}
        return tuple(symbols[name] for name in sorted(symbols))

    def basis(self, cutoff: int) -> tuple[Irrep, ...]:
        """The irreps with Σ a_i ≤ cutoff, in the order of the matrix rows."""
        return irrep_basis(self.group, cutoff)

    def with_link(self, link: LinkWeight) -> RingModel:
        """The same matter with another gauge action."""
        return replace(self, link=link)

    def with_site(self, site: SiteWeight) -> RingModel:
        """The same gauge action with other matter."""
        return replace(self, site=site)

    def transfer_matrix(self, cutoff: int) -> TransferMatrix:
        """The exact transfer matrix on the irreps with Σ a_i ≤ cutoff.

        Raises
        ------
        ParameterError
            If the cutoff is not a whole number ≥ 0.
        SizeError
            If the symbolic matrix would not fit; the message states its size.
        """
        return build_transfer_matrix(self, self.basis(cutoff))

    def spectrum(self, levels: int = 6, cutoff: int | None = None, **values: Any) -> Spectrum:
        """Leading eigenvalues and masses, each with its error.

        Parameters
        ----------
        levels
            Number of eigenvalues, the leading one included.
        cutoff
            Keep the irreps with Σ a_i ≤ cutoff; chosen from the truncation bound when left out.
        **values
            A number for every name in ``parameters``.

        Raises
        ------
        MissingValueError, ParameterError, SizeError
            As the numerics station says; see :func:`haarloom.numerics.spectrum.spectrum`.
        """
        from haarloom.numerics.spectrum import spectrum

        return spectrum(self, levels=levels, cutoff=cutoff, **values)

    def certify(self, digits: int = 20, **options_and_values: Any) -> Certificate:
        """Proven enclosures of the leading levels of the untruncated T.

        See :func:`haarloom.numerics.certify.certify` for the options and what is raised.
        """
        from haarloom.numerics.certify import certify

        return certify(self, digits=digits, **options_and_values)

    def certified_stretches(
        self, parameter: str, lower: Any, upper: Any, **options_and_values: Any
    ) -> ProvenStretches:
        """An interval of one parameter cut into stretches with a proven verdict for one level.

        See :func:`haarloom.numerics.stretches.certified_stretches` for the options and what is raised.
        """
        from haarloom.numerics.stretches import certified_stretches

        return certified_stretches(self, parameter, lower, upper, **options_and_values)

    def series(
        self, parameter: str | sympy.Symbol, order: int = 6, levels: int = 3, **values: Any
    ) -> MassSeries:
        """Perturbation series of eigenvalues and masses in one parameter, with exact coefficients.

        See :func:`haarloom.numerics.series.series` for what is raised.
        """
        from haarloom.numerics.series import series

        return series(self, parameter, order=order, levels=levels, **values)

    def exceptional_point(
        self, parameter: str, between: tuple[Any, Any], **options_and_values: Any
    ) -> ExceptionalPoint:
        """Where two levels merge on a line, to any number of digits, with a proven bracket.

        See :func:`haarloom.numerics.exceptional.exceptional_point` for the options and what is raised.
        """
        from haarloom.numerics.exceptional import exceptional_point

        return exceptional_point(self, parameter, between, **options_and_values)

    def complex_boundary(self, **options_and_values: Any) -> ComplexBoundary:
        """The curves in a plane of two parameters where the lowest masses turn complex.

        Give a pair (from, to) for exactly two parameters and a number for each other one. See
        :func:`haarloom.numerics.boundary.complex_boundary` for the options and what is raised.
        """
        from haarloom.numerics.boundary import complex_boundary

        return complex_boundary(self, **options_and_values)

    def scan(self, **options_and_values: Any) -> xarray.Dataset:
        """Masses, errors and verdicts on a grid over any number of parameters.

        Give a list or an array for each axis and a number for each other parameter. See
        :func:`haarloom.numerics.scan.scan` for the options (file, executor …) and what is raised.
        """
        from haarloom.numerics.scan import scan

        return scan(self, **options_and_values)

    def __repr__(self) -> str:
        names = ", ".join(symbol.name for symbol in self.parameters)
        return f"RingModel({self.link!r}, {self.site!r}; parameters: {names or 'none'})"

    def _repr_latex_(self) -> str:
        from haarloom.ring.faces import model_latex

        return model_latex(self)
