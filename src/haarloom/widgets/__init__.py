"""Panes: they show a model and change it, and hold no physics of their own."""

from haarloom.widgets.element_pane import ElementPane
from haarloom.widgets.link_pane import LinkPane
from haarloom.widgets.loom import Loom
from haarloom.widgets.site_pane import SitePane
from haarloom.widgets.spectrum_pane import SpectrumPane

__all__ = ["ElementPane", "LinkPane", "Loom", "SitePane", "SpectrumPane"]
