"""Which known label fits a set best, and what speaks for and against it.

A rule asks whether a claimed label is true; here nothing needs to be claimed.
"""

from collections.abc import Sequence
from typing import NamedTuple

from overlapse.grammar.designation import Designation
from overlapse.grammar.model import BasisSet, Block
from overlapse.rules.labels.claims import Claim
from overlapse.rules.labels.digits import by_digits
from overlapse.rules.labels.labelling import Verdict, fits, fitting_labels, verdict

# Elements, or labels, that are told one by one; of the others only the number is.
_TOLD = 3


class Naming(NamedTuple):
    """A label held against a set: how many of its elements fit, and why it is or is not the one.

    ``of`` counts the elements that could be looked at.
    """

    label: Designation
    fits: int
    of: int
    speaks_for: tuple[str, ...]
    speaks_against: tuple[str, ...]


class Ranking:
    """The labels for one set, best first: those that fit most elements, claimed ones before others.

    A claimed label is among them even where it fits no element, so that it can be told why.
    """

    def __init__(self, members: BasisSet, claims: Sequence[Claim]) -> None:
        self._blocks = _whole(members)
        self._claims = claims
        self._claimed = [label for claim in claims for label in _meanings(claim)]
        # What fits a sample is counted over all elements; that is quick even for a hundred.
        known = [label for label, _, _ in fitting_labels(members)]
        likely = [*known, *self._claimed, *by_digits(self._blocks)]
        found = {label: sum(fits(block, label) for block in self._blocks) for label in likely}
        order = sorted(found, key=lambda label: (-found[label], label not in self._claimed))
        self._fits = {label: found[label] for label in order}

    @property
    def best(self) -> Naming | None:
        """The best label, or None where none fits half of the elements."""
        label = next(iter(self._fits), None)
        if label is None or self._fits[label] * 2 <= len(self._blocks):
            return None
        return self._naming(label)

    @property
    def doubtful(self) -> list[Naming]:
        """Claimed labels that are not the best one."""
        best = self.best
        meant = () if best is None else self._claims_of(best.label)
        return [
            self._naming(label)
            for label in dict.fromkeys(self._claimed)
            # An ambiguous name is told once, in the reading that fits.
            if not any(label in _meanings(claim) for claim in meant)
        ]

    def of_block(self, block: Block) -> list[Designation]:
        """Labels of the set that fit one element; all that are known where the best does not."""
        own = [label for label in self._fits if fits(block, label)]
        if own[:1] == list(self._fits)[:1]:
            return own
        known = [label for label, _, _ in fitting_labels(BasisSet((block,)))]
        return [*own, *(label for label in known if label not in own)]

    def _naming(self, label: Designation) -> Naming:
        verdicts = {block.symbol: verdict(block, label) for block in self._blocks}
        whole = [symbol for symbol, v in verdicts.items() if v is not None and v.fits]
        speaks_for = [f"it promises what {_of_all(whole, len(verdicts))} contain"] if whole else []
        speaks_for += [_told(claim) for claim in self._claims_of(label)]
        against = [_difference(v) for v in verdicts.values() if v is not None and not v.fits]
        if len(against) > _TOLD:
            against[_TOLD:] = [f"and {len(against) - _TOLD} more elements differ"]
        if outside := [symbol for symbol, v in verdicts.items() if v is None]:
            against.append(f"not defined for {listed(outside)}")
        return Naming(
            label,
            self._fits[label],
            len(self._blocks),
            tuple(speaks_for),
            (*against, *self._other_claims(label), *self._rivals(label)),
        )

    def _claims_of(self, label: Designation) -> list[Claim]:
        return [claim for claim in self._claims if label in _meanings(claim)]

    def _other_claims(self, label: Designation) -> list[str]:
        others = [claim for claim in self._claims if label not in _meanings(claim)]
        return [f"{claim.where} says {claim.label!r}" for claim in others]

    def _rivals(self, label: Designation) -> list[str]:
        """Labels that fit as many elements: the content alone does not decide."""
        count = self._fits[label]
        rivals = [str(other) for other, n in self._fits.items() if n == count and other != label]
        told = f"these elements fit {listed(rivals)} just as well"
        return [told] if rivals and count * 2 > len(self._blocks) else []


def _whole(members: BasisSet) -> list[Block]:
    return [block for block in members.blocks if block.complete and block.shells]


def _meanings(claim: Claim) -> tuple[Designation, ...]:
    """What a claimed label may mean: nothing, one label, or the readings of an ambiguous one."""
    if claim.designation is None:
        return ()
    return claim.designation.readings or (claim.designation,)


def _told(claim: Claim) -> str:
    readings = _meanings(claim)
    if len(readings) < 2:
        return f"{claim.where} says so"
    return f"{claim.where} says {claim.label!r}, which may mean {' or '.join(map(str, readings))}"


def _of_all(symbols: list[str], count: int) -> str:
    if len(symbols) == count:
        return f"all {count} elements" if count > 1 else symbols[0]
    return f"{len(symbols)} of {count} elements"


def _difference(v: Verdict) -> str:
    why = f" ({v.why})" if v.why else ""
    return f"{v.block.symbol} has {v.found} where it promises {v.promised}{why}"


def listed(words: Sequence[str], most: int = _TOLD) -> str:
    """Words in a row, of which only the first ``most`` are told: a, b, c and 4 more."""
    told = ", ".join(words[:most])
    return told if len(words) <= most else f"{told} and {len(words) - most} more"
