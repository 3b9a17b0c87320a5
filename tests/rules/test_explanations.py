"""Every rule explains itself, and its own samples show that it works."""

import pytest
from probed import probed

from overlapse.grammar.model import Document
from overlapse.grammar.reading import read_bytes, read_text
from overlapse.rules.case import Case
from overlapse.rules.compare.beside import SealedSet, seals_of
from overlapse.rules.compare.kinship import kin_among
from overlapse.rules.registry import Rule, rules

RULES = sorted(rules())


def case_of(rule: Rule, document: Document) -> Case:
    """A sample under judgement, with what the rule's page says lies beside it."""
    if rule.explanation.geometry:
        return probed(document, rule.explanation.geometry)
    case = Case(document, energies=True)
    if rule.explanation.beside:
        beside = read_text(rule.explanation.beside, "beside")
        case.reference = beside
        case.seals = tuple(
            SealedSet(index, members.label, seals_of(members))
            for index, members in enumerate(beside.sets)
        )
        case.kin = tuple(kin_among(case.claims, case.document.sets, [beside]))
    return case


@pytest.mark.parametrize("name", RULES)
def test_a_rule_says_what_why_source_and_remedy(name: str) -> None:
    text = rules()[name].explanation
    assert text.what.endswith(".")
    assert len(text.why.split()) >= 12
    assert text.source
    assert text.remedy
    for limit in rules()[name].limits:
        assert f"{limit}:" in text.limits, f"the limit {limit} is not explained"


@pytest.mark.parametrize("name", RULES)
def test_the_bad_sample_is_found(name: str) -> None:
    rule = rules()[name]
    # Samples go through bytes, as files do: one of them is about the bytes themselves.
    document = read_bytes(rule.explanation.bad.encode(), "sample")
    found = case_of(rule, document).judge(rule)
    assert found
    for finding in found:
        assert finding.rule == name
        assert finding.message and finding.message[-1] not in ".!"
        assert finding.remedy or finding.expected is not None
        assert 1 <= finding.line <= len(document.source.lines)


@pytest.mark.parametrize("name", RULES)
def test_the_good_sample_is_not(name: str) -> None:
    rule = rules()[name]
    document = read_text(rule.explanation.good, "sample")
    assert document.layout
    assert not [f for f in case_of(rule, document).judge(rule) if f.severity != "note"]
    assert not [fault for fault in document.faults if fault.severity == "error"]


@pytest.mark.parametrize("name", RULES)
def test_heuristic_rules_never_give_errors(name: str) -> None:
    rule = rules()[name]
    if rule.explanation.what.lower().startswith("suspect"):
        found = case_of(rule, read_text(rule.explanation.bad, "sample")).judge(rule)
        assert {finding.severity for finding in found} <= {"warning", "note"}
        assert all("suspect" in finding.message for finding in found)
