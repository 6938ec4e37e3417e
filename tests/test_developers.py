"""What DEVELOPERS.md names is there: files, folders, tests and the things of the core."""

import re
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]
TEXT = (ROOT / "DEVELOPERS.md").read_text()
NAMED = sorted(set(re.findall(r"`([^`\n]+)`", TEXT)))
CORE = ROOT / "rust/core/src"


def below(folder, pattern):
    return "\n".join(path.read_text() for path in sorted((ROOT / folder).rglob(pattern)))


@pytest.mark.parametrize("name", [name for name in NAMED if re.fullmatch(r"[\w./-]*/[\w./-]+", name)])
def test_every_path_is_there(name):
    # Paths of the core may be given from its source folder.
    assert (ROOT / name).exists() or (CORE / name).exists(), name


def test_every_word_of_the_code_is_there():
    code = below("rust", "*.rs") + below("python", "*.py") + below("tests", "*.py")
    words = [
        name for name in NAMED if re.fullmatch(r"\w+(_\w+)+|[A-Z]\w+|[a-z]\w*(::\w+)+|[A-Z]\w+::\w+", name)
    ]
    assert len(words) > 15
    for name in words:
        for part in name.split("::"):
            assert re.search(rf"\b{part}\b", code), name


def test_the_order_of_modules_is_the_one_that_is_enforced():
    told = re.search(r"### Module order\n\n(.*?)\n\n", TEXT, re.DOTALL)[1]
    rules = (ROOT / "rust/core/tests/structure/rules.rs").read_text()
    order = re.search(r"ORDER: \[&str; \d+\] = \[(.*?)\];", rules, re.DOTALL)[1]
    assert re.findall(r"\w+", told) == re.findall(r"\w+", order)
