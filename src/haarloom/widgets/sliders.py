"""Sliders for the parameters of a model."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from math import floor, log10
from typing import Any

import ipywidgets
import traitlets

from haarloom.widgets.names import parameter_face

__all__ = ["ValueSliders"]

STEPS = 300
"""Positions of a slider: about as many as it has pixels."""

SLOW = 0.25
"""Seconds of drawing above which a slider reports only when it is let go."""


class ValueSliders(ipywidgets.VBox):
    """One slider a parameter.

    While the kernel is busy the page holds back all but the newest position, so that the latest
    value wins; when drawing is slow the sliders report on release only.

    Attributes
    ----------
    values
        {name: number}. Observable, may be set; a value outside its range widens the range.
    ranges
        {name: (lowest, highest)}.
    """

    values = traitlets.Dict()
    ranges = traitlets.Dict()

    def __init__(self, values: Mapping[str, float], ranges: Mapping[str, tuple[float, float]]) -> None:
        self._sliders: dict[str, ipywidgets.FloatSlider] = {}
        super().__init__()
        self.add_class("hl-column").add_class("hl-sliders")
        self.rebuild(values, ranges)
        self.observe(self._follow_values, "values")
        self.observe(self._follow_ranges, "ranges")

    def rebuild(self, values: Mapping[str, float], ranges: Mapping[str, tuple[float, float]]) -> None:
        """Show sliders for exactly the parameters in ``values``; those already there stay."""
        for gone in set(self._sliders) - set(values):
            self._sliders.pop(gone).close()
        self.ranges = {name: tuple(map(float, ranges[name])) for name in values}
        for name in values:
            if name not in self._sliders:
                self._sliders[name] = self._slider(name, float(values[name]))
        self.values = {name: float(number) for name, number in values.items()}
        self._follow_values()
        self._follow_ranges()
        self.children = [self._sliders[name] for name in values]

    def pace(self, seconds: float) -> None:
        """Tell how long the last drawing took."""
        for slider in self._sliders.values():
            slider.continuous_update = seconds < SLOW

    def _slider(self, name: str, value: float) -> ipywidgets.FloatSlider:
        low, high = _widened(self.ranges[name], value)
        step = step_of(low, high, value)
        slider = ipywidgets.FloatSlider(
            value=value,
            min=low,
            max=high,
            step=step,
            description=parameter_face(name),
            readout_format=_format_for(step),
            style={"description_width": "34px"},
            layout={"width": "100%"},
        )
        slider.observe(lambda change: self._moved(name, change.new), "value")
        return slider

    def _moved(self, name: str, value: float) -> None:
        if self.values.get(name) != value:
            self.values = {**self.values, name: value}

    def _follow_values(self, *_: Any) -> None:
        for name, slider in self._sliders.items():
            value = self.values.get(name, slider.value)
            if slider.value == value:
                continue
            if not slider.min <= value <= slider.max:
                self.ranges = {**self.ranges, name: _widened(self.ranges[name], value)}
            slider.value = value

    def _follow_ranges(self, *_: Any) -> None:
        for name, slider in self._sliders.items():
            low, high = _widened(self.ranges[name], slider.value)
            with slider.hold_trait_notifications():
                slider.min, slider.max, slider.step = low, high, step_of(low, high, slider.value)
                slider.readout_format = _format_for(slider.step)


def step_of(low: float, high: float, value: float) -> float:
    """A step of 1, 2 or 5 times a power of ten, about 1/300 of the range, fine enough to hold the value.

    A slider moves its value to the nearest step, so that a coarser one would change what was given.
    Values with more than six decimals are left to be rounded.

    Examples
    --------
    >>> step_of(0.0, 3.0, 0.3), step_of(0.0, 3.0, 0.125)
    (0.01, 0.005)
    """
    ideal = (high - low) / STEPS
    power = 10.0 ** floor(log10(ideal))
    step = float(f"{next(m for m in (1, 2, 5, 10) if m * power >= ideal * 0.999) * power:.12g}")
    while step > 1e-6 and abs((value - low) / step - round((value - low) / step)) > 1e-6:
        step = float(f"{step / (2.5 if f'{step:e}'.startswith('5') else 2):.12g}")
    return step


def _format_for(step: float) -> str:
    return f".{max(0, -floor(log10(step)))}f"


def _widened(span: Iterable[float], value: float) -> tuple[float, float]:
    low, high = span
    return min(low, value), max(high, value)
