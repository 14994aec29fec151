"""Trade names on screen: LaTeX and HTML spellings."""

from __future__ import annotations

import re
from html import escape
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from haarloom.algebra.product_steps import ProductStory

__all__ = ["html_name", "latex_name", "story_table"]

_DIMENSION = re.compile(r"(\d+)('*)(bar)?\Z")


def latex_name(name: str) -> str:
    r"""LaTeX of a trade name, without dollar signs.

    >>> latex_name("15'bar"), latex_name("j=1/2")
    ("\\overline{\\mathbf{15}}'", 'j=\\tfrac{1}{2}')
    """
    if match := _DIMENSION.match(name):
        body = rf"\mathbf{{{match[1]}}}"
        return (rf"\overline{{{body}}}" if match[3] else body) + match[2]
    return re.sub(r"(\d+)/(\d+)", r"\\tfrac{\1}{\2}", name)


def html_name(name: str) -> str:
    """HTML of a trade name: bold, with the bar as an overline."""
    if match := _DIMENSION.match(name):
        style = ' style="text-decoration:overline"' if match[3] else ""
        return f"<b{style}>{match[1]}</b>{'′' * len(match[2])}"
    return f"<i>{escape(name)}</i>"


def story_table(story: ProductStory, shown: int) -> str:
    """The steps of a product as an HTML table of at most ``shown`` rows, the summary below it."""
    rows = "".join(f"<tr><td>{escape(step.text())}</td></tr>" for step in story.steps[:shown])
    rest = len(story.steps) - shown
    more = f"<tr><td>… and {rest} more steps</td></tr>" if rest > 0 else ""
    title = f"{html_name(story.left.name)} ⊗ {html_name(story.right.name)} by {escape(story.form)}"
    table = f"<table><caption>{title}</caption><tbody>{rows}{more}</tbody></table>"
    return f"{table}<p>{escape(story.summary())}</p>"
