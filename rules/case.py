"""One document under judgement, with the results that several rules share."""

from collections.abc import Callable, Iterator, Sequence
from dataclasses import replace
from functools import cached_property
from typing import TYPE_CHECKING, Any, TypeVar

from overlapse.grammar.convention import over_normalised
from overlapse.grammar.elements import number_of, occupied, replaced_by, symbol_of
from overlapse.grammar.model import BasisSet, Block, Document, Function, Severity, Span
from overlapse.rules.finding import Edit, Finding
from overlapse.rules.labels.claims import Claim, claims_of
from overlapse.rules.measured.probe import Probe
from overlapse.rules.registry import Rule
from overlapse.rules.rowwise.norms import Norm, norms_of

if TYPE_CHECKING:
    from overlapse.rules.compare.beside import Kin, SealedSet

Shared = TypeVar("Shared")


class Case:
    """A document, the label it was given from outside (if any), and helpers to make findings.

    probes: what was measured of it in real geometries; none in a plain audit.  energies: whether
    rules may compute the atoms of the document.
    """

    def __init__(
        self,
        document: Document,
        label: str | None = None,
        *,
        probes: Sequence[Probe] = (),
        energies: bool = False,
    ) -> None:
        # Rules reason over normalised primitives; where the text does not, its numbers are turned.
        self.document = over_normalised(document)
        self.given_label = label
        self.energies = energies
        self.found: dict[str, list[Finding]] = {}  # by rule, for the rules that come last
        # Of these, suspicions that a last rule knows better; they are not told.
        self.cleared: list[Finding] = []
        # What lies beside the document, for rules that compare; put here by whoever has files.
        self.seals: tuple[SealedSet, ...] = ()
        self.reference: Document | None = None
        self.kin: tuple[Kin, ...] = ()
        self.probes = tuple(probes)
        self._rule = ""
        self._shared: dict[str, Any] = {}

    # ---- running a rule

    def judge(self, rule: Rule, limits: dict[str, float] | None = None) -> list[Finding]:
        """Findings of one rule, each carrying its name; ``limits`` override the rule's own."""
        self._rule = rule.name
        return [
            replace(finding, rule=rule.name) for finding in rule.function(self, **(limits or {}))
        ]

    # ---- shared results

    def shared(self, name: str, make: Callable[[], Shared]) -> Shared:
        """A result that several rules use, worked out by whichever asks first."""
        if name not in self._shared:
            self._shared[name] = make()
        return self._shared[name]  # type: ignore[no-any-return]

    @cached_property
    def claims(self) -> dict[int, list[Claim]]:
        """What the label of each set (by its index) is claimed to be, and where."""
        return claims_of(self.document, self.given_label)

    @cached_property
    def norms(self) -> list[list[Norm]]:
        """For each set, the self-overlaps of its contractions of several primitives."""
        return [norms_of(members) for members in self.sets]

    @property
    def sets(self) -> tuple[BasisSet, ...]:
        return self.document.sets

    @cached_property
    def _faulty(self) -> set[tuple[int, str]]:
        """Atomic number and name of the shells that a fault of form names."""
        return {
            (number, fault.shell)
            for fault in self.document.faults
            if fault.severity != "note" and fault.element and fault.shell
            if (number := number_of(fault.element)) is not None
        }

    def is_fitting(self, index: int) -> bool:
        """Whether a set (by its index) is said to be a fitting set, by its layout or a label."""
        claimed = any(c.designation and c.designation.fitting for c in self.claims[index])
        return claimed or self.sets[index].role == "fitting"

    def is_faulty(self, block: Block, shell: int) -> bool:
        """Whether the reader found fault with a shell, so that its numbers are in doubt."""
        return (block.atomic_number, block.names[shell]) in self._faulty

    # ---- making findings

    def faults(self, rule: str) -> Iterator[Finding]:
        """Findings for what the reader noted under a rule's name."""
        for fault in self.document.faults:
            if fault.rule == rule:
                yield self.at_span(
                    fault.span,
                    fault.severity,
                    fault.message,
                    element=_symbol(fault.element),
                    shell=fault.shell,
                    measured=fault.measured,
                    limit=fault.limit,
                    expected=fault.expected,
                    remedy=fault.remedy,
                    edits=tuple(Edit(span, words) for span, words in fault.edits),
                )

    def at_span(self, span: Span, severity: Severity, message: str, **details: Any) -> Finding:
        """A finding at a span of the text; ``details`` are the other fields of `Finding`."""
        place = self.document.source.place(span[0])
        return Finding(
            self._rule,
            severity,
            message,
            self.document.path,
            place.line,
            place.column,
            max(1, span[1] - span[0]),
            **details,
        )

    def at_line(self, line: int, severity: Severity, message: str, **details: Any) -> Finding:
        """A finding about a whole line, counted from 1."""
        span = self.document.source.span_of_line(line - 1)
        return self.at_span(span, severity, message, **details)

    def at_shell(
        self,
        block: Block,
        index: int,
        severity: Severity,
        message: str,
        *,
        function: Function | None = None,
        row: int | None = None,
        column: int | None = None,
        **details: Any,
    ) -> Finding:
        """A finding about a shell of a block, or about one of its numbers.

        ``row`` and ``column`` (0-based, of the shell) choose the number pointed at; ``function``
        names the column in the shell's name where the contraction is general.
        """
        shell = block.shells[index]
        name = block.names[index]
        if function is not None and shell.columns_per_l > 1:
            name += f"/{function.column % shell.columns_per_l + 1}"
        details = {"element": block.symbol, "shell": name, **details}
        if row is not None and shell.cells is not None:
            return self.at_span(shell.cells.span(row, column), severity, message, **details)
        return self.at_line(shell.line, severity, message, **details)


def gathered(findings: list[Finding], most: int = 4) -> list[Finding]:
    """The findings, or where there are more than ``most`` the first, which names the others.

    One cause that shows at many elements is one finding, not a flood.
    """
    if len(findings) <= most:
        return findings
    first, *others = findings
    elements = ", ".join(dict.fromkeys(f.element for f in others if f.element))
    return [replace(first, message=f"{first.message}; the same holds for {elements}")]


def _symbol(word: str | None) -> str | None:
    """A symbol in its usual letter case; a word that is none stays as it was typed."""
    number = number_of(word) if word else None
    return symbol_of(number) if number is not None else word


def is_orbital(members: BasisSet) -> bool:
    """Whether a set is meant to describe whole atoms (beside their potentials) by itself.

    A set whose layout calls it a fitting set is not; nor is one of which most elements lack
    occupied shells.  One or two elements alone prove nothing, unless they have no s function.
    """
    if members.role == "fitting":
        return False
    blocks = [block for block in members.blocks if block.shells]
    if not any(0 in block.counts for block in blocks):
        return False
    whole = sum(_is_whole(block) for block in blocks)
    return whole * 2 >= len(blocks) or len(blocks) < 3


def _is_whole(block: Block) -> bool:
    replaced = replaced_by(block.potential.electrons) if block.potential else {}
    if replaced is None:
        return True
    return all(
        block.counts.get(l, 0) >= count - replaced.get(l, 0)
        for l, count in occupied(block.atomic_number).items()
    )
