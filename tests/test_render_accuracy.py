"""The accuracy table in the README says what was measured, and says so when it does not."""

import json

import pytest
import render_accuracy
from oracle.figures import GATES, Figures


@pytest.fixture
def paper(tmp_path, monkeypatch):
    """A README with the two markers and a full set of figures, apart from the real ones."""
    readme, measured = tmp_path / "README.md", tmp_path / "accuracy.json"
    readme.write_text(f"before\n{render_accuracy.BEGIN}\n{render_accuracy.END}\nafter\n")
    figures = {key: {"worst": 0.31 * gate.limit, "cases": gate.cases_min} for key, gate in GATES.items()}
    measured.write_text(json.dumps(figures))
    monkeypatch.setattr(render_accuracy, "README", readme)
    monkeypatch.setattr(render_accuracy, "MEASURED", measured)
    return readme, measured, figures


def test_written_then_in_agreement(paper):
    readme, _, _ = paper
    assert render_accuracy.main(["--check"]) == 1
    assert render_accuracy.main([]) == 0
    assert render_accuracy.main(["--check"]) == 0
    text = readme.read_text()
    assert text.startswith("before\n") and text.endswith("\nafter\n")
    assert text.count("\n| ") == len(GATES) + 1


def test_a_figure_that_moved_is_noticed(paper, capsys):
    _, measured, figures = paper
    render_accuracy.main([])
    figures["place_series"]["worst"] *= 1.2
    measured.write_text(json.dumps(figures))
    assert render_accuracy.main(["--check"]) == 0  # a fifth: another processor
    figures["place_series"]["worst"] *= 2.0
    measured.write_text(json.dumps(figures))
    assert render_accuracy.main(["--check"]) == 1
    assert GATES["place_series"].quantity in capsys.readouterr().err


def test_a_missing_figure_is_no_figure(paper, capsys):
    _, measured, figures = paper
    del figures["refraction"]
    measured.write_text(json.dumps(figures))
    assert render_accuracy.main([]) == 1
    assert "refraction" in capsys.readouterr().err


@pytest.mark.parametrize(
    ("value", "text"),
    [(0.0, "0"), (0.0301, "0.031"), (0.31, "0.31"), (5.01, "5.1"), (123.4, "130"), (2e-15, "2e-15")],
)
def test_figures_are_rounded_up(value, text):
    assert render_accuracy.two_digits(value) == text


def test_a_gate_holds():
    figures = Figures()
    figures.hold("refraction_horizon", 0.09, 1)
    with pytest.raises(AssertionError, match=r"gate 0\.1"):
        figures.hold("refraction_horizon", 0.11, 1)
    with pytest.raises(AssertionError, match="only 0 cases"):
        figures.hold("refraction_horizon", 0.0, 0)
