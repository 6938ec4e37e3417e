"""Hourarc beside what people use today: one command prints the table, writes `target/speed.json`, and puts
the table into the README.

    python bench/compare.py                     the whole table: a million rows, some minutes
    python bench/compare.py --rows 20000        a quick look; the README is left alone

Every case compares the answers before the clock starts, and all are measured in one run. Close other
programs, and let nothing pin the kernels of numpy's libraries (OPENBLAS_CORETYPE).
"""

from __future__ import annotations

import argparse

import movers
import table
from cases import CASES as OF_STARS
from cases import Bench, Measured, flatness
from hourarc import _engine

FULL = 1_000_000
CASES = OF_STARS | movers.CASES


def main():
    """Measures, prints, writes."""
    parser = argparse.ArgumentParser(description=__doc__.split("\n\n")[0])
    known = _engine.instruction_sets()
    parser.add_argument("--rows", type=int, default=FULL, help="targets (1,000,000)")
    parser.add_argument(
        "--isa",
        action="append",
        choices=known,
        help="an instruction set, may be repeated (all wider than the baseline)",
    )
    parser.add_argument("--threads", type=int, help="threads of Hourarc (all cores)")
    parser.add_argument("--runs", type=int, default=3, help="the best of so many (3)")
    parser.add_argument("--only", action="append", choices=list(CASES), help="a case, may be repeated (all)")
    parser.add_argument(
        "--flat-targets", type=int, default=10_000_000, help="most targets of the flatness; 0: none"
    )
    parser.add_argument("--no-readme", action="store_true", help="leave the README alone")
    options = parser.parse_args()
    if _engine.debug_build:
        parser.error("this is a debug build of the extension: its speed means nothing")

    isas = options.isa or known[:0:-1] or known
    bench = Bench(options.rows, isas, options.threads, options.runs)
    about = table.machine(options.threads)
    measured: list[Measured] = []
    for word in options.only or CASES:
        made = CASES[word](bench)
        made = made if isinstance(made, list) else [made]
        print(table.text(made, []), flush=True)
        measured += made
    flat = flatness(bench, min(options.flat_targets, 10 * options.rows)) if options.flat_targets else []
    if flat:
        print(table.text([], flat))
    print(f"\n{about['processor']}, {about['threads']} threads, {about['date']}")
    whole = options.rows == FULL and not options.only
    if whole:
        table.save(about, measured, flat)
        print(f"written: {table.RESULTS}")
    if whole and not options.no_readme:
        table.render(table.markdown(about, measured, flat))
        print(f"written: {table.README}")
    missed = [row.case for row in measured if any(row.verdict(isa) == "MISSED" for isa in isas)]
    if missed:
        print("gates missed: " + "; ".join(case.replace("`", "") for case in missed))


if __name__ == "__main__":
    main()
