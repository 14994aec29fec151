"""The command ``haarloom``: open the first notebook, or run a model document without a screen."""

from __future__ import annotations

import argparse
import sys
from collections.abc import Sequence
from pathlib import Path
from typing import NoReturn

from haarloom.exceptions import HaarloomError

__all__ = ["main"]


class _OneLineParser(argparse.ArgumentParser):
    """A parser whose complaint is one line, without the usage in front."""

    def error(self, message: str) -> NoReturn:
        self.exit(2, f"{self.prog}: {message} (see {self.prog} --help)\n")


def main(arguments: Sequence[str] | None = None) -> int:
    """Run the command; the result is the exit status: 0, or 1 for bad input, 2 for bad options."""
    options = _parser().parse_args(arguments)
    try:
        return int(options.action(options))
    except HaarloomError as problem:
        print(f"haarloom: {_one_line(problem)}", file=sys.stderr)
    except OSError as problem:
        print(f"haarloom: {problem.filename or 'input'}: {problem.strerror or problem}", file=sys.stderr)
    except KeyboardInterrupt:
        print("haarloom: interrupted", file=sys.stderr)
    return 1


def _parser() -> argparse.ArgumentParser:
    parser = _OneLineParser(
        prog="haarloom",
        description="Open the first notebook in JupyterLab, or run a model document and print its masses.",
    )
    parser.add_argument("--version", action="version", version=_version())
    parser.add_argument("--no-browser", action="store_true", help="only print the address, e.g. on a server")
    parser.add_argument("--port", type=_port, metavar="N", help="listen on this port (default: a free one)")
    parser.set_defaults(action=_open_notebook)
    commands = parser.add_subparsers(metavar="run", parser_class=_OneLineParser)
    run = commands.add_parser(
        "run", help="print the masses of a model document", description="Masses with their errors."
    )
    run.add_argument("document", type=Path, metavar="MODEL.json", help="a model document (*.loom.json)")
    run.add_argument("--out", type=Path, metavar="DIR", help="also write a CSV and a LaTeX file there")
    run.set_defaults(action=_run_document)
    return parser


def _port(text: str) -> int:
    if not text.isascii() or not text.isdigit() or not 1 <= int(text) <= 65535:
        raise argparse.ArgumentTypeError(f"{text!r} is no port: give a whole number from 1 to 65535")
    return int(text)


def _version() -> str:
    from haarloom import __version__

    return f"haarloom {__version__}"


def _open_notebook(options: argparse.Namespace) -> int:
    from haarloom.cli.lab import open_lab

    return open_lab(Path.cwd(), port=options.port, browser=not options.no_browser)


def _run_document(options: argparse.Namespace) -> int:
    from haarloom.cli.run import run_document

    return run_document(options.document, options.out)


def _one_line(problem: HaarloomError) -> str:
    # An ExpressionError draws a caret below its first line; on a terminal one line has to do.
    return str(problem).split("\n", 1)[0]
