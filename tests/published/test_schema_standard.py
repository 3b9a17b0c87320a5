"""Layout `schema` against an independent implementation of the open standard."""

import json
from typing import Any

import jsonschema
import pytest
from generated import content, documents
from hypothesis import HealthCheck, assume, given, settings

from overlapse.grammar.layouts import layouts
from overlapse.grammar.model import Document
from overlapse.grammar.reading import read_text

standard = pytest.importorskip(
    "qcelemental.models", reason="the standard's own models are not installed (extra: oracle)"
)

LIMITS = settings(
    max_examples=40, deadline=None, suppress_health_check=[HealthCheck.too_slow]
)  # building and checking models takes its time


def written(document: Document) -> dict[str, Any]:
    return dict(json.loads(layouts()["schema"].write(document).text))


@LIMITS
@given(document=documents())
def test_what_we_write_is_valid_and_means_the_same(document: Document) -> None:
    data = written(document)
    first = standard.v1.BasisSet(**data)
    second = first.convert_v(2)
    assert first.name == "invented"
    for block, name in zip(document.blocks, data["atom_map"], strict=True):
        for centre in (first.center_data[name], second.center_data[name]):
            for shell, theirs in zip(block.shells, centre.electron_shells, strict=True):
                assert tuple(theirs.angular_momentum) == shell.angular
                assert theirs.harmonic_type.value == (block.functions or "spherical")
                assert list(theirs.exponents) == shell.exponents.tolist()
                assert [list(c) for c in theirs.coefficients] == shell.coefficients.T.tolist()
            if block.potential is None:
                continue
            assert centre.ecp_electrons == block.potential.electrons
            for channel, part in zip(block.potential.channels, centre.ecp_potentials, strict=True):
                assert part.angular_momentum == [channel.l]
                assert tuple(part.r_exponents) == channel.powers
                assert list(part.gaussian_exponents) == channel.exponents.tolist()
                assert [list(c) for c in part.coefficients] == [channel.coefficients.tolist()]


@LIMITS
@given(document=documents())
def test_what_we_write_fits_the_published_schema(document: Document) -> None:
    assume(not any("equal shells" in s for s in layouts()["schema"].write(document).losses))
    data = written(document)
    jsonschema.validate(data, standard.v1.BasisSet.schema())
    data.update(schema_name="qcschema_basis_set", schema_version=2)
    jsonschema.validate(data, standard.v2.BasisSet.model_json_schema())


@LIMITS
@given(document=documents())
def test_what_they_write_we_read(document: Document) -> None:
    theirs = standard.v1.BasisSet(**written(document))
    for text in (theirs.json(), theirs.convert_v(2).model_dump_json()):
        again = read_text(text)
        assert again.layout == "schema"
        assert not [fault for fault in again.faults if fault.severity != "note"]
        assert content(again) == content(document)


def test_a_molecule_and_its_basis() -> None:
    shell = {
        "harmonic_type": "spherical",
        "angular_momentum": [0],
        "exponents": [4.0, 0.5],
        "coefficients": [[0.6, 0.5]],
    }
    basis = standard.v1.BasisSet(
        name="invented",
        center_data={"heavy": {"electron_shells": [shell]}, "h": {"electron_shells": [shell]}},
        atom_map=["heavy", "h", "h"],
    )
    job = standard.v1.AtomicInput(
        molecule={"symbols": ["O", "H", "H"], "geometry": [0, 0, 0, 0, 0, 1.8, 0, 1.8, 0]},
        driver="energy",
        model={"method": "none", "basis": basis},
    )
    document = read_text(job.json())
    assert not document.faults
    assert [block.symbol for block in document.blocks] == ["O", "H"]
