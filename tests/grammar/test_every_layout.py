"""What holds for every layout alike, found by presence as the package finds them."""

import ast
from pathlib import Path

import pytest
from generated import content, documents
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from overlapse.grammar.layouts import layouts, spotted
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


PAIRS = [(first, second) for first in LAYOUTS for second in LAYOUTS if first != second]
INVENTED = read_text(
    "spherical\n****\nC     0\nS   3   1.00\n  40.5   0.15\n  7.25   0.5\n  2.0D0   -.25\n"
    "S   1   1.00\n  0.3   1.0\nP   2   1.00\n  3.5   0.6\n  0.7   0.45\nD   1   1.00\n"
    "  0.8   1.0\nF   1   1.00\n  1.125   1.0\n****\nN     0\nS   2   1.00\n  50.1   0.2\n"
    "  9.5   0.9\nP   1   1.00\n  0.9   1.0\n****\n",
    layout="stars",
)


@pytest.mark.parametrize(("first", "second"), PAIRS)
def test_numbers_survive_the_way_through_two_layouts(first: str, second: str) -> None:
    there = read_text(layouts()[first].write(INVENTED).text, layout=first)
    back = read_text(layouts()[second].write(there).text, layout=second)
    assert content(back) == content(INVENTED)


@pytest.mark.parametrize("name", LAYOUTS)
def test_digits_stay_as_they_were_spelled(name: str) -> None:
    written = layouts()[name].write(INVENTED).text
    for spelling in ("40.5", "7.25", "1.125", "9.5"):
        assert spelling in written


@pytest.mark.parametrize("name", LAYOUTS)
def test_a_layout_is_spotted_wherever_it_is_recognised(name: str) -> None:
    text = layouts()[name].write(INVENTED).text
    assert name in {layout.name for layout in spotted(text, LAYOUTS)}


def test_a_text_that_could_be_two_layouts_names_both() -> None:
    one, other = (layouts()[name].write(INVENTED).text for name in ("stars", "deck"))
    document = read_text(one + other)
    doubt = document.faults[0]
    assert doubt.severity == "note"
    assert "stars" in doubt.message and "deck" in doubt.message and "`" in doubt.message


@pytest.mark.parametrize("name", ["keyworded", "dollar", "commas", "stars", "at-blocks"])
def test_a_basis_inside_a_larger_input_is_judged_where_it_stands(name: str) -> None:
    before = (
        "title of somebody's run\n memory 4 gb\n\n geometry\n  O 0.0 0.0 0.1\n end geometry\n\n"
    )
    text = layouts()[name].write(INVENTED).text
    document = read_text(before + text + "\n task energy\n")
    assert document.layout == name
    assert content(document) == content(INVENTED)
    assert document.blocks[0].line > before.count("\n")
