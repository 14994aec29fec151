"""Models, expressions and tables as text: what goes into files and comes out of them."""

from haarloom.documents.model_document import ModelDocument, load, read_document, save

__all__ = ["ModelDocument", "load", "read_document", "save"]
