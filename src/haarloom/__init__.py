"""Haarloom: from a gauge action and static matter to complex screening masses, exactly.

The public names are loaded on first use, so that importing the package costs next to nothing.
"""

from __future__ import annotations

from importlib import import_module
from typing import Any

__version__ = "0.1.0"

_STATIONS = {
    "haarloom.algebra.group": ("SU",),
    "haarloom.algebra.expressions": ("class_function_from", "haar_integral"),
    "haarloom.algebra.determinants": ("determinant", "flavour_determinant", "inverse_determinant"),
    "haarloom.algebra.words": ("chi", "tr"),
    "haarloom.algebra.young_diagrams": ("YoungDiagram",),
    "haarloom.actions": (
        "Species",
        "analyse_link",
        "analyse_site",
        "analyse_transfer",
        "bilinear_coupling",
        "convergence_radius",
        "convert_coupling",
        "coupled_link",
        "diffusion_time",
        "exponential_coupling",
        "haar_power",
        "heat_kernel",
        "link_from_coefficients",
        "link_from_plaquette",
        "logarithmic_potential",
        "loop_coupling",
        "loop_field",
        "manton",
        "matching_curve",
        "mixed_wilson",
        "polynomial_potential",
        "site_from",
        "stacked_links",
        "static_bosons",
        "static_fermions",
        "static_species",
        "wilson",
    ),
    "haarloom.ring.model": ("RingModel",),
    "haarloom.documents": ("ModelDocument", "load", "read_document", "save"),
    "haarloom.widgets": ("ElementPane", "LinkPane", "Loom", "SitePane", "SpectrumPane"),
    "haarloom.exceptions": ("HaarloomError",),
}

_HOMES = {name: home for home, names in _STATIONS.items() for name in names}

__all__ = [*_HOMES, "__version__"]


def __getattr__(name: str) -> Any:
    try:
        home = _HOMES[name]
    except KeyError:
        raise AttributeError(f"module 'haarloom' has no attribute {name!r}") from None
    value = getattr(import_module(home), name)
    globals()[name] = value
    return value


def __dir__() -> list[str]:
    return sorted(__all__)
