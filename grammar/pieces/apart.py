"""Shells and potential terms whose JSON is not as the schema wants it: what is wrong, what is left.

`overlapse.grammar.pieces.leaves` reads the sound ones.
"""

import re
from collections.abc import Collection, Sequence
from difflib import get_close_matches

import numpy as np
from lark import Token

from overlapse.grammar.drafts import BlockDraft, integer
from overlapse.grammar.model import letter_of, read_only
from overlapse.grammar.numbers import Reading, read_number
from overlapse.grammar.pieces.jsontext import JsonText, Members, string_of
from overlapse.grammar.pieces.jsontokens import LISTS, Value, kind_of, span_of
from overlapse.grammar.pieces.leaves import HIGHEST, POTENTIAL_KINDS, SHELL_KINDS, Table, Terms

_SHELL = ("angular_momentum", "exponents", "coefficients")
_TERMS = ("angular_momentum", "r_exponents", "gaussian_exponents", "coefficients")
_NAMES = frozenset(
    {
        *_SHELL, *_TERMS, "harmonic_type", "function_type", "ecp_type",
        "electron_shells", "ecp_electrons", "ecp_potentials", "center_data", "atom_map", "name",
    }
)  # fmt: skip
_JSON_NUMBER = re.compile(r"-?(?:0|[1-9]\d*)(?:\.\d+)?(?:[Ee][+-]?\d+)?", re.ASCII)
_PARTS = re.compile(r"([+-]?)0*(\d*)\.?(\d*)(?:[EeDd]([+-]?\d+))?")

# Element and shell that a fault is about.
Where = dict[str, str | None]


def as_json(word: str) -> str:
    """A number with the digits of ``word`` as JSON spells it: no D, no +, no lone point."""
    if _JSON_NUMBER.fullmatch(word):
        return word
    match = _PARTS.fullmatch(word)
    if match is None:
        raise ValueError(word)
    sign, whole, part, power = match.groups()
    return (
        ("-" if sign == "-" else "")
        + (whole or "0")
        + (f".{part}" if part else "")
        + (f"E{power}" if power else "")
    )


class Apart(JsonText):
    """Reads objects piece by piece; every fault that it meets is said."""

    before = 0  # number of faults before the present object

    def table(self, value: Value, block: BlockDraft) -> Table | None:
        """A shell, None where something is wrong that no guess can mend."""
        members = self.members(value)
        where: Where = {"element": block.symbol, "shell": None}
        if not members.whole or self.is_damaged(value):
            return None
        self.before = len(self.build.faults)
        kind_name = "function_type" if "function_type" in members.entries else "harmonic_type"
        self.check_names(members, (kind_name, *_SHELL), where)
        kind = self.word(members, kind_name, SHELL_KINDS, where)
        angular = self.angular(members, where)
        if angular:
            where["shell"] = block.next_name("".join(map(letter_of, angular)))
        exponents = self.numbers(members, "exponents", where)
        columns = self.columns(members, exponents, where)
        if not (kind and angular and exponents and columns):
            return None
        if len(angular) not in (1, len(columns)):
            self.count(
                members,
                "coefficients",
                f"{len(angular)} angular momenta share these exponents, but there are "
                f"{len(columns)} lists of coefficients",
                where,
                len(columns),
                len(angular),
            )
            return None
        values, table = np.array(exponents), np.array(columns).T
        if np.isnan(values).any() or np.isnan(table).any():
            return None
        shape = tuple(angular), kind, len(exponents), len(columns)
        return shape, read_only(values), read_only(table)

    def terms(self, value: Value, block: BlockDraft) -> Terms | None:
        """Terms of a core potential, None where something is wrong that no guess can mend."""
        members = self.members(value)
        where: Where = {"element": block.symbol, "shell": None}
        if not members.whole or self.is_damaged(value):
            return None
        self.before = len(self.build.faults)
        self.check_names(members, ("ecp_type", *_TERMS), where)
        kind = self.word(members, "ecp_type", POTENTIAL_KINDS, where)
        angular = self.angular(members, where)
        powers = self.numbers(members, "r_exponents", where)
        exponents = self.numbers(members, "gaussian_exponents", where)
        columns = self.columns(members, exponents, where)
        if powers and exponents and len(powers) != len(exponents):
            message = f"{len(powers)} powers of r for {len(exponents)} exponents"
            self.count(members, "r_exponents", message, where, len(powers), len(exponents))
            return None
        if not (kind and angular and powers and exponents and columns):
            return None
        values, table = np.array(exponents), np.array(columns).T
        if np.isnan(values).any() or np.isnan(table).any() or np.isnan(powers).any():
            return None
        return Terms(angular[0], kind, tuple(map(int, powers)), values, table)

    # ---- members

    def check_names(
        self,
        members: Members,
        names: Sequence[str],
        where: Where | None = None,
        optional: Sequence[str] = (),
    ) -> None:
        """Names that have to be there: a misspelt one by itself, all that are missing at once.

        ``optional`` ones may be missing, but not be misspelt.
        """
        missing = []
        where = where or {}
        for name in (*names, *optional):
            near = get_close_matches(name, sorted(members.entries.keys() - _NAMES), 1)
            if members.get(name) is not None:
                continue
            if not near:
                missing += [name] if name in names else []
                continue
            self.fault(
                members.entries[near[0]][0],
                f"{near[0]!r} is no name of the schema; {name!r} was probably meant",
                measured=near[0],
                expected=name,
                remedy=f"write {name!r}",
                **where,
            )
        if missing:
            self.fault(
                members.opener,
                f"missing in this object: {', '.join(f'`{name}`' for name in missing)}",
                expected=missing[0],
                remedy="restore it from the source",
                **where,
            )

    def word(self, members: Members, name: str, known: Collection[str], where: Where) -> str | None:
        """A member that is one of a few words."""
        value = members.get(name)
        word = string_of(value)
        if value is None or word in known:
            return word
        near = get_close_matches(str(word), known, 1)
        self.fault(
            value,
            f"`{name}` is one of {', '.join(known)}",
            measured=word,
            expected=near[0] if near else next(iter(known)),
            remedy="write one of these",
            **where,
        )
        return None

    def angular(self, members: Members, where: Where) -> list[int] | None:
        """Angular momenta of a shell or of a part of a potential."""
        value = members.get("angular_momentum")
        if value is None:
            return None
        items = self.listed(value, "angular_momentum", where)
        found = [integer(str(item)) if isinstance(item, Token) else None for item in items]
        angular = [l for l in found if l is not None and l <= HIGHEST]
        if found and angular == found and len(set(found)) == len(found):
            return angular
        self.build.fault(
            "form.letter",
            span_of(value),
            "angular momenta are whole numbers from 0 on, each once, in a list",
            expected="[0]",
            remedy="write [0] for s, [1] for p, [0, 1] for s and p with shared exponents",
            **where,
        )
        return None

    def listed(self, value: Value, name: str, where: Where) -> list[Value]:
        """The items of a list; a value by itself is taken for a list of one."""
        if kind_of(value) in LISTS:
            return self.items(value)[0]
        message = f"`{name}` is a list"
        self.fault(value, message, expected="[", remedy="put it in [ ]", **where)
        return [value]

    def count(
        self,
        members: Members,
        name: str,
        message: str,
        where: Where,
        measured: int,
        expected: int | None = None,
    ) -> None:
        """A miscount in a member."""
        value = members.get(name)
        self.build.fault(
            "form.count",
            members.opener if value is None else span_of(value),
            message,
            measured=measured,
            expected=expected,
            remedy="something was lost or added: compare with the source",
            **where,
        )

    # ---- numbers

    def numbers(self, members: Members, name: str, where: Where) -> list[float]:
        """The numbers of a list, NaN where one cannot be read; none if there is no list."""
        value = members.get(name)
        if value is None:
            return []
        found = [self.number(item, where) for item in self.listed(value, name, where)]
        if not found:
            self.count(members, name, f"`{name}` is empty", where, 0, 1)
        return found

    def number(self, value: Value, where: Where) -> float:
        """A number, spelled as one or as a string."""
        start, end = span_of(value)
        if not isinstance(value, Token) or value.type not in ("WORD", "STRING"):
            remedy = "restore it from the source"
            self.fault(value, "a number belongs here", expected="1.0", remedy=remedy, **where)
            return float("nan")
        quoted = value.type == "STRING"
        word = value[1:-1] if quoted else str(value)
        reading = read_number(word.strip(" ") if quoted else word)
        if not reading.slip and not quoted and not _JSON_NUMBER.fullmatch(word):
            reading = Reading(reading.value, "is no number in JSON", as_json(word))
        if reading.slip:
            span = (start + quoted, end - quoted)
            self.build.slip(reading, word, span, where["element"], where["shell"])
        return float("nan") if reading.value is None else reading.value

    def columns(self, members: Members, exponents: list[float], where: Where) -> list[list[float]]:
        """Lists of coefficients; none where they do not fit the exponents."""
        value = members.get("coefficients")
        if value is None:
            return []
        lists = self.listed(value, "coefficients", where)
        if bare := [item for item in lists if kind_of(item) not in LISTS]:
            self.fault(
                bare[0],
                "`coefficients` is a list of lists, one for each contraction",
                expected="[[",
                remedy="put the coefficients of each contraction in a list of their own",
                **where,
            )
            return []
        found = [[self.number(item, where) for item in self.items(part)[0]] for part in lists]
        if not found:
            self.count(members, "coefficients", "`coefficients` is empty", where, 0, 1)
        elif exponents and self.misfits(members, lists, found, len(exponents), where):
            return []
        return found

    def misfits(
        self,
        members: Members,
        lists: list[Value],
        found: list[list[float]],
        count: int,
        where: Where,
    ) -> bool:
        """Whether some contraction has not one coefficient for each exponent."""
        lengths = list(map(len, found))
        if lengths == [count] * len(lengths):
            return False
        if any(fault.rule == "form.syntax" for fault in self.build.faults[self.before :]):
            return True  # a lost comma or the like has been said, and miscounts follow from it
        if len(lengths) == count > 1 and len(set(lengths)) == 1:
            message = (
                "the coefficients stand row by row; wanted is a list for each contraction, with "
                f"one coefficient for each of the {count} exponents"
            )
            self.count(members, "coefficients", message, where, lengths[0], count)
            return True
        for part, length in zip(lists, lengths, strict=True):
            if length != count:
                self.build.fault(
                    "form.count",
                    span_of(part),
                    f"{length} coefficients in this contraction of {count} exponents",
                    measured=length,
                    expected=count,
                    remedy="a number was lost or added, or an exponent was",
                    **where,
                )
        return True
