"""Measuring molecules whose dense matrix would not fit: in sparse form, by bounds where need be."""

from collections.abc import Sequence

import numpy as np

from overlapse.rules.measured.probe import Probe
from overlapse.rules.measured.probing import Label, Wanted, assembled, ladder_of, some_of
from overlapse.rules.measured.site import Site
from overlapse.rules.physics.blocks import sparse_overlap
from overlapse.rules.physics.placed import lay_out
from overlapse.rules.physics.spectrum import COPIES, spectrum_of_sparse


def probe_large(sites: Sequence[Site], wanted: Wanted, label: Label, memory: int) -> Probe:
    """Measure one molecule within so many bytes.

    The most diffuse functions that fit are looked into; what is said of them is a bound for the
    whole (`overlapse.rules.physics.spectrum.spectrum_of_sparse`), and the method says so.  Nothing
    is proposed to be dropped.  Raises `overlapse.rules.physics.integrals.TooLarge` where not even
    the sparse matrix fits.
    """
    placed = [site.placed for site in sites]
    functions = lay_out(placed)
    # One half for the sparse matrix, which stays, one for what is made of it.
    held = sparse_overlap(placed, memory=memory // 2)
    found = spectrum_of_sparse(
        held.matrix, functions.exponent, memory=memory // 2, ladder=ladder_of(wanted)
    )
    fits = int((memory // 2 / (COPIES * 8)) ** 0.5)
    diffuse = np.sort(np.argsort(functions.exponent, kind="stable")[:fits])
    part = held.matrix.dense(diffuse)
    return assembled(
        sites,
        wanted,
        label,
        part,
        found,
        ((), None),
        None,
        functions=some_of(functions, diffuse),
    )
