"""Blocks against labels: what differs, and which label would fit."""

from collections.abc import Iterator
from typing import Literal, NamedTuple

from overlapse.grammar.designation import Designation
from overlapse.grammar.elements import occupied
from overlapse.grammar.model import BasisSet, Block, letter_of
from overlapse.rules.case import Case, is_orbital
from overlapse.rules.families.candidates import candidates
from overlapse.rules.families.counted import WITH_POTENTIALS, Counts, Expected, expected, plus
from overlapse.rules.families.expected import Promise, promise
from overlapse.rules.labels.claims import Claim
from overlapse.rules.labels.composition import lengths_of, primitives, show
from overlapse.rules.labels.digits import by_digits
from overlapse.rules.labels.valence import fitting_core

# split, family: core or valence functions differ.  decoration: those differ that a decoration in
# the label stands for.  polarization, diffuse: functions of that kind are missing.
Kind = Literal["", "split", "family", "decoration", "polarization", "diffuse"]
_DIGITS = ("STO-nG", "N-MPG")


class Verdict(NamedTuple):
    """A block against what a label promises for its element.

    kind: what differs, "" for nothing.  l: the first angular momentum that differs.  found,
    promised: that part of both in words; whole: all that is promised.  detail: the difference in
    words.  why: a remark on an irregular element.  decorated: whether the label adds functions to
    this element.  bare: the label promises functions here that were published for other elements
    only.
    """

    block: Block
    kind: Kind
    l: int = 0
    found: str = ""
    promised: str = ""
    whole: str = ""
    detail: str = ""
    why: str = ""
    decorated: bool = False
    bare: bool = False

    @property
    def fits(self) -> bool:
        return not self.kind


def verdict(block: Block, label: Designation) -> Verdict | None:
    """Compare a block with what a label promises; None where the label is not defined."""
    if label.family in _DIGITS:
        promised = promise(label, block.atomic_number)
        return None if promised is None else _by_lengths(block, promised)
    counted = expected(label, block.atomic_number)
    return None if counted is None else _by_counts(block, label, counted)


def fits(block: Block, label: Designation) -> bool:
    """Whether a block is what the label promises."""
    if label.family not in _DIGITS:
        # Most candidates are ruled out by their counts, without the words of a verdict.
        wanted = expected(label, block.atomic_number)
        if wanted is None or not _same_counts(block, wanted):
            return False
    found = verdict(block, label)
    return found is not None and found.fits


def _same_counts(block: Block, wanted: Expected) -> bool:
    return block.counts == wanted.contracted or any(
        block.counts == counts for counts, _ in wanted.others
    )


# ---- by contraction lengths


def _by_lengths(block: Block, promised: Promise) -> Verdict:
    found = lengths_of(block)
    split: list[int] = []
    added: list[int] = []
    for l in sorted({*promised.full, *found}):
        here, full = found.get(l, ()), promised.full.get(l, ())
        if here in (full, full + promised.optional.get(l, ())):
            continue
        plain = promised.plain.get(l, ())
        only_ones = here[: len(plain)] == plain and set(here[len(plain) :]) <= {1}
        (added if only_ones else split).append(l)
    decorated = promised.full != promised.plain or bool(added)
    differing = tuple(split or added)
    if not differing:
        return Verdict(block, "", why=promised.why, decorated=decorated, bare=promised.bare)
    surplus = {l: len(found.get(l, ())) - len(promised.full.get(l, ())) for l in added}
    return Verdict(
        block,
        "split" if split else "decoration",
        differing[0],
        show(found, differing),
        show(promised.full, differing),
        show(promised.full),
        "" if split else _missing(surplus),
        promised.why,
        decorated,
    )


def _missing(surplus: Counts) -> str:
    words = []
    for l, count in surplus.items():
        many = abs(count) != 1
        verb = ("are" if many else "is") + (" missing" if count < 0 else " too many")
        words.append(f"{abs(count)} {letter_of(l)} function{'s' * many} {verb}")
    return ", ".join(words)


# ---- by counts


def _by_counts(block: Block, label: Designation, wanted: Expected) -> Verdict:
    distinct, written = primitives(block)
    known = [(wanted.contracted, wanted.primitives), *wanted.others]
    decorated = bool(wanted.diffuse)
    same = [exponents for counts, exponents in known if counts == block.counts]
    if any(exponents in (None, distinct, written) for exponents in same):
        return Verdict(block, "", why=wanted.why, decorated=decorated)
    whole = _notation(wanted.contracted, wanted.primitives)
    found = _notation(block.counts, distinct if wanted.primitives else None)
    if same:
        surplus = _surplus(distinct, same[0] or {})
        kind: Kind = "family"
        detail = _missing(surplus).replace("function", "primitive")
    else:
        surplus = _surplus(block.counts, wanted.contracted)
        kind = _kind_of_counts(surplus, wanted, label, block)
        detail = _missing(surplus)
    return Verdict(block, kind, min(surplus), found, whole, whole, detail, wanted.why, decorated)


def _surplus(found: Counts, wanted: Counts) -> Counts:
    return plus(found, {l: -count for l, count in wanted.items()})


def _kind_of_counts(surplus: Counts, wanted: Expected, label: Designation, block: Block) -> Kind:
    if max(surplus.values()) > 0:
        return "family"
    if label.fitting:
        return "family"
    polarization = all(
        l not in block.counts and l not in occupied(block.atomic_number) for l in surplus
    )
    if polarization:
        return "polarization"
    lost = all(-count <= wanted.diffuse.get(l, 0) for l, count in surplus.items())
    return "diffuse" if lost else "family"


def _notation(contracted: Counts, exponents: Counts | None) -> str:
    def join(counts: Counts) -> str:
        return "".join(f"{count}{letter_of(l)}" for l, count in counts.items())

    own = f"[{join(contracted)}]"
    return own if exponents is None else f"({join(exponents)}) -> {own}"


# ---- which label fits


def fitting_labels(members: BasisSet, limit: int = 12) -> list[tuple[Designation, int, int]]:
    """Known labels that fit a set: label, elements that fit, elements looked at; best first."""
    blocks = [block for block in members.blocks if block.complete and block.shells]
    if len(blocks) > limit:
        blocks = [blocks[len(blocks) * at // limit] for at in range(limit)]
    found = []
    for label in candidates():
        count = _count_of_fits(blocks, label)
        if count * 2 > len(blocks):
            found.append((label, count, len(blocks)))
    return sorted(found, key=lambda item: -item[1])


def _count_of_fits(blocks: list[Block], label: Designation) -> int:
    count = 0
    for at, block in enumerate(blocks):
        count += fits(block, label)
        # What cannot reach half any more is not looked at to the end.
        if (count + len(blocks) - at - 1) * 2 <= len(blocks):
            return 0
    return count


def best_label(members: BasisSet) -> Designation | None:
    """The known label that fits a set best, or one that its lengths spell, if it fits most."""
    labels = fitting_labels(members)
    if labels:
        return labels[0][0]
    blocks = [block for block in members.blocks if block.complete and block.shells]
    counts = {label: sum(fits(b, label) for b in blocks) for label in by_digits(blocks)}
    best = max(counts, key=lambda label: counts[label], default=None)
    return best if best is not None and counts[best] * 2 > len(blocks) else None


# ---- all claims of a document


class Judged(NamedTuple):
    """A claimed label with the verdict on each element it is defined for.

    wrong: verdicts that differ.  label_is_wrong: so many of them that the label is in doubt and
    not the elements.  undefined: elements that the set was not published for.
    """

    members: BasisSet
    claim: Claim
    label: Designation
    verdicts: list[Verdict]
    wrong: list[Verdict]
    label_is_wrong: bool
    undefined: list[Block]
    best: Designation | None = None

    @property
    def is_comment(self) -> bool:
        return self.claim.where.startswith("the comment")

    @property
    def kind(self) -> Kind:
        """The weightiest kind of difference, for a label that is wrong as a whole."""
        kinds = [v.kind for v in self.wrong]
        if "split" in kinds or "family" in kinds:
            return "split" if "split" in kinds else "family"
        return "decoration" if self.label.family in _DIGITS or any(
            v.decorated for v in self.wrong
        ) else "family"  # fmt: skip


def judged(case: Case) -> list[Judged]:
    """Every claimed label of a document, held against the contents of its set."""
    return case.shared("labels", lambda: list(_judge(case)))


def _judge(case: Case) -> Iterator[Judged]:
    for index, members in enumerate(case.sets):
        found = [
            one
            for claim in case.claims[index]
            if claim.designation is not None and not claim.designation.readings
            if (one := _judge_claim(members, claim, claim.designation)) is not None
        ]
        # Comments also speak of the sets that one was made from.
        right = any(one.verdicts and not one.wrong for one in found)
        yield from (one for one in found if not (right and one.wrong and one.is_comment))


def _judge_claim(members: BasisSet, claim: Claim, label: Designation) -> Judged | None:
    blocks = [block for block in members.blocks if block.complete and block.shells]
    pairs = [(block, verdict(block, label)) for block in blocks]
    verdicts = [v for _, v in pairs if v is not None]
    wrong = [v for v in verdicts if v.kind]
    if not _means_orbitals(members, label, blocks, len(wrong) * 2 <= len(verdicts)):
        return None
    undefined = [block for block, v in pairs if v is None]
    whole = _is_wrong(verdicts, wrong)
    best = best_label(members) if whole or len(wrong) > 4 else None
    if not whole and best is not None and best != label:
        whole = all(fits(v.block, best) for v in wrong)
    return Judged(members, claim, label, verdicts, wrong, whole, undefined, best)


def _is_wrong(verdicts: list[Verdict], wrong: list[Verdict]) -> bool:
    if len(wrong) * 2 > len(verdicts):
        return True
    if any(v.kind in ("split", "family") for v in wrong):
        return False
    # Decorations say nothing about the elements that they add nothing to.
    concerned = sum(v.decorated or bool(v.kind) for v in verdicts)
    return bool(wrong) and any(v.decorated for v in wrong) and len(wrong) * 2 > concerned


def _means_orbitals(
    members: BasisSet, label: Designation, blocks: list[Block], fitting: bool
) -> bool:
    """Whether the set is meant to be what the label names, and no fragment to be added to it."""
    if label.fitting:
        return members.role != "orbital"
    if members.role == "fitting" or _are_fragments(blocks, label):
        return False
    if is_orbital(members) or fitting:
        return True
    if label.family not in WITH_POTENTIALS and label.potential not in ("PP", "ECP"):
        return False
    valence = sum(
        block.potential is not None or fitting_core(block) is not None for block in blocks
    )
    return valence * 2 > len(blocks)


def _are_fragments(blocks: list[Block], label: Designation) -> bool:
    """Whether most blocks hold single primitives only, and fewer than the label promises.

    Files that add functions to another set go by the name of the whole.
    """
    return sum(_is_fragment(block, label) for block in blocks) * 2 > len(blocks)


def _is_fragment(block: Block, label: Designation) -> bool:
    if any(len(function.exponents) > 1 for _, function in block.contracted):
        return False
    if label.family in _DIGITS:
        return True
    wanted = expected(label, block.atomic_number)
    if wanted is None or wanted.contracted == wanted.primitives:
        return False
    surplus = _surplus(block.counts, wanted.contracted)
    return bool(surplus) and max(surplus.values()) < 0
