"""Run a model document without a screen: its masses with their errors."""

from __future__ import annotations

from pathlib import Path

from haarloom.documents.exports import csv_table, latex_table, text_table
from haarloom.documents.model_document import ModelDocument, read_document
from haarloom.numerics.spectrum import Spectrum

__all__ = ["run_document"]


def run_document(path: Path, out: Path | None = None) -> int:
    """Print the masses of the document at ``path``; write them to the folder ``out`` as well if given.

    Raises
    ------
    DocumentError
        For a document that cannot be used.
    HaarloomError
        For a model without a spectrum at its values.
    OSError
        For a file that cannot be read or written.
    """
    document = read_document(path)
    spectrum = document.spectrum()
    print(_heading(document, spectrum))
    print(text_table(spectrum))
    if out is not None:
        for written in _write(spectrum, path, out):
            print(f"wrote {written}")
    return 0


def _heading(document: ModelDocument, spectrum: Spectrum) -> str:
    point = ", ".join(f"{name} = {value}" for name, value in document.values.items())
    lines = [
        document.name or repr(document.model),
        f"{document.model.group}; {point or 'no parameters'}; cutoff {spectrum.cutoff}, {spectrum.solver}",
        spectrum.status,
    ]
    if document.invented:
        lines.insert(1, f"Invented: {document.invented}")
    return "\n".join(lines)


def _write(spectrum: Spectrum, path: Path, out: Path) -> list[Path]:
    out.mkdir(parents=True, exist_ok=True)
    stem = path.name.split(".")[0]
    tables = {out / f"{stem}-masses.csv": csv_table, out / f"{stem}-masses.tex": latex_table}
    for target, table in tables.items():
        target.write_text(table(spectrum), encoding="utf-8")
    return list(tables)
