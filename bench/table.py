"""The measured table as text, as Markdown for the README, and as JSON."""

from __future__ import annotations

import datetime
import json
import os
import platform
import re
from dataclasses import asdict
from importlib.metadata import version
from pathlib import Path

README = Path(__file__).parents[1] / "README.md"
RESULTS = Path(__file__).parents[1] / "target" / "speed.json"
BEGIN, END = "<!-- speed:begin -->", "<!-- speed:end -->"

#: Flat is: within this of the median.
FLAT = 0.15


def machine(threads):
    """What the numbers depend on. No name of a host."""
    model = platform.processor() or platform.machine()
    information = Path("/proc/cpuinfo")
    if information.exists():
        found = re.search(r"^model name\s*:\s*(.+)$", information.read_text(), re.MULTILINE)
        model = found[1].strip() if found else model
    return {
        "processor": model,
        "cores": os.cpu_count(),
        "threads": threads or os.cpu_count(),
        "system": f"{platform.system()} {platform.machine()}",
        "date": datetime.date.today().isoformat(),
        "python": platform.python_version(),
        **{name: version(name) for name in ("hourarc", "numpy", "pyerfa", "astropy")},
    }


def save(about, measured, flat):
    """Writes everything that was measured."""
    RESULTS.parent.mkdir(exist_ok=True)
    values = [
        asdict(row) | {"value": {isa: row.value(isa) for isa in row.ours_s}, "verdict": _verdicts(row)}
        for row in measured
    ]
    RESULTS.write_text(
        json.dumps({"machine": about, "cases": values, "flatness": flat}, indent=1, ensure_ascii=False) + "\n"
    )


def markdown(about, measured, flat):
    """The table of the README."""
    isas = list(measured[0].ours_s)
    heads = ["case", "against", "answers apart by", *isas, "gate", "aim"]
    lines = [
        f"Measured on {about['date']} by `python bench/compare.py`: {about['processor']}, "
        f"{about['threads']} threads for Hourarc, one for the others; numpy {about['numpy']}, "
        f"pyerfa {about['pyerfa']}, astropy {about['astropy']}. A ratio says how many times faster "
        "Hourarc is a row; in brackets what it takes a row (or a target-night). **Bold** misses its gate.",
        "",
        "| " + " | ".join(heads) + " |",
        "|---|---|---|" + "---:|" * (len(isas) + 2),
    ]
    for row in measured:
        cells = [_cell(row, isa) for isa in isas]
        cells = [f"**{c}**" if row.verdict(i) == "MISSED" else c for i, c in zip(isas, cells, strict=True)]
        bounds = [_bound(row, bound) for bound in (row.gate, row.aim)]
        lines.append("| " + " | ".join([row.case, row.against, row.agreement, *cells, *bounds]) + " |")
    scaled = [row for row in measured if row.kind == "ratio" and row.rival_rows != row.rows]
    if scaled:
        done = "; ".join(f"{_plain(row)}: {row.rival_rows:,} of {row.rows:,}" for row in scaled)
        lines += ["", f"Rivals that would take long did fewer rows, and are compared a row ({done})."]
    better = [row for row in measured if row.better]
    if better:
        told = "; ".join(
            f"{_plain(row)}: {row.better[0]}, {_times(row.value_beside_the_better(isas[0]))} ({isas[0]})"
            for row in better
        )
        lines += ["", f"Beside a rival that is used better than it usually is, the ratios are: {told}."]
    if flat:
        lines += ["", *_flat_lines(flat, isas)]
    return "\n".join(lines)


def text(measured, flat):
    """The table for a terminal: what was asked, gate, aim, measured, and whether it is met."""
    lines = []
    for row in measured:
        for isa in row.ours_s:
            lines.append(
                f"{_plain(row):62} {isa:8} {_cell(row, isa):>24}  gate {_bound(row, row.gate):>7}"
                f"  aim {_bound(row, row.aim):>8}  {row.verdict(isa)}"
            )
        if row.kind == "ratio":
            rival = row.rival_s / row.rival_rows * 1e9
            scaled = "" if row.rival_rows == row.rows else f", on {row.rival_rows:,} of {row.rows:,} rows"
            lines.append(
                f"    {row.against}: {rival:,.1f} ns a row{scaled}; answers apart by {row.agreement}"
            )
        if row.better:
            how, rows, seconds = row.better
            ratios = ", ".join(f"{_times(row.value_beside_the_better(isa))} {isa}" for isa in row.ours_s)
            lines.append(f"    used better ({how}): {seconds / rows * 1e9:,.1f} ns a row; {ratios}")
    if flat:
        lines += ["", *_flat_lines(flat, list(measured[0].ours_s) if measured else list(flat[0]["ns"]))]
    return "\n".join(lines)


def render(table):
    """Puts the table between the marks of the README."""
    page = README.read_text()
    before, rest = page.split(BEGIN)
    _, after = rest.split(END)
    README.write_text(f"{before}{BEGIN}\n{table}\n{END}{after}")


def _flat_lines(flat, isas):
    lines = []
    for isa in isas:
        costs = [row["ns"][isa] for row in flat]
        middle = sorted(costs)[len(costs) // 2]
        cells = ", ".join(
            f"{row['targets']:,} × {row['nights']:,}: {row['ns'][isa]:.2f}"
            + ("" if abs(row["ns"][isa] / middle - 1.0) <= FLAT else " (!)")
            for row in flat
        )
        lines.append(
            f"Nanoseconds a target-night with {isa}, targets × nights: {cells}. "
            f"(!) is further than {FLAT:.0%} from the median."
        )
    return lines


def _verdicts(row):
    return {isa: row.verdict(isa) for isa in row.ours_s}


def _cell(row, isa):
    if row.kind == "s":
        return f"{row.ours_s[isa] * 1e3:.{1 if row.ours_s[isa] < 0.02 else 0}f} ms"
    nanoseconds = row.ours_s[isa] / row.rows * 1e9
    return f"{_times(row.value(isa))} ({nanoseconds:,.{1 if nanoseconds < 100.0 else 0}f} ns)"


def _times(ratio):
    return f"{ratio:,.1f}×" if ratio < 100.0 else f"{ratio:,.0f}×"


def _bound(row, bound):
    return f"{bound * 1e3:.0f} ms" if row.kind == "s" else f"{bound:,g}×"


def _plain(row):
    return row.case.replace("`", "")
