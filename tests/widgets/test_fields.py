"""A field keeps its last good value and says what is wrong."""

from __future__ import annotations

from haarloom.exceptions import ParameterError
from haarloom.widgets.fields import Field


def whole(text: str) -> int:
    """A whole number, or a fault."""
    if not text.strip().isdigit():
        raise ParameterError(f"{text!r} is no whole number: <b>give one</b>.")
    return int(text)


def test_good_text_becomes_the_value_and_is_shown_in_normal_form() -> None:
    field = Field("K", 3, whole)
    field.control.value = " 5 "
    assert (field.value, field.control.value, field.fault) == (5, "5", "")


def test_bad_text_leaves_the_value_and_shows_an_escaped_line() -> None:
    field = Field("K", 3, whole)
    field.control.value = "many"
    assert field.value == 3
    line = field.children[1]
    assert "&lt;b&gt;give one" in line.value
    assert 'role="alert"' in line.value
    assert line.layout.display is None


def test_repaired_text_clears_the_line_even_when_the_value_is_the_old_one() -> None:
    field = Field("K", 3, whole)
    field.control.value = "many"
    field.control.value = "3"
    assert (field.value, field.fault, field.children[1].layout.display) == (3, "", "none")


def test_setting_the_value_shows_its_text_and_clears_a_fault() -> None:
    field = Field("K", 3, whole)
    field.control.value = "many"
    field.value = 7
    assert (field.control.value, field.fault) == ("7", "")
