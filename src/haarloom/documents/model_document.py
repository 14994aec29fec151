"""Model documents: a ring model with its values as a small JSON file that a colleague can open.

Version 1::

    {
      "format": "loom model",
      "version": 1,
      "name": "…",                  optional
      "invented": "…",              optional: says that the model describes no real system
      "notes": "…",                 optional
      "group": "SU(3)",
      "link": {"kind": "heat kernel", "parameters": {"t": "t"}},
      "site": [{"kind": "static fermions", "parameters": {"z": "z", "zbar": "0"}}],
      "values": {"t": "1", "z": "3/10"},      optional; numbers for the symbols
      "levels": 6,                            optional; eigenvalues, the leading one included
      "cutoff": 8                             optional; chosen from the bound when left out
    }

Kinds and parameters are those of :mod:`haarloom.actions`; numbers are exact, as text or as JSON
numbers, and are read by the grammar of :mod:`haarloom.documents.expressions`. Site weights multiply.
"""

from __future__ import annotations

import json
import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

import sympy

from haarloom.documents.expressions import format_expression, parse_expression
from haarloom.documents.tree import Node, read_tree
from haarloom.documents.weights import link_from, site_from_list, weight_entries, weight_entry
from haarloom.exceptions import DocumentError, ExpressionError, HaarloomError

if TYPE_CHECKING:
    from haarloom.numerics.spectrum import Spectrum
    from haarloom.ring.model import RingModel

__all__ = ["ModelDocument", "from_document", "load", "read_document", "save", "to_document"]

FORMAT = "loom model"
VERSION = 1
_REQUIRED = ("format", "version", "group", "link", "site")
_OPTIONAL = ("name", "invented", "notes", "values", "levels", "cutoff")
_GROUP = re.compile(r"SU\((\d{1,3})\)\Z")
_LEVELS = 6
_MOST_LEVELS = 1000
_LARGEST_CUTOFF = 100_000


@dataclass(frozen=True)
class ModelDocument:
    """A ring model with what one wants to know of it.

    Attributes
    ----------
    model
        The ring model.
    values
        Exact numbers for its parameters, by name; not all need one.
    levels
        Eigenvalues that are asked for, the leading one included.
    cutoff
        Keep the irreps with Σ a_i ≤ cutoff; None chooses it from the bound.
    name, notes
        Free text.
    invented
        Not empty for a model that describes no real system: says so.
    """

    model: RingModel
    values: Mapping[str, sympy.Expr] = field(default_factory=dict, hash=False)
    levels: int = _LEVELS
    cutoff: int | None = None
    name: str = ""
    notes: str = ""
    invented: str = ""

    def __post_init__(self) -> None:
        exact = {name: _exact_number(name, value) for name, value in dict(self.values).items()}
        known = {symbol.name for symbol in self.model.parameters}
        for name in exact:
            if name not in known:
                listed = ", ".join(sorted(known)) or "none"
                raise DocumentError(f"values.{name}: the model has no such parameter (it has: {listed})")
        object.__setattr__(self, "values", MappingProxyType(exact))

    def __reduce__(self) -> tuple[Any, ...]:
        # a read-only mapping does not pickle by itself
        facts = (self.levels, self.cutoff, self.name, self.notes, self.invented)
        return ModelDocument, (self.model, dict(self.values), *facts)

    def spectrum(self) -> Spectrum:
        """Masses at the document's values; see :meth:`haarloom.ring.model.RingModel.spectrum`."""
        return self.model.spectrum(levels=self.levels, cutoff=self.cutoff, **self.numbers())

    def numbers(self) -> dict[str, float | complex]:
        """The values as doubles, the nearest to the exact ones."""
        return {name: _nearest(value) for name, value in self.values.items()}


def to_document(document: ModelDocument) -> dict[str, Any]:
    """The document as plain JSON values.

    Raises
    ------
    DocumentError
        If a weight of the model is of a kind that documents do not know.
    """
    model = document.model
    content: dict[str, Any] = {"format": FORMAT, "version": VERSION}
    content |= {key: text for key in ("name", "invented", "notes") if (text := getattr(document, key))}
    content |= {
        "group": str(model.group),
        "link": weight_entry(model.link),
        "site": weight_entries(model.site),
    }
    if document.values:
        content["values"] = {name: format_expression(value) for name, value in document.values.items()}
    content["levels"] = document.levels
    if document.cutoff is not None:
        content["cutoff"] = document.cutoff
    return content


def from_document(content: Mapping[str, Any] | Node) -> ModelDocument:
    """Build a document from JSON values, checking every one.

    Raises
    ------
    DocumentError
        For unknown or missing keys, a foreign format or version, values of the wrong kind or outside
        their domain; the message begins with the path in the document, e.g. ``site[0].parameters.z``.
    """
    root = content if isinstance(content, Node) else read_tree(json.dumps(content))
    if not isinstance(root.value, dict) or root.value.get("format") != FORMAT:
        root.keys(["format"], root.value if isinstance(root.value, dict) else ())
        root.child("format").refuse(f"{root.value['format']!r} is not {FORMAT!r}: this is no model document")
    if root.value.get("version") != VERSION:
        shown = root.value.get("version")
        Node(shown, "version").refuse(f"{shown!r} given; this Haarloom reads version {VERSION}")
    keys = root.keys(_REQUIRED, _OPTIONAL)
    texts = {key: root.child(key).text() for key in ("name", "invented", "notes") if key in keys}
    values = _values(root.child("values")) if "values" in keys else {}
    levels = root.child("levels").whole(2, _MOST_LEVELS) if "levels" in keys else _LEVELS
    cutoff = root.child("cutoff").whole(0, _LARGEST_CUTOFF) if "cutoff" in keys else None
    return ModelDocument(_model(root), values, levels, cutoff, **texts)


def read_document(path: str | Path) -> ModelDocument:
    """Read a model document from a file.

    Raises
    ------
    DocumentError
        As :func:`from_document`, the file's name first.
    OSError
        If the file cannot be read.
    """
    try:
        return from_document(read_tree(Path(path).read_text(encoding="utf-8")))
    except UnicodeDecodeError:
        raise DocumentError(f"{path}: no text in UTF-8, so no model document") from None
    except DocumentError as problem:
        raise DocumentError(f"{path}: {problem}") from None


def save(
    model: RingModel | ModelDocument, path: str | Path, values: Mapping[str, Any] | None = None, **facts: Any
) -> Path:
    """Write a model document.

    Parameters
    ----------
    model
        A ring model, or a whole document, which is written as it is.
    path
        Where to; by custom ``NAME.loom.json``.
    values
        Numbers for its parameters; a float counts as the exact decimal that it prints as.
    **facts
        ``levels``, ``cutoff``, ``name``, ``notes``, ``invented`` of :class:`ModelDocument`.

    Examples
    --------
    >>> import haarloom as hl, pathlib, tempfile
    >>> G = hl.SU(3)
    >>> model = hl.RingModel(hl.heat_kernel(G, "t"), hl.static_fermions(G, "z"))
    >>> with tempfile.TemporaryDirectory() as folder:
    ...     path = hl.save(model, pathlib.Path(folder) / "x.loom.json", values={"t": 1, "z": 0.3})
    ...     hl.load(path) == model
    True
    """
    if isinstance(model, ModelDocument):
        if values is not None or facts:
            raise DocumentError(
                "a whole document is saved as it is: change it with dataclasses.replace first"
            )
        document = model
    else:
        document = ModelDocument(model, values or {}, **facts)
    content = to_document(document)
    if from_document(content).model != document.model:
        raise DocumentError("this model does not read back as itself: does it hold floating-point numbers?")
    target = Path(path)
    target.write_text(json.dumps(content, indent=2, ensure_ascii=False) + "\n", encoding="utf-8")
    return target


def load(path: str | Path) -> RingModel:
    """The ring model of a document; :func:`read_document` gives the values too."""
    return read_document(path).model


def _model(root: Node) -> RingModel:
    from haarloom.algebra.group import SU
    from haarloom.ring.model import RingModel

    place = root.child("group")
    match = _GROUP.match(place.text())
    if match is None:
        place.refuse(f"{place.value!r} given; write it like 'SU(3)'")
    try:
        group = SU(int(match[1]))
    except HaarloomError as problem:
        place.refuse(str(problem))
    return RingModel(link_from(root.child("link"), group), site_from_list(root.child("site"), group))


def _values(place: Node) -> dict[str, sympy.Expr]:
    return {name: _value(node) for name, node in place.children()}


def _value(node: Node) -> sympy.Expr:
    if isinstance(node.value, bool | dict | list) or node.value is None:
        node.refuse('a number is needed, such as 0.3 or "3/10"')
    try:
        return parse_expression(str(node.value), allowed_symbols=())
    except ExpressionError as problem:
        node.refuse(str(problem))


def _exact_number(name: str, value: Any) -> sympy.Expr:
    try:
        exact = parse_expression(repr(value) if isinstance(value, float) else str(value), allowed_symbols=())
    except ExpressionError as problem:
        raise DocumentError(f"values.{name}: {problem}") from None
    return exact


def _nearest(value: sympy.Expr) -> float | complex:
    number = complex(value)
    return number if number.imag else number.real
