"""What holds for every layout alike, found by presence as the package finds them."""

import ast
from pathlib import Path

import pytest
from generated import content, documents
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from overlapse.grammar.layouts import layouts
from overlapse.grammar.reading import read_text

LAYOUTS = sorted(layouts())
HERE = Path(__file__).parent


@pytest.mark.parametrize("name", LAYOUTS)
@settings(max_examples=25, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(data=st.data())
def test_write_then_read_gives_the_same_functions(name: str, data: st.DataObject) -> None:
    highest = min(6, layouts()[name].highest)
    document = data.draw(documents(highest, with_potentials=False))
    written = layouts()[name].write(document)
    again = read_text(written.text, layout=name)
    serious = [fault.message for fault in again.faults if fault.severity != "note"]
    assert not serious, written.text
    assert content(again) == content(document), written.text


@pytest.mark.parametrize("name", LAYOUTS)
@settings(max_examples=15, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(data=st.data())
def test_a_potential_is_kept_or_its_loss_is_said(name: str, data: st.DataObject) -> None:
    document = data.draw(documents(min(6, layouts()[name].highest)))
    written = layouts()[name].write(document)
    again = read_text(written.text, layout=name)
    if content(again) != content(document):
        assert any("potential" in loss for loss in written.losses), written.text


@pytest.mark.parametrize("name", LAYOUTS)
def test_a_written_text_is_recognised(name: str) -> None:
    text = (
        "spherical\n****\nC     0\nS   2   1.00\n  4.5   0.6\n  0.5   0.5\nP   1   1.00\n"
        "  0.7   1.0\n****\nN     0\nS   2   1.00\n  6.5   0.6\n  0.75   0.5\n****\n"
    )
    written = layouts()[name].write(read_text(text, layout="stars"))
    again = read_text(written.text)
    assert again.layout == name
    assert again.reason
    assert [block.symbol for block in again.blocks] == ["C", "N"]


@pytest.mark.parametrize("name", LAYOUTS)
def test_a_layout_is_one_grammar_one_module_and_one_test(name: str) -> None:
    stem = name.replace("-", "_")
    folder = HERE.parents[1] / "grammar" / "layouts"
    module = folder / f"{stem}.py"
    assert module.exists()
    assert (folder / f"{stem}.lark").exists()
    assert (HERE / "layouts" / f"test_{stem}.py").exists()
    assert ast.get_docstring(ast.parse(module.read_text()))
    layout = layouts()[name]
    assert layout.picture.count("\n") <= 4
    assert layout.summary
