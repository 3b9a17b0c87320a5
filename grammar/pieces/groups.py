"""Groups of a run input that hold a basis: `$DATA` with its title and symmetry, and `$ECP`."""

from lark import Token

from overlapse.grammar.building import Build
from overlapse.grammar.drafts import Node, index_of, leading
from overlapse.grammar.model import Remark
from overlapse.grammar.pieces.atoms import is_atom


def keep_groups(build: Build) -> None:
    """Leave only the lines of our two groups, without titles and symmetry."""
    bodies = build.bodies
    inside = False
    for index, body in enumerate(bodies):
        if body[:1] == "$":
            name = body.split()[0].lower()
            closes = inside and name == "$end"
            inside = name in ("$data", "$ecp")
            if name == "$data":
                _preamble(build, index)
            if not inside and not closes:
                bodies[index] = ""
        elif not inside:
            bodies[index] = ""


def _preamble(build: Build, index: int) -> None:
    """Title, symmetry, and below any symmetry but C1 a line of axes or a blank one."""
    bodies = build.bodies
    following = [*bodies[index + 1 : index + 4], "", "", ""][:3]
    present = next((at for at in (0, 1) if is_atom(following[at]) or "$" in following[at]), 2)
    if present < 2 or not following[1]:
        build.fault_line(
            "form.syntax",
            index,
            "a line with a title and a line with the symmetry must follow `$DATA`",
            expected="C1",
            remedy="write both lines; the title may be blank, the symmetry may be C1",
        )
    elif following[1].split()[0].upper() != "C1":
        if is_atom(following[2]):
            build.fault_line(
                "form.syntax",
                index + 3,
                f"below the symmetry {following[1].split()[0]} a line of axes, or a blank "
                "line, is missing",
                remedy="put a blank line above this one",
            )
        else:
            present = 3
    if present and following[0]:
        build.remarks.append(Remark(following[0], index + 2))
    bodies[index + 1 : index + 1 + present] = [""] * len(bodies[index + 1 : index + 1 + present])


def say_built_in(build: Build, line: Token, symbol: str, what: str) -> None:
    """A note on numbers that the program knows and the text does not hold."""
    build.fault_line(
        "form.syntax",
        index_of(line),
        f"{what} that is built into the program: its numbers stand nowhere in the text, and "
        "it is not judged",
        severity="note",
        element=symbol,
        remedy="write the numbers out to have them judged",
    )


def say_missing(build: Build, node: Node, wanted: str) -> None:
    """Lines before the first heading; what follows them up to it belongs to the same."""
    line = leading(node)
    build.fault_line(
        "form.syntax",
        index_of(line),
        f"a line such as `{wanted}` is missing above this one",
        expected=wanted,
        remedy="write the heading that this belongs to",
    )
