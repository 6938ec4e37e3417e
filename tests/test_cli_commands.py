"""The command line as its users meet it: files, exit codes, what goes to which stream."""

from __future__ import annotations

import csv
import json
import os
import subprocess
import sys
from pathlib import Path

import numpy as np
import pyarrow.compute as pc
import pyarrow.parquet as pq
import pytest
from hourarc.cli._run import run

PLAN = """
[site]
name = "Saltpan Ridge"
longitude_deg = 24.5
latitude_deg = -20.9
height_m = 1148

[limits]
altitude_min_deg = 30
window_min_s = 600
"""
TARGETS = "name,ra,dec\n" + "".join(f"T{i:02d},{i * 15},{-80 + i * 6}\n" for i in range(24))


@pytest.fixture
def plan(tmp_path: Path) -> Path:
    path = tmp_path / "plan.toml"
    path.write_text(PLAN)
    return path


@pytest.fixture
def targets(tmp_path: Path) -> Path:
    path = tmp_path / "targets.csv"
    path.write_text(TARGETS)
    return path


def night(plan: Path, targets: Path, *options: object, date: str = "2026-03-10") -> int:
    return run(["night", str(plan), str(targets), "--night", date, *map(str, options)])


def process(*arguments: object, **keywords: object) -> subprocess.CompletedProcess[str]:
    command = [sys.executable, "-m", "hourarc", *map(str, arguments)]
    return subprocess.run(command, capture_output=True, text=True, check=False, **keywords)  # type: ignore[call-overload]


def without_comments(path: Path) -> list[dict[str, str]]:
    return list(csv.DictReader(line for line in path.read_text().splitlines() if not line.startswith("#")))


# ---- night -------------------------------------------------------------------------------------------------


def test_a_night_leaves_windows_and_what_blocks_the_others(
    plan: Path, targets: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    output = plan.parent / "windows.parquet"
    assert night(plan, targets, "-o", output) == 0
    windows, blocked = pq.read_table(output), pq.read_table(plan.parent / "windows.blocked.parquet")
    having = set(windows["row"].to_pylist())
    assert having.isdisjoint(blocked["row"].to_pylist())
    assert having | set(blocked["row"].to_pylist()) == set(range(1, 25))
    assert all(word not in ("", "none") for word in blocked["blocked_by"].to_pylist())
    assert (windows["duration_s"].to_numpy() >= 600.0).all()
    assert not (plan.parent / "windows.rejected.csv").exists()
    printed = capsys.readouterr()
    assert "24 rows read = 24 planned + 0 rejected" in printed.out
    assert "Saltpan Ridge (24.5000° E, 20.9000° S, 1148 m)" in printed.out and "UTC" in printed.out
    assert str(output) in printed.out and printed.err == ""


def test_the_same_night_gives_the_same_bytes(plan: Path, targets: Path) -> None:
    output = plan.parent / "windows.parquet"
    first = [night(plan, targets, "-q", "-o", output, "--threads", 1), output.read_bytes()]
    assert [night(plan, targets, "-q", "-o", output, "--threads", 2), output.read_bytes()] == first


def test_many_blocks_are_one_block(plan: Path, targets: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    output = plan.parent / "windows.csv"
    assert night(plan, targets, "-q", "-o", output) == 0
    whole = output.read_bytes(), (plan.parent / "windows.blocked.csv").read_bytes()
    monkeypatch.setattr("hourarc.cli._plan_night.BLOCK", 5)
    assert night(plan, targets, "-q", "-o", output) == 0
    assert (output.read_bytes(), (plan.parent / "windows.blocked.csv").read_bytes()) == whole


def test_every_suffix_holds_the_same_windows(plan: Path, targets: Path) -> None:
    for suffix in ("parquet", "csv", "ecsv"):
        assert night(plan, targets, "-q", "-o", plan.parent / f"w.{suffix}") == 0
    rows = pq.read_table(plan.parent / "w.parquet").num_rows
    assert (
        len(without_comments(plan.parent / "w.csv"))
        == len(without_comments(plan.parent / "w.ecsv"))
        == rows
        > 0
    )


def test_windows_to_standard_output(plan: Path, targets: Path) -> None:
    done = process("night", plan, targets, "--night", "2026-03-10", "-o", "-")
    assert done.returncode == 0
    assert "24 rows read" in done.stderr and "24 rows read" not in done.stdout
    lines = [line for line in done.stdout.splitlines() if not line.startswith("#")]
    assert lines[0].startswith("row,name,start,stop,duration_s,start_reason,stop_reason")
    quiet = process("night", plan, targets, "--night", "2026-03-10", "-o", "-", "-q")
    assert quiet.stderr == "" and quiet.stdout.splitlines()[-1] == lines[-1]


def test_rejected_rows_are_listed_beside_the_result(
    plan: Path, targets: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    targets.write_text(TARGETS + "U1,abc,5\nU2,10,95\nU3,20\nU4,nan,5\n")
    output = plan.parent / "windows.ecsv"
    assert night(plan, targets, "-o", output) == 3
    listed = without_comments(plan.parent / "windows.rejected.csv")
    assert [(r["row"], r["name"], r["column"], r["value"], r["reason"]) for r in listed] == [
        ("25", "U1", "ra", "abc", "not a number"),
        ("26", "U2", "dec", "95", "outside -90 to 90 deg"),
        ("27", "", "", "U3,20", "2 values where there are 3 columns"),
        ("28", "U4", "ra", "nan", "not a finite number"),
    ]
    printed = capsys.readouterr()
    assert "28 rows read = 24 planned + 4 rejected" in printed.out
    assert "4 of 28 rows" in printed.err and "windows.rejected.csv" in printed.err
    # A later run without rejected rows does not leave the old list beside the new result.
    targets.write_text(TARGETS)
    assert night(plan, targets, "-q", "-o", output) == 0
    assert without_comments(plan.parent / "windows.rejected.csv") == []


def test_limits_of_each_target(plan: Path, targets: Path) -> None:
    lines = TARGETS.splitlines()
    rows = [lines[0] + ",lowest"] + [f"{line},{30 if i % 2 else 85}" for i, line in enumerate(lines[1:])]
    targets.write_text("\n".join(rows) + "\n")
    plan.write_text(PLAN.replace("altitude_min_deg = 30", 'altitude_min_deg = { column = "lowest" }'))
    output = plan.parent / "w.parquet"
    assert night(plan, targets, "-q", "-o", output) == 0
    limits = json.loads(pq.read_metadata(output).metadata[b"hourarc.limits"])
    assert limits["altitude_min_deg"] == {"column": "lowest"}
    strict = set(pq.read_table(output)["row"].to_pylist())
    plan.write_text(PLAN)
    assert night(plan, targets, "-q", "-o", output) == 0
    loose = set(pq.read_table(output)["row"].to_pylist())
    assert strict < loose and {row for row in loose if row % 2 == 0} == {r for r in strict if r % 2 == 0}


def test_warnings_and_notes_go_to_standard_error(
    plan: Path, targets: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    targets.write_text("name,ra,dec,pmra,pmdec\nA,5,1,,3\nB,6,2,1,3\n")
    assert night(plan, targets, "-o", "-") == 0
    err = capsys.readouterr().err
    assert "hourarc: warning:" in err and "look like hours" in err
    assert "hourarc: note:" in err and '"pmra": 1 empty cells' in err and "J2000.0" in err
    assert night(plan, targets, "-o", "-", "-q") == 0
    err = capsys.readouterr().err
    assert "look like hours" in err and "hourarc: note" not in err, "--quiet keeps the warnings"


def test_a_lowered_sun_limit_is_cautioned_once(
    plan: Path, targets: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    plan.write_text(PLAN + "sun_separation_min_deg = 10\n")
    assert night(plan, targets, "-q", "-o", plan.parent / "w.csv") == 0
    err = capsys.readouterr().err
    assert err.count("hourarc: caution:") == 1 and "never the interlock" in err
    assert "# hourarc.caution: " in (plan.parent / "w.csv").read_text()


@pytest.mark.parametrize(
    ("date", "said"),
    [
        ("2026-02-30", "2026-02-30 does not exist: February 2026 has 28 days"),
        ("2026-13-01", "there is no month 13"),
        ("1959-12-31", "given 1959-12-31, allowed 1960-01-01 to 2100-12-31: there is no UTC before 1960"),
        ("2101-01-01", "given 2101-01-01, allowed 1960-01-01 to 2100-12-31: the ephemeris ends there"),
        ("yesterday", "given 'yesterday'; a date such as 2026-03-10 is needed"),
    ],
)
def test_nights_that_cannot_be(
    plan: Path, targets: Path, date: str, said: str, capsys: pytest.CaptureFixture[str]
) -> None:
    assert night(plan, targets, date=date) == 2
    assert said in capsys.readouterr().err


def test_a_night_past_the_table_of_orientation_says_so(
    plan: Path, targets: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    said = "The rotation of the Earth is extrapolated past its table"
    assert night(plan, targets) == 0 and said not in capsys.readouterr().out
    assert night(plan, targets, date="2080-03-10") == 0 and said in capsys.readouterr().out
    assert run(["sky", str(plan), str(targets), "--at", "2080-03-10T20:00"]) == 0
    assert said in capsys.readouterr().out


def test_a_moon_that_does_not_set(plan: Path, targets: Path, capsys: pytest.CaptureFixture[str]) -> None:
    # The Moon sets at 10:21 on the tenth, just before local mean noon, and next at 11:14 on the eleventh.
    assert night(plan, targets) == 0
    assert "Moon          rises 03-10 21:13, does not set; " in capsys.readouterr().out


def test_wrong_calls(plan: Path, targets: Path, capsys: pytest.CaptureFixture[str]) -> None:
    def said(code: int, *arguments: object) -> str:
        assert run([str(a) for a in arguments]) == code
        printed = capsys.readouterr()
        assert printed.out == ""
        return printed.err

    here = plan.parent
    day = ("--night", "2026-03-10")
    assert "does not exist" in said(2, "night", plan, here / "nowhere.csv", *day)
    assert 'there is no command "nihgt"; did you mean "night"?' in said(2, "nihgt")
    assert "--night" in said(2, "night", plan, targets)
    assert "there is no folder" in said(2, "night", plan, targets, *day, "-o", here / "no" / "w.csv")
    assert "which is an input" in said(2, "night", plan, targets, *day, "-o", targets)
    assert "results are written as" in said(2, "night", plan, targets, *day, "-o", here / "w.txt")
    assert "--threads" in said(2, "night", plan, targets, *day, "--threads", 0)
    plan.write_text(PLAN + "moon_separation_deg = 3\n")
    assert 'line 11, [limits]: unknown key "moon_separation_deg"' in said(2, "night", plan, targets, *day)
    plan.write_text(PLAN)
    targets.write_text("")
    assert "the file is empty" in said(1, "night", plan, targets, *day)
    targets.write_text("a,b\n1,2\n")
    assert "no column for ra and dec" in said(2, "night", plan, targets, *day)
    assert targets.read_text() == "a,b\n1,2\n"


def test_an_interrupted_run_leaves_nothing(
    plan: Path, targets: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    def interrupted(*_: object, **__: object) -> None:
        raise KeyboardInterrupt

    before = sorted(path.name for path in plan.parent.iterdir())
    for place in ("hourarc.windows", "hourarc.io.writers.write_rejected", "hourarc.io.writers.write_table"):
        targets.write_text(TARGETS + "bad,x,1\n")
        with monkeypatch.context() as patch:
            patch.setattr(place, interrupted)
            assert night(plan, targets, "-q", "-o", plan.parent / "w.parquet") == 1
        assert "no result was written" in capsys.readouterr().err
        assert sorted(path.name for path in plan.parent.iterdir()) == before


def test_a_full_disk_is_told_and_leaves_the_older_result(
    plan: Path, targets: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    output = plan.parent / "w.parquet"
    output.write_text("older")

    def full(*_: object, **__: object) -> None:
        raise OSError(28, "No space left on device", str(output))

    monkeypatch.setattr("pyarrow.parquet.write_table", full)
    assert night(plan, targets, "-q", "-o", output) == 1
    assert capsys.readouterr().err == f"hourarc: error: {output}: No space left on device\n"
    assert output.read_text() == "older"


@pytest.mark.skipif(not sys.platform.startswith("linux"), reason="needs the limits and devices of Linux")
def test_a_disk_that_fills_while_writing(plan: Path, tmp_path: Path) -> None:
    import resource

    targets = tmp_path / "many.csv"
    targets.write_text("ra,dec\n" + "".join(f"{i * 0.01},{-60 + i % 50}\n" for i in range(20_000)))

    def small() -> None:
        resource.setrlimit(resource.RLIMIT_FSIZE, (20_000, 20_000))

    before = sorted(path.name for path in tmp_path.iterdir())
    for suffix in ("parquet", "csv", "ecsv"):
        output = tmp_path / f"w.{suffix}"
        arguments = ("night", plan, targets, "--night", "2026-03-10", "-q", "-o", output)
        done = process(*arguments, preexec_fn=small)
        assert done.returncode == 1
        assert done.stderr == f"hourarc: error: {output}: File too large\n"
        assert sorted(path.name for path in tmp_path.iterdir()) == before, "nothing is left behind"
    with open("/dev/full", "w") as full:
        command = [sys.executable, "-m", "hourarc", *map(str, arguments[:-1]), "-"]
        done = subprocess.run(command, stdout=full, stderr=subprocess.PIPE, text=True, check=False)
    assert done.returncode == 1
    assert done.stderr == "hourarc: error: standard output: No space left on device\n"


@pytest.mark.skipif(sys.platform == "win32", reason="closes a stream as a POSIX shell does")
def test_closed_streams(plan: Path, targets: Path) -> None:
    program = f'"{sys.executable}" -m hourarc night "{plan}" "{targets}" --night 2026-03-10'
    for closed in (">&-", "2>&-", ">&- 2>&-"):
        output = plan.parent / "w.csv"
        done = subprocess.run(
            f'{program} -o "{output}" {closed}', shell=True, capture_output=True, text=True, check=False
        )
        assert done.returncode == 0 and output.exists() and "Traceback" not in done.stderr
        output.unlink()
    # The report must not slip into the result when its own stream is closed.
    done = subprocess.run(f"{program} -o - 2>&-", shell=True, capture_output=True, text=True, check=True)
    assert "rows read" not in done.stdout and "row,name,start" in done.stdout


def test_a_folder_that_may_not_be_written(
    plan: Path, targets: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    def denied(path: object, *_: object) -> int:
        raise PermissionError(13, "Permission denied", str(path))

    # Not by the folder's own permissions: whoever runs this may be root.
    monkeypatch.setattr("hourarc.io.whole.os.open", denied)
    output = plan.parent / "w.csv"
    assert night(plan, targets, "-q", "-o", output) == 1
    assert capsys.readouterr().err == f"hourarc: error: {output}: Permission denied\n"


def test_folders_where_files_are_needed(
    plan: Path, targets: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    folder = plan.parent / "folder.csv"
    folder.mkdir()
    assert night(folder, targets) == 2 and f"File '{folder}' is a directory" in capsys.readouterr().err
    assert night(plan, folder) == 2 and f"File '{folder}' is a directory" in capsys.readouterr().err
    assert night(plan, targets, "-o", folder) == 2
    assert f"File '{folder}' is a directory" in capsys.readouterr().err


# ---- almanac -----------------------------------------------------------------------------------------------


def test_almanac(plan: Path, capsys: pytest.CaptureFixture[str]) -> None:
    output = plan.parent / "almanac.parquet"
    assert run(["almanac", str(plan), "--from", "2026-03-01", "--nights", "30", "-o", str(output)]) == 0
    printed = capsys.readouterr().out
    assert "UTC" in printed and "Saltpan Ridge" in printed
    lines = [line for line in printed.splitlines() if line.startswith("2026-")]
    assert "-0.00" not in printed and "0.00" in lines[2], "around the full Moon no hour is without it"
    assert [line[:10] for line in lines] == [f"2026-03-{d:02d}" for d in range(1, 31)]
    assert len({len(line) for line in lines}) == 1, "columns are aligned"
    table = pq.read_table(output)
    assert table.num_rows == 30 and table["night"].to_pylist()[0].isoformat() == "2026-03-01"
    assert table.schema.metadata[b"hourarc.span"] == b"30 nights from 2026-03-01"
    sunset = table["sunset"].to_numpy()[0]
    shown = lines[0].split()[1]
    assert abs(sunset - np.datetime64(f"2026-03-01T{shown[:5]}")) <= np.timedelta64(30, "s")


def test_almanac_refuses_what_it_cannot_give(plan: Path, capsys: pytest.CaptureFixture[str]) -> None:
    for first, nights, said in (
        ("2100-12-31", "2", "the last night would be 2101-01-01, allowed to 2100-12-31"),
        ("2026-02-29", "2", "February 2026 has 28 days"),
        ("2026-03-01", "0", "--nights"),
        (
            "1950-01-01",
            "3",
            "allowed 1960-01-01 to 2100-12-31: there is no UTC before 1960",
        ),
    ):
        assert run(["almanac", str(plan), "--from", first, "--nights", nights]) == 2
        assert said in capsys.readouterr().err


# ---- demo --------------------------------------------------------------------------------------------------


def test_demo(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    folder = tmp_path / "demo"
    assert run(["demo", str(folder)]) == 0
    printed = capsys.readouterr()
    assert "6,000 rows read = 6,000 planned + 0 rejected" in printed.out and printed.err == ""
    assert sorted(path.name for path in folder.iterdir()) == [
        "saltpan-ridge.toml",
        "targets.csv",
        "windows.blocked.parquet",
        "windows.parquet",
    ]
    assert pq.read_table(folder / "windows.parquet").num_rows > 1000
    # The command that it names does the same again.
    command = next(
        line for line in printed.out.splitlines() if line.strip().startswith("hourarc night")
    ).split()
    first = pq.read_table(folder / "windows.parquet")
    assert run([*command[1:], "-q"]) == 0
    assert pq.read_table(folder / "windows.parquet").equals(first)


def test_demo_keeps_what_was_changed(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    from hourarc.demo import write_demo

    plan, _, kept = write_demo(tmp_path)
    assert not kept
    plan.write_text(plan.read_text().replace("airmass_max = 2.0", "airmass_max = 1.5"))
    assert write_demo(tmp_path)[2] == [plan] and "airmass_max = 1.5" in plan.read_text()
    assert write_demo(tmp_path, replace=True)[2] == [] and "airmass_max = 2.0" in plan.read_text()


def test_demo_targets_are_the_same_everywhere() -> None:
    import hashlib

    from hourarc.demo.programmes import target_list

    text = target_list()
    assert text.count("\n") == 6001 and len({line.split(",")[0] for line in text.splitlines()}) == 6001
    assert hashlib.sha256(text.encode()).hexdigest()[:16] == "36ae94ca67af0625"


# ---- the program -------------------------------------------------------------------------------------------


def test_help_is_quick_and_whole() -> None:
    # The processor's time, not the wall's: other work on the machine must not decide this test.
    resource = pytest.importorskip("resource")
    took = []
    for _ in range(3):
        before = resource.getrusage(resource.RUSAGE_CHILDREN)
        done = process("--help")
        after = resource.getrusage(resource.RUSAGE_CHILDREN)
        took.append(after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime)
        assert done.returncode == 0 and done.stderr == ""
    for word in ("night", "almanac", "demo", "--version", "Exit codes", "interlock"):
        assert word in done.stdout
    assert min(took) < 0.3, f"hourarc --help took {min(took):.2f} s"


def test_help_imports_no_heavy_package() -> None:
    code = "import sys\nfrom hourarc.cli import main\ntry: main(['--help'])\nexcept SystemExit: pass\n"
    code += "print([m for m in ('pyarrow', 'astropy', 'pandas') if m in sys.modules], file=sys.stderr)"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stderr.strip() == "[]"


def test_version() -> None:
    import hourarc

    assert process("--version").stdout == f"hourarc {hourarc.__version__}\n"


def test_every_command_explains_itself(capsys: pytest.CaptureFixture[str]) -> None:
    for command in ("night", "almanac", "demo"):
        assert run([command, "--help"]) == 0
        assert command in capsys.readouterr().out


def test_a_reader_that_goes_away_is_no_error_message(plan: Path) -> None:
    command = [
        sys.executable,
        "-m",
        "hourarc",
        "almanac",
        str(plan),
        "--from",
        "2000-01-01",
        "--nights",
        "3000",
    ]
    with subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True) as running:
        assert running.stdout is not None and running.stderr is not None
        running.stdout.read(10)
        running.stdout.close()
        assert running.stderr.read() == ""
        assert running.wait() == 1


@pytest.mark.skipif(not hasattr(os, "openpty"), reason="needs a pseudo-terminal")
def test_progress_on_a_terminal_only(plan: Path, targets: Path) -> None:
    rows = "".join(f"T{i},{i % 360},-30\n" for i in range(45_000))
    targets.write_text("name,ra,dec\n" + rows)
    arguments = ("night", plan, targets, "--night", "2026-03-10", "-o", "-")
    assert "planning" not in process(*arguments).stderr
    master, slave = os.openpty()
    for options, shown in (((), True), (("-q",), False)):
        command = [sys.executable, "-m", "hourarc", *map(str, arguments), *options]
        with subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=slave) as running:
            assert running.wait() == 0
        os.write(slave, b"|end|")
        text = b""
        while b"|end|" not in text:
            text += os.read(master, 65536)
        assert (b"planning" in text) is shown
    os.close(slave)
    os.close(master)


# ---- explain -----------------------------------------------------------------------------------------------


def test_explain(plan: Path, targets: Path, capsys: pytest.CaptureFixture[str]) -> None:
    def explain(*arguments: object, code: int = 0) -> tuple[str, str]:
        assert run(["explain", *map(str, (plan, targets, "--night", "2026-03-10", *arguments))]) == code
        printed = capsys.readouterr()
        return printed.out, printed.err

    import hourarc

    names = [line.split(",")[0] for line in targets.read_text().splitlines()[1:]]
    text, err = explain("--name", names[9])
    assert text.startswith(f"{names[9]}, night of 2026-03-10, at ") and "all together" in text and err == ""
    assert explain("--row", 10)[0] == text
    output = plan.parent / "why.parquet"
    explain("--row", 10, "-o", output, "-q")
    table = pq.read_table(output)
    assert set(table["limit"].to_pylist()) <= set(hourarc.REASON_WORDS)
    assert set(table["row"].to_pylist()) == {10} and set(table["name"].to_pylist()) == {names[9]}
    assert b"hourarc.limits" in table.schema.metadata
    assert explain("--row", 10, "-o", "-")[0].count(f"\n10,{names[9]},") == table.num_rows
    # The planned windows are what it leaves.
    assert night(plan, targets, "-q", "-o", plan.parent / "w.parquet") == 0
    capsys.readouterr()
    planned = pq.read_table(plan.parent / "w.parquet", filters=[("row", "=", 10)])
    left = table.filter((pc.field("limit") == "window_min") & ~pc.field("alone"))
    assert planned.num_rows
    for edge in ("start", "stop"):
        assert planned[edge].to_numpy().tolist() == left[edge].to_numpy().tolist()

    assert "--name or --row is needed" in explain(code=2)[1]
    assert "one of them is needed" in explain("--name", "A", "--row", 1, code=2)[1]
    assert f'did you mean "{names[9]}"?' in explain("--name", names[9] + "x", code=2)[1]
    assert "there is no row 999" in explain("--row", 999, code=2)[1]
    targets.write_text(targets.read_text() + f"{names[0]},10,20\nbad,x,1\n")
    assert f"2 rows are named '{names[0]}'; one of --row 1, " in explain("--name", names[0], code=2)[1]
    assert "that row was rejected: row " in explain("--name", "bad", code=2)[1]
    assert run(["explain", str(plan), "--bodies", "jupiter", "--night", "2026-03-10"]) == 0
    assert capsys.readouterr().out.startswith("jupiter, night of 2026-03-10")


# ---- demand ------------------------------------------------------------------------------------------------


def test_demand(plan: Path, targets: Path, capsys: pytest.CaptureFixture[str]) -> None:
    def demand(*arguments: object, code: int = 0) -> tuple[str, str]:
        given = (plan, targets, "--from", "2026-03-01", "--nights", 10, *arguments)
        assert run(["demand", *map(str, given)]) == code
        printed = capsys.readouterr()
        return printed.out, printed.err

    output = plan.parent / "d.parquet"
    text, _ = demand("--hours", 2, "-o", output)
    lines = text.splitlines()
    assert lines[0].startswith("Saltpan Ridge (") and "10 nights, 2026-03-01 to 2026-03-10" in lines[1]
    assert "24 rows read = 24 counted + 0 rejected" in lines
    assert sum(":00–" in line for line in lines) == 24 and "targets ask for more hours than they have" in text
    bins, each = pq.read_table(output), pq.read_table(plan.parent / "d.targets.parquet")
    assert bins.num_rows == 24 and each.num_rows == 24 and each["requested_hours"].to_pylist() == [2.0] * 24
    short = each.filter(pc.field("requested_hours") > pc.field("available_hours"))
    assert f"\n{short.num_rows} targets ask for more" in text
    placed = each.filter(pc.field("available_hours") > 0.0)
    assert pc.sum(bins["demand_hours"]).as_py() == pytest.approx(2.0 * placed.num_rows)
    # The shade of each bar is what its numbers say.
    line = next(line for line in lines if line.strip().startswith("10:00–11:00"))
    supply, asked = (float(cell) for cell in line.split() if "." in cell)
    assert ("▓" in line) == (asked > 1.1 * supply) or abs(asked - supply) < 3.0

    # From a column, with a row that asks for nothing sensible.
    rows = [f"{line},{i % 3}" for i, line in enumerate(TARGETS.splitlines()[1:])]
    targets.write_text("name,ra,dec,t_req\n" + "\n".join(rows) + "\nX,10,20,-1\nY,10,20,\n")
    _, err = demand("--hours", "t_req", "-q", "-o", output, code=3)
    assert "outside 0 to 100000 of requested_hours" in err
    assert "empty, but requested_hours is taken from here" in err
    assert pq.read_table(plan.parent / "d.targets.parquet")["requested_hours"].to_pylist() == [0, 1, 2] * 8
    assert b"--hours t_req" in pq.read_metadata(output).metadata[b"hourarc.command"]

    assert "'hours' asks for a column" not in err
    assert 'asks for a column "t_rek"' in demand("--hours", "t_rek", code=2)[1]
    assert "given -1, allowed 0 to 100000 h" in demand("--hours", "-1", code=2)[1]
    assert "bin_h: given 5, allowed a width that divides 24 h" in demand("--hours", 1, "--bin", 5, code=2)[1]
    assert (
        "the last night would be" in demand("--hours", 1, "--nights", 3000, "--from", "2099-01-01", code=2)[1]
    )
    call = ["demand", str(plan), "--bodies", "mars", "--from", "2026-03-01", "--nights", "2", "--hours"]
    assert run([*call, "3"]) == 0 and "1 row read" in capsys.readouterr().out
    assert run([*call, "t_req"]) == 2 and "--bodies has no columns" in capsys.readouterr().err
