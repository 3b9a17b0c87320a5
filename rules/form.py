"""Form: is the text what its layout says it is?  The readers find these faults while they read."""

from collections.abc import Iterator

from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.registry import rule


@rule("form.syntax")
def syntax(case: Case) -> Iterator[Finding]:
    """A line does not fit the layout.

    A program that reads the file may stop, or may pass over the line and everything that depends
    on it: a lost heading gives its rows to the shell before, a lost closing line gives the next
    element's shells to this one.  Reading goes on at the next shell or element, so that one fault
    does not hide the others.

    Source: the layout's own rules; what readers of such files do with the line differs (common
    practice, no source).

    Remedy: mend the line as the message says, or make it a comment.

    Bad::

        C 0
        S
          4.0 0.6
          0.5 0.5
        ****

    Good::

        C 0
        S 2 1.00
          4.0 0.6
          0.5 0.5
        ****
    """
    yield from case.faults("form.syntax")


@rule("form.count")
def count(case: Case) -> Iterator[Finding]:
    """An announced number of rows, columns or shells is not what follows.

    Either a row was lost or added, or the count is wrong.  Programs trust the count: one row too
    few and the next heading is read as numbers, one too many and the last row is never used.

    Source: the layout's own rules.

    Remedy: compare with the original publication, then mend the rows or the count.

    Bad::

        C 0
        S 3 1.00
          4.0 0.6
          0.5 0.5
        ****

    Good::

        C 0
        S 2 1.00
          4.0 0.6
          0.5 0.5
        ****
    """
    yield from case.faults("form.count")


@rule("form.number")
def number(case: Case) -> Iterator[Finding]:
    """A word that should be a number is not one.

    Letters that look like digits, a decimal comma, a typographic minus sign, an exponent letter
    that was lost (1.5-03), a field of asterisks: some readers stop, others take the part they
    understand and go on with a wrong number.  Where one reading is likely the shell is judged with
    it, so that the slip does not look like a missing shell as well.

    Source: number spelling of Fortran and C (ISO/IEC 1539-1, ISO/IEC 9899).

    Remedy: write the number that was meant; compare with the original publication.

    Bad::

        C 0
        S 2 1.00
          4.0 0.6
          O.5 0.5
        ****

    Good::

        C 0
        S 2 1.00
          4.0 0.6
          0.5 0.5
        ****
    """
    yield from case.faults("form.number")


@rule("form.element")
def element(case: Case) -> Iterator[Finding]:
    """A heading names no element.

    The block cannot be judged, and no program will find the element when it asks for it.

    Source: symbols of the elements, IUPAC; the systematic three-letter names of 1979 are accepted.

    Remedy: write the element's symbol.

    Bad::

        Cx 0
        S 1 1.00
          4.0 1.0
        ****

    Good::

        Cu 0
        S 1 1.00
          4.0 1.0
        ****
    """
    yield from case.faults("form.element")


@rule("form.letter")
def letter(case: Case) -> Iterator[Finding]:
    """A shell's letter is unknown, or is read in two ways.

    Spectroscopy leaves out j, so k follows i; some files count j in.  From l = 7 on one letter
    therefore stands for two angular momenta, and two programs read one file differently.

    Source: letters of angular momentum in atomic spectroscopy; both habits occur (common practice,
    no source).

    Remedy: write the number (L=7) where the layout allows it.

    Bad::

        C 0
        X 1 1.00
          4.0 1.0
        ****

    Good::

        C 0
        D 1 1.00
          4.0 1.0
        ****
    """
    yield from case.faults("form.letter")


@rule("form.repeat")
def repeat(case: Case) -> Iterator[Finding]:
    """An element, or one of its shells, is given twice in one set.

    Depending on the program the two are added up, which makes the set linearly dependent, or one
    of them is silently taken.  A list of elements that starts again from its beginning is judged
    as a second set instead.

    Source: common practice, no source.

    Remedy: keep one of the two.

    Bad::

        C 0
        S 1 1.00
          4.0 1.0
        ****
        C 0
        S 1 1.00
          4.0 1.0
        ****

    Good::

        C 0
        S 1 1.00
          4.0 1.0
        ****
        N 0
        S 1 1.00
          5.0 1.0
        ****
    """
    yield from case.faults("form.repeat")


@rule("form.index-column")
def index_column(case: Case) -> Iterator[Finding]:
    """The numbers of the rows stand where the exponents belong.

    Layouts that number their rows have 1, 2, 3 ... in front of each; pasted into a layout without
    that column they are read as exponents, the exponents as coefficients, and nothing complains.
    The shell is judged without the column.

    Source: common practice, no source.

    Remedy: take the first column out.

    Bad::

        C 0
        S 2 1.00
          1 4.0 0.6
          2 0.5 0.55505
        ****

    Good::

        C 0
        S 2 1.00
          4.0 0.6
          0.5 0.55505
        ****
    """
    yield from case.faults("form.index-column")


@rule("form.ending")
def ending(case: Case) -> Iterator[Finding]:
    """Line ends are of two kinds, or of a kind that most readers do not know.

    A file with lone carriage returns is one long line to most readers. Mixed line ends are
    harmless to read, but they make every later comparison of texts noisy.

    Source: line ends of POSIX (LF) and of ECMA-48 and DOS (CR LF); common practice, no source.

    Remedy: convert the line ends to LF.

    Bad::

        $basis\r
        *
        h x
        *
        1 s
        0.5 1.0
        *
        $end

    Good::

        $basis
        *
        h x
        *
        1 s
        0.5 1.0
        *
        $end
    """
    yield from case.faults("form.ending")


@rule("form.encoding")
def encoding(case: Case) -> Iterator[Finding]:
    """The bytes are no plain UTF-8: another encoding, or a byte-order mark.

    Names of authors in comments are the usual cause and do no harm to most readers. Outside
    comments such a byte, or a mark in front of the first word, makes a reader stop or take a
    heading for something else.

    Source: The Unicode Standard, section 3.10 (UTF-8) and section 2.13 (byte-order mark).

    Remedy: save the file as UTF-8 without a byte-order mark.

    Bad::

        \ufeffC 0
        S 1 1.00
          4.0 1.0
        ****

    Good::

        C 0
        S 1 1.00
          4.0 1.0
        ****
    """
    yield from case.faults("form.encoding")
