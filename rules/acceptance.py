"""Findings that somebody has looked at and accepted, in the file itself and with a reason.

An acceptance is a comment of the form ``overlapse: accept RULE for PLACE because REASON``.  RULE
may be several names with commas between; PLACE is ``C s-2``, ``C``, ``C, N``, ``Sc-Zn`` or ``this
file``.
"""

import re
from collections.abc import Iterator
from typing import NamedTuple

from overlapse.grammar.elements import number_of
from overlapse.grammar.model import Document
from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.registry import rule, rules

_SIGN = re.compile(r"(?:^|\n)[!#*/;\s]*overlapse\s*:\s*([^\n]*)", re.IGNORECASE)
_ACCEPT = re.compile(
    r"accept\s+(?P<rules>.*?)(?:\s+for\s+(?P<place>.*?))?(?:\s+because\b\s*(?P<reason>.*))?",
    re.IGNORECASE,
)
_SYMBOLS = r"[A-Za-z]{1,3}(?:\s*-\s*[A-Za-z]{1,3})?"
_PLACE = re.compile(
    rf"(?P<elements>{_SYMBOLS}(?:\s*,\s*{_SYMBOLS})*)(?:\s+(?P<shell>[a-z]+(?:-\d+(?:/\d+)?)?))?"
)
_WHOLE = ("this file", "the file")


class Acceptance(NamedTuple):
    """Findings of some rules at some place that are accepted.

    elements: atomic numbers, empty for the whole file.  shell: its name, None for all shells.
    where: in words, for reports.  line: of the file, counted from 1, or 0 if it is not in there.
    """

    rules: tuple[str, ...]
    elements: frozenset[int]
    shell: str | None
    reason: str
    where: str
    line: int = 0

    def covers(self, finding: Finding) -> bool:
        """Whether a finding is accepted by this."""
        if finding.rule not in self.rules:
            return False
        if self.elements and number_of(finding.element or "") not in self.elements:
            return False
        # A column of a general contraction is a part of its shell.
        return self.shell is None or self.shell in (
            finding.shell,
            (finding.shell or "").partition("/")[0],
        )


class Mistake(NamedTuple):
    """A comment that is meant as an acceptance and is none."""

    line: int
    problem: str


def acceptances_in(document: Document) -> tuple[list[Acceptance], list[Mistake]]:
    """What a file's comments accept, and the comments that are wrong."""
    found: list[Acceptance] = []
    wrong: list[Mistake] = []
    for remark in document.remarks:
        for words in _SIGN.findall(remark.text):
            try:
                found.append(parsed(words.strip().strip("*/;#! "), remark.line))
            except ValueError as problem:
                wrong.append(Mistake(remark.line, str(problem)))
    return found, wrong


def acceptances_of(case: Case) -> tuple[list[Acceptance], list[Mistake]]:
    """As `acceptances_in`, worked out once for a case."""
    return case.shared("acceptances", lambda: acceptances_in(case.document))


def parsed(words: str, line: int) -> Acceptance:
    """The acceptance that a comment states after "overlapse:"; raises ValueError saying why not."""
    match = _ACCEPT.fullmatch(words)
    if match is None:
        verb = words.split()[0] if words else ""
        raise ValueError(f"{verb!r} is not understood here; only 'accept RULE for ...' is")
    names = tuple(filter(None, re.split(r"[,\s]+", match["rules"])))
    for name in names:
        check_rule(name)
    elements, shell = place_of((match["place"] or "").strip())
    if not (match["reason"] or "").strip():
        raise ValueError("it gives no reason; write ... because REASON")
    reason = " ".join(match["reason"].split())
    return Acceptance(names, elements, shell, reason, f"line {line}", line)


def check_rule(name: str) -> None:
    """Raise ValueError, with the nearest name, for a name that is no rule's."""
    if name not in rules():
        from difflib import get_close_matches

        near = get_close_matches(name, rules(), 1)
        hint = f"; did you mean {near[0]}?" if near else "; `overlapse rules` lists them"
        raise ValueError(f"no rule is called {name!r}{hint}")


def place_of(words: str) -> tuple[frozenset[int], str | None]:
    """Elements and shell of a place; raises ValueError for one that is not understood."""
    if words.lower() in _WHOLE:
        return frozenset(), None
    match = _PLACE.fullmatch(words)
    if match is None:
        told = f"the place {words!r} is not understood" if words else "it names no place"
        raise ValueError(f"{told}; write for C s-2, for C, or for this file")
    return elements_of(match["elements"]), match["shell"]


def elements_of(words: str) -> frozenset[int]:
    """Atomic numbers of a list such as "C, N, Sc-Zn".

    Raises ValueError for a word that is no element's symbol.
    """
    found: set[int] = set()
    for word in words.split(","):
        first, dash, last = (part.strip() for part in word.partition("-"))
        low, high = number_of(first), number_of(last if dash else first)
        if low is None or high is None:
            raise ValueError(f"{word.strip()!r} names no element; write C, or Sc-Zn")
        if low > high:
            raise ValueError(f"{word.strip()!r} runs backwards; write the lighter element first")
        found.update(range(low, high + 1))
    return frozenset(found)


@rule("form.acceptance", last=True)
def acceptance(case: Case) -> Iterator[Finding]:
    """A comment that accepts findings is wrong, or accepts nothing any more.

    A comment "overlapse: accept RULE for PLACE because REASON" takes findings of the named rule at
    that place out of the count; reports still list them, with the reason. One that is misspelt does
    nothing, while its author believes it does. One that fits no finding hides the next slip at that
    place, which would then be taken for the accepted one. The same is said of an acceptance in the
    settings, in audits of all files that it is for.

    Source: none is needed.

    Remedy: write the comment as shown; take it out when the finding it was for is gone.

    Bad::

        ! overlapse: accept form.cuont for C because it is printed so
        C 0
        S 1 1.00
          4.0 1.0
        ****

    Good::

        ! overlapse: accept form.number for C s-1 because our readers take it
        C 0
        S 1 1.00
          4.0 1.0
        ****
    """
    accepted_here, mistakes = acceptances_of(case)
    for mistake in mistakes:
        yield case.at_line(
            mistake.line,
            "warning",
            f"this comment accepts nothing: {mistake.problem}",
            remedy="write overlapse: accept RULE for ELEMENT SHELL because REASON",
        )
    for accepted in accepted_here:
        # Without the findings of all its rules nothing can be said about an acceptance's use.
        names = accepted.rules
        judged = all(name in case.found and can_find(case, name) for name in names)
        if judged and not any(accepted.covers(f) for name in names for f in case.found[name]):
            yield case.at_line(
                accepted.line,
                "note",
                f"{', '.join(accepted.rules)} found nothing here that this comment could accept",
                remedy="take the comment out",
            )


def can_find(case: Case, name: str) -> bool:
    """Whether a rule has what it needs to find anything."""
    needs = rules()[name].needs
    if needs == "geometry":
        return bool(case.probes)
    if needs == "company":
        return bool(case.seals or case.reference or case.kin)
    return case.energies or needs != "energies"
