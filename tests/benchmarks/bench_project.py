"""What importing Haarloom costs on top of importing SymPy.

    python tests/benchmarks/bench_project.py [--repeats 15] [--json FILE]

Each figure is the least CPU time of several fresh interpreters, in which SymPy is imported already;
the aim is at most 60 ms for ``import haarloom`` together with the first use of ``SU``.
"""

from __future__ import annotations

import argparse
import json
import os
import subprocess
import sys
from pathlib import Path

SOURCE = Path(__file__).parents[2] / "src"
SUBJECTS = {
    "import sympy": ("", "import sympy"),
    "import haarloom": ("import sympy", "import haarloom"),
    "+ first use of SU": ("import sympy", "import haarloom; haarloom.SU(3)"),
    "+ first irrep": ("import sympy", "import haarloom; haarloom.SU(3).irrep(1, 1).dimension"),
    "+ first transfer matrix": (
        "import sympy",
        "import haarloom as hl; G = hl.SU(3)\n"
        "hl.RingModel(hl.heat_kernel(G, 't'), hl.static_fermions(G, 'z')).transfer_matrix(1)",
    ),
}
TIMED = "import time\n{first}\nstart = time.process_time()\n{then}\nprint(time.process_time() - start)"


def seconds(first: str, then: str) -> float:
    """CPU time of ``then`` in a fresh interpreter that has run ``first``."""
    environment = dict(os.environ, PYTHONPATH=str(SOURCE))
    command = [sys.executable, "-c", TIMED.format(first=first, then=then)]
    return float(subprocess.run(command, env=environment, capture_output=True, text=True, check=True).stdout)


def main() -> None:
    """Print the table."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--repeats", type=int, default=15)
    parser.add_argument("--json", type=Path)
    options = parser.parse_args()
    best = dict.fromkeys(SUBJECTS, float("inf"))
    for _ in range(options.repeats):  # in turn, so that a busy moment touches all of them
        for name, codes in SUBJECTS.items():
            best[name] = min(best[name], seconds(*codes))
    print(f"{'':26}{'CPU ms':>8}{'of import sympy':>18}")
    for name, time in best.items():
        print(f"{name:26}{1e3 * time:8.1f}{time / best['import sympy']:18.3f}")
    if options.json:
        options.json.write_text(json.dumps(best, indent=1))


if __name__ == "__main__":
    main()
