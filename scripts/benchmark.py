"""Print every speed and accuracy target of latticefit with what this machine measures, all in one run.

    python scripts/benchmark.py                        all sections, some minutes
    python scripts/benchmark.py --section functions    one of them

The sides of a ratio are timed in turn, in three rounds, in one run (the compiled loop in a process of its own), so
that ratios, unlike times, carry over to other machines. Where one side takes the same time per value whatever the
length of the array (quadrature), it is timed on 300 values and compared per value. Run it on a machine that is
otherwise idle: processes beside it take from both sides, but never evenly.

A section is a function of `benchmarks` that returns rows and one line in `SECTIONS`. Progress goes to stderr, the
table to stdout; the exit code is 1 if a target is missed. A target that no requirement names, set with room to spare
to notice a change for the worse, is marked "own target". What cannot be measured here is said to be so, with the
reason.
"""

from __future__ import annotations

import argparse
import sys
from collections.abc import Callable

from benchmarks.fits import fits_section
from benchmarks.functions import functions_section
from benchmarks.growth import growth_section
from benchmarks.measuring import Row
from benchmarks.processes import process_section, startup_section
from benchmarks.starts import starts_section

SECTIONS: dict[str, Callable[[], list[Row]]] = {
    "functions": functions_section,
    "fits": fits_section,
    "starts": starts_section,
    "growth": growth_section,
    "startup": startup_section,
    "process": process_section,
}


def print_table(rows: list[Row]) -> None:
    widths = [max(len(text) for text in column) for column in zip(*((r.what, r.target) for r in rows), strict=True)]
    for row in rows:
        met = {True: "met", False: "MISSED", None: "-"}[row.met]
        print(f"{row.what:<{widths[0]}}  {row.target:<{widths[1]}}  {met:<6}  {row.measured}")


def main() -> int:
    parser = argparse.ArgumentParser(description="Print every target of latticefit with what is measured here.")
    parser.add_argument("--section", choices=list(SECTIONS), help="run only this section")
    chosen = parser.parse_args().section
    rows = [row for name, section in SECTIONS.items() if chosen in (None, name) for row in section()]
    print_table(rows)
    return 1 if any(row.met is False for row in rows) else 0


if __name__ == "__main__":
    sys.exit(main())
