"""Broken samples: the text carries a mark at each place where a fault must be found."""

from overlapse.grammar.reading import read_text

MARK = "⟦"


def check(layout: str, marked: str, rules: list[str]) -> None:
    """Read ``marked`` without its marks; faults must stand at the marks, in order, and no others.

    ``rules`` names the rule of each mark.  Notes are not counted: they do not say that something
    is wrong.
    """
    expected = []
    text = ""
    for piece in marked.split(MARK)[:-1]:
        text += piece
        line = text.count("\n") + 1
        expected.append((line, len(text) - text.rfind("\n")))
    text += marked.split(MARK)[-1]
    document = read_text(text, layout=layout)
    found = [
        (*document.source.place(fault.span[0]), fault.rule)
        for fault in document.faults
        if fault.severity != "note"
    ]
    assert found == [(*place, rule) for place, rule in zip(expected, rules, strict=True)]
    for fault in document.faults:
        assert fault.message and fault.message[-1] not in ".!"
        assert fault.remedy or fault.expected is not None
