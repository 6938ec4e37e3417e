"""Put the measured accuracy into the README, between its two markers.

    python tests/render_accuracy.py            rewrites the table from the last full run of the tests
    python tests/render_accuracy.py --check    fails where the README says something else

Figures move a little with the processor's instruction set, so `--check` lets a measured figure differ by half
of itself, or by a tenth of its gate; everything else must match to the letter.
"""

import json
import math
import sys
from pathlib import Path

from oracle.figures import GATES, MEASURED

README = Path(__file__).parents[1] / "README.md"
BEGIN, END = "<!-- accuracy:begin -->", "<!-- accuracy:end -->"


def two_digits(value):
    """A figure to two significant digits, rounded up: never better than measured."""
    if value == 0.0:
        return "0"
    scale = 10.0 ** (math.floor(math.log10(value)) - 1)
    value = math.ceil(value / scale - 1e-9) * scale
    return f"{value:.2g}" if value < 100.0 else f"{value:.0f}"


def table(measured):
    """The lines of the table."""
    lines = ["| quantity | against | cases | worst | gate |", "|---|---|---:|---:|---:|"]
    for key, gate in GATES.items():
        row = measured[key]
        cells = (f"{row['cases']:,}", two_digits(row["worst"]), f"{gate.limit:g}")
        cases, worst, limit = cells[0], *(f"{cell} {gate.unit}".strip() for cell in cells[1:])
        lines.append(f"| {gate.quantity} | {gate.against} | {cases} | {worst} | {limit} |")
    return lines


def differs(written, fresh):
    """The lines of a README's table that do not agree with the measured ones."""
    if len(written) != len(fresh):
        return [f"{len(written)} lines, {len(fresh)} measured"]
    wrong = []
    for old, new in zip(written, fresh, strict=True):
        a, b = ([cell.strip() for cell in line.split("|")] for line in (old, new))
        if len(a) != len(b) or a[:4] + a[5:] != b[:4] + b[5:]:
            wrong.append(old)
        elif a[4] != b[4]:
            x, y, limit = (float(cell.split()[0]) for cell in (a[4], b[4], b[5]))
            if abs(x - y) > max(0.5 * max(x, y), 0.1 * limit):
                wrong.append(old)
    return wrong


def main(arguments):
    """Exit code 0 done or in agreement, 1 where it is not, 2 for a wrong call."""
    if arguments not in ([], ["--check"]):
        print(__doc__, file=sys.stderr)
        return 2
    if not MEASURED.exists():
        print(f"{MEASURED}: no figures; run the tests first", file=sys.stderr)
        return 1
    measured = json.loads(MEASURED.read_text())
    if missing := [key for key in GATES if key not in measured]:
        print(f"{MEASURED}: no figure for {', '.join(missing)}; run all of the tests", file=sys.stderr)
        return 1
    text = README.read_text()
    if text.count(BEGIN) != 1 or text.count(END) != 1 or text.index(BEGIN) > text.index(END):
        print(f"{README}: wants {BEGIN} and {END} once each, in this order", file=sys.stderr)
        return 1
    head, rest = text.split(BEGIN)
    body, tail = rest.split(END)
    fresh = table(measured)
    if arguments:
        wrong = differs(body.strip().splitlines(), fresh)
        for line in wrong:
            print(f"{README}: not what was measured: {line}", file=sys.stderr)
        return 1 if wrong else 0
    README.write_text(f"{head}{BEGIN}\n" + "\n".join(fresh) + f"\n{END}{tail}")
    return 0


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
