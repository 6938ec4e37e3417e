"""The README: its example and its commands run as they stand there, and its tables stand where they should.

The two commands that install are run by `.ci/run`, from the same blocks.
"""

import itertools
import re
import shlex
import subprocess
import sys
from pathlib import Path

import hourarc as ha
import numpy as np
import pytest
import readme


def hourarc(command, folder):
    """Runs a `hourarc` command of the README with the Python of the tests."""
    words = shlex.split(command)
    assert words[0] == ".venv/bin/hourarc", command
    return subprocess.run(
        [sys.executable, "-m", "hourarc", *words[1:]], cwd=folder, capture_output=True, text=True, timeout=120
    )


def commands():
    """The `hourarc` commands of the README, in order; those that install are left to CI."""
    lines = [line for block in readme.blocks("sh") for line in re.split(r"&&|\n", block)]
    return [line.strip() for line in lines if line.strip().startswith(".venv/bin/hourarc")]


def test_the_example_prints_what_the_readme_says():
    (example, _), (printed, _) = readme.blocks("python"), readme.blocks("text")
    done = subprocess.run([sys.executable, "-c", example], capture_output=True, text=True, timeout=120)
    assert (done.returncode, done.stderr) == (0, "")
    assert done.stdout == printed


def test_the_queue_runs_through_a_night(tmp_path, monkeypatch, capsys):
    (_, queue), (_, printed) = readme.blocks("python"), readme.blocks("text")
    assert queue.count("\n") < 40
    assert hourarc(".venv/bin/hourarc demo", tmp_path).returncode == 0
    monkeypatch.chdir(tmp_path)
    told = {}
    exec(compile(queue, "README.md", "exec"), told)
    assert capsys.readouterr().out == printed
    # Nobody twice, one at a time, and each within a window as `windows` has it.
    visits, watch = told["visits"], told["watch"]
    length = np.timedelta64(int(told["visit_s"]), "s")
    found = ha.windows(watch.site, watch.targets, watch.start, watch.stop, watch.limits)
    picks = [pick for _, pick, _, _ in visits]
    assert len(set(picks)) == len(picks) > 100
    assert all(earlier[0] + length <= later[0] for earlier, later in itertools.pairwise(visits))
    for when, pick, left, reason in visits:
        (window,) = [w for w in found.of(int(pick)) if w.start <= when < w.stop]
        assert when + length <= window.stop
        assert (left, reason) == ((window.stop - when) / np.timedelta64(1, "s"), window.stop_reason)


def test_the_commands_run_one_after_another(tmp_path):
    assert len(commands()) >= 3
    for command in commands():
        done = hourarc(command, tmp_path)
        assert done.returncode == 0, f"{command}\n{done.stderr}"
        assert done.stdout, command
    for name in ("hourarc-demo/windows.parquet", "windows.csv", "windows.blocked.csv"):
        assert (tmp_path / name).stat().st_size > 1000, name


def test_the_first_two_commands_are_those_that_install():
    install, tests, *_ = readme.blocks("sh")
    assert install.count("\n") == tests.count("\n") == 1
    assert install.startswith("python3 -m venv .venv && .venv/bin/pip install '.[")
    assert tests == ".venv/bin/pip install '.[test]' && .venv/bin/pytest\n"


def test_every_command_is_in_the_table(tmp_path):
    told = set(re.findall(r"^\| `hourarc (\w+)", readme.README.read_text(), re.MULTILINE))
    listed = hourarc(".venv/bin/hourarc --help", tmp_path).stdout.split("Commands:")[1].split("\n\n")[0]
    assert told == set(re.findall(r"^  (\w+) ", listed, re.MULTILINE))


@pytest.mark.parametrize("name", ["accuracy", "speed"])
def test_the_places_of_the_tables(name):
    text = readme.README.read_text()
    begin, end = f"<!-- {name}:begin -->", f"<!-- {name}:end -->"
    assert text.count(begin) == text.count(end) == 1
    assert text.index(begin) < text.index(end)


def test_links_lead_somewhere():
    root = Path(readme.README).parent
    named = re.findall(r"\]\((?!http)([^)#]+)", readme.README.read_text())
    assert named
    for name in named:
        assert (root / name).exists(), name
