"""Line ends, encodings and blanks: faults that no layout knows of."""

import pytest

from overlapse.grammar.reading import read_bytes

TEXT = "! by Ångström\nC 0\nS 2 1.00\n 4.0 0.6\n 0.5 0.5\n****\n"


def _found(data: bytes) -> list[tuple[str, str, tuple[int, int]]]:
    document = read_bytes(data, "x")
    return [(f.rule, f.severity, tuple(document.source.place(f.span[0]))) for f in document.faults]


def test_utf_8_comments_and_either_line_end_are_fine() -> None:
    assert not _found(TEXT.encode())
    assert not _found(TEXT.replace("\n", "\r\n").encode())


def test_latin_1_in_comments_is_a_note() -> None:
    assert _found(TEXT.encode("latin-1")) == [("form.encoding", "note", (1, 6))]


def test_latin_1_outside_comments_is_a_warning() -> None:
    data = TEXT.replace("0.5 0.5\n", "0.5 0.5 ! x\nÅ\n").encode("latin-1")
    assert ("form.encoding", "warning", (1, 6)) in _found(data)


def test_a_byte_order_mark() -> None:
    assert _found(b"\xef\xbb\xbf" + TEXT.encode()) == [("form.encoding", "warning", (1, 1))]


def test_mixed_line_ends() -> None:
    assert _found(TEXT.replace("4.0 0.6\n", "4.0 0.6\r\n").encode()) == [
        ("form.ending", "note", (4, 9))
    ]


def test_lone_carriage_returns_are_read_and_reported() -> None:
    assert _found(TEXT.replace("\n", "\r").encode()) == [("form.ending", "warning", (1, 14))]


@pytest.mark.parametrize("blank", "\u00a0\u2009\u3000")
def test_blanks_that_are_none(blank: str) -> None:
    data = TEXT.replace("4.0 0.6", f"4.0{blank}0.6").encode()
    assert _found(data) == [("form.number", "error", (4, 5))]


@pytest.mark.parametrize("sign", "\u200b\ufeff")
def test_invisible_characters_in_a_number(sign: str) -> None:
    document = read_bytes(TEXT.replace("0.6", f"0.{sign}6").encode(), "x")
    (fault,) = document.faults
    assert fault.rule == "form.number" and "invisible" in fault.message
    assert document.blocks[0].shells[0].coefficients[0, 0] == 0.6


def test_a_column_of_row_numbers_is_passed_over() -> None:
    document = read_bytes(TEXT.replace(" 4.0", " 1 4.0").replace(" 0.5 ", " 2 0.5 ").encode(), "x")
    (fault,) = document.faults
    assert (fault.rule, document.source.place(fault.span[0])) == ("form.index-column", (4, 2))
    (shell,) = document.blocks[0].shells
    assert shell.exponents.tolist() == [4.0, 0.5]
    assert shell.spelling(1, 0) == "0.5"
    assert shell.place(1) == (5, 4)


def test_a_column_of_row_numbers_where_columns_are_general() -> None:
    document = read_bytes(b"C S\n 1 4.0 0.6\n 2 0.5 0.5\nC P\n 4.0 0.6 0.1\n 0.5 0.5 0.2\n", "x")
    assert [fault.rule for fault in document.faults] == ["form.index-column"]
    assert document.blocks[0].shells[1].coefficients.shape == (2, 2)
