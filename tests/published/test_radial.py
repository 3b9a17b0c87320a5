"""Radial functions of the drawings against an independent library's values on a line."""

import numpy as np
import pytest

pytest.importorskip("matplotlib")
gto = pytest.importorskip("pyscf.gto")

from overlapse.lint.webpage.drawings import radial_function  # noqa: E402


def test_radial_functions_agree_with_another_evaluation() -> None:
    # pyscf (https://pyscf.org): values of contracted functions along z.  The function with m = 0
    # is R(r) Y_l0, and Y_l0 on the axis is sqrt((2 l + 1) / (4 pi)).
    exponents, coefficients = np.array([12.0, 1.7, 0.2]), np.array([0.3, -0.6, 0.9])
    r = np.array([0.05, 0.4, 1.1, 2.5, 6.0])
    points = np.stack([0 * r, 0 * r, r], axis=1)
    for l in range(5):
        shell = [l, *zip(exponents, coefficients, strict=True)]
        atom = gto.M(atom="Ne 0 0 0", basis={"Ne": [shell]}, spin=None, verbose=0)
        values = atom.eval_gto("GTOval_sph", points)
        # Its order of the three p functions is x, y, z; of others m = -l ... l.
        other = values[:, 2 if l == 1 else l] * r / np.sqrt((2 * l + 1) / (4 * np.pi))
        ours = radial_function(exponents, coefficients, l, r)
        # pyscf normalises the contraction; only a factor may differ.
        assert ours / ours[1] == pytest.approx(other / other[1], rel=1e-9, abs=1e-12)
