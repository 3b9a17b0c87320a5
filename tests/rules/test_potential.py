"""Core potentials: what single blocks may and may not say."""

import numpy as np
import pytest

from overlapse.grammar.model import BasisSet, Block, Channel, Document, Potential, Shell
from overlapse.grammar.source import Source
from overlapse.rules.case import Case
from overlapse.rules.finding import Finding
from overlapse.rules.labels.cores import is_closed, is_usual, local_charge, opens_f, possible_cores
from overlapse.rules.registry import rules

S = Shell((0,), [0.5, 0.1], [[-0.3], [1.1]])
DIFFUSE = Shell((0,), [0.04], [[1.0]])
P = Shell((1,), [0.4], [[1.0]])


def _channel(l: int, local: bool = False, power: int = 2, exponent: float = 3.0) -> Channel:
    return Channel(l, local, (power,), [exponent], [float(l + 7)])


def _ladder(top: int) -> tuple[Channel, ...]:
    return (_channel(top, True), *(_channel(l) for l in range(top)))


def _judge(rule: str, *blocks: Block) -> list[Finding]:
    document = Document(Source("X\n"), "stars", (BasisSet(blocks),))
    return Case(document).judge(rules()[rule])


def _block(
    z: int, potential: Potential | None, shells: tuple[Shell, ...] = (S, DIFFUSE, P)
) -> Block:
    return Block(z, shells, potential)


@pytest.mark.parametrize("rule", ["potential.core", "potential.terms", "potential.channels"])
def test_a_potential_whose_terms_are_not_modelled_is_left_alone(rule: str) -> None:
    assert not _judge(rule, _block(12, Potential(10, ())), _block(22, Potential(12, ())))


def test_a_sound_potential_is_silent() -> None:
    block = _block(11, Potential(10, _ladder(2)))
    for rule in ("core", "missing", "terms", "channels"):
        assert not _judge(f"potential.{rule}", block)


@pytest.mark.parametrize(("z", "electrons"), [(11, 11), (11, 28), (53, 54)])
def test_more_electrons_than_the_atom_can_give(z: int, electrons: int) -> None:
    (finding,) = _judge("potential.core", _block(z, Potential(electrons, _ladder(3))))
    assert finding.severity == "error" and finding.measured == electrons


@pytest.mark.parametrize("electrons", [9, 24, 11, 31])
def test_electrons_that_fill_no_closed_shells(electrons: int) -> None:
    (finding,) = _judge("potential.core", _block(35, Potential(electrons, _ladder(3))))
    assert finding.severity == "error" and "closed shells" in finding.message


@pytest.mark.parametrize(("z", "electrons"), [(58, 47), (64, 53), (92, 81), (58, 48)])
def test_an_open_f_shell_in_the_core_is_in_use(z: int, electrons: int) -> None:
    assert opens_f(electrons, z)
    assert not _judge("potential.core", _block(z, Potential(electrons, _ladder(3))))


def test_a_core_that_nobody_uses_for_the_element() -> None:
    (finding,) = _judge("potential.core", _block(80, Potential(10, _ladder(3))))
    assert finding.severity == "warning" and "60, 68, 78" in finding.message


def test_neighbours_tell_which_core_is_meant() -> None:
    blocks = [_block(z, Potential(28 if z != 33 else 18, _ladder(3))) for z in (32, 33, 34)]
    (finding,) = _judge("potential.core", *blocks)
    assert (finding.element, finding.expected) == ("As", 28)


@pytest.mark.parametrize("charge", [-10.0, 1.0])
def test_the_local_part_tells_which_core_is_meant(charge: float) -> None:
    local = Channel(2, True, (1, 2), [3.0, 1.0], [charge, 5.0])
    potential = Potential(2, (local, _channel(0), _channel(1)))
    assert local_charge(potential) == charge
    (finding,) = _judge("potential.core", _block(11, potential))
    assert finding.expected == 10
    assert not _judge("potential.core", _block(11, Potential(10, potential.channels)))


def test_a_local_part_that_carries_another_charge_says_nothing() -> None:
    local = Channel(2, True, (1,), [3.0], [-6.475])
    assert not _judge(
        "potential.core", _block(13, Potential(10, (local, _channel(0), _channel(1))))
    )


@pytest.mark.parametrize(
    ("z", "electrons", "usual"), [(30, 10, True), (30, 18, True), (30, 28, True), (38, 10, False)]
)
def test_usual_cores(z: int, electrons: int, usual: bool) -> None:
    assert is_usual(electrons, z) == usual
    assert (electrons in possible_cores(z)) == usual


def test_model_potentials_have_cores_of_their_own() -> None:
    assert is_closed(12, modelled=False) and not is_closed(12)


def test_a_valence_set_says_how_many_electrons_are_meant() -> None:
    (finding,) = _judge("potential.missing", _block(11, None))
    assert finding.severity == "note" and finding.expected == 10


def test_a_potential_lost_beside_others_is_a_warning() -> None:
    others = [_block(z, Potential(10, _ladder(2))) for z in (12, 13)]
    (finding,) = _judge("potential.missing", _block(11, None), *others)
    assert (finding.severity, finding.element) == ("warning", "Na")


def test_few_functions_are_a_fragment_not_a_valence_set() -> None:
    blocks = [_block(z, None, (DIFFUSE, P)) for z in (5, 6, 7)]
    assert not _judge("potential.missing", *blocks)
    (finding,) = _judge("shell.fragment", *blocks)
    assert finding.severity == "note"


def test_valence_sets_are_no_fragments() -> None:
    blocks = [_block(z, None) for z in (11, 12, 13)]
    assert not _judge("shell.fragment", *blocks)
    (finding,) = _judge("potential.missing", *blocks)
    assert "3 of 3 elements" in finding.message


def test_a_fitting_set_needs_no_potential() -> None:
    members = BasisSet(tuple(_block(z, None) for z in (11, 12, 13)), role="fitting")
    document = Document(Source("X\n"), "stars", (members,))
    assert not Case(document).judge(rules()["potential.missing"])


def test_a_power_out_of_use() -> None:
    odd = (_channel(1, True, power=9), _channel(0))
    (finding,) = _judge("potential.terms", _block(3, Potential(2, odd)))
    assert finding.measured == 9 and "r**7" in finding.message


def test_zero_terms_may_repeat() -> None:
    local = Channel(2, True, (2, 2), [1.0, 1.0], np.zeros(2))
    potential = Potential(10, (local, _channel(0), _channel(1)))
    assert not _judge("potential.terms", _block(11, potential))


@pytest.mark.parametrize(
    ("channels", "says"),
    [
        ((_channel(0), _channel(1)), "no local parts"),
        ((*_ladder(2), _channel(2, True)), "2 local parts"),
        ((*_ladder(2), _channel(1)), "the p part more than once"),
        ((_channel(2, True), _channel(1)), "lacks the s part"),
        ((*_ladder(2), _channel(2)), "has the d part not below its local part (d)"),
        (_ladder(1), "projected on s only"),
    ],
)
def test_channels_that_are_no_ladder(channels: tuple[Channel, ...], says: str) -> None:
    (finding,) = _judge("potential.channels", _block(11, Potential(10, channels)))
    assert says in finding.message


def test_a_part_copied_from_another() -> None:
    copy = Channel(1, False, (2,), [3.0], [7.0])
    potential = Potential(10, (_channel(2, True), _channel(0), copy))
    (finding,) = _judge("potential.channels", _block(11, potential))
    assert "the same terms in its s and p parts" in finding.message


def test_an_element_twice_beside_its_like() -> None:
    """Blocks are told apart by what they are, not by comparing their arrays."""
    first = Shell((0,), [24.0, 1.2, 0.2], [[0.5], [1.0], [0.3]])
    other = Shell((0,), [49.0, 24.0, 11.0], [[0.4], [0.2], [0.1]])
    found = _judge("potential.missing", *(_block(z, None, (s,)) for z, s in
                                          ((4, first), (3, first), (4, other))))  # fmt: skip
    assert all(finding.rule == "potential.missing" for finding in found)
