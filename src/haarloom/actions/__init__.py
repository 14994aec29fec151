"""Link weights and site weights: coefficients exact, as series, or as numbers with a stated error."""

from haarloom.actions.base import Link, Site
from haarloom.actions.bilinear import bilinear_coupling
from haarloom.actions.bosons import static_bosons
from haarloom.actions.coefficient_table import link_from_coefficients
from haarloom.actions.convergence import convergence_radius
from haarloom.actions.conversions import convert_coupling
from haarloom.actions.exponential_coupling import exponential_coupling
from haarloom.actions.fermions import static_fermions
from haarloom.actions.heat_kernel import heat_kernel
from haarloom.actions.large_coupling import diffusion_time
from haarloom.actions.link_analysis import analyse_link, analyse_transfer
from haarloom.actions.link_products import coupled_link, stacked_links
from haarloom.actions.loop_coupling import loop_coupling
from haarloom.actions.loop_field import loop_field
from haarloom.actions.manton import manton
from haarloom.actions.matching import matching_curve
from haarloom.actions.mixed import mixed_wilson
from haarloom.actions.parameters import Field
from haarloom.actions.plaquette_link import PlaquetteLink
from haarloom.actions.potentials import logarithmic_potential, polynomial_potential
from haarloom.actions.protocols import LinkWeight, SiteWeight
from haarloom.actions.reduced_measure import haar_power
from haarloom.actions.registry import REGISTRY, build
from haarloom.actions.site_analysis import analyse_site
from haarloom.actions.species import Species, static_species
from haarloom.actions.torus_site import TorusSite
from haarloom.actions.wilson import wilson
from haarloom.actions.written_weights import link_from_plaquette, site_from

__all__ = [
    "REGISTRY",
    "Field",
    "Link",
    "LinkWeight",
    "PlaquetteLink",
    "Site",
    "SiteWeight",
    "Species",
    "TorusSite",
    "analyse_link",
    "analyse_site",
    "analyse_transfer",
    "bilinear_coupling",
    "build",
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
]
