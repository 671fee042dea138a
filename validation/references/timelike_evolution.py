"""Leading-order timelike anomalous dimensions from a public evolution library, in the shower's convention.

The library is eko (PyPI package `eko`; Candido, Hekhorn & Magni 2022, arXiv:2202.02338); its timelike module cites
Mitov, Moch & Vogt 2006 and Gluck, Reya & Vogt 1993. It evolves fragmentation functions (the hadron seen in a parton),

    d(D_Sigma, D_g)/d ln mu^2 = -(alpha_s/(4 pi)) gamma (D_Sigma, D_g),   D_Sigma = sum over the 2 n_f quarks,

while the shower makes densities of partons in a parton: the adjoint. With G = -gamma/2, per alpha_s/(2 pi),

    A_qq = G_00,  A_gq = G_01/(2 n_f),  A_qg = 2 n_f G_10,  A_gg = G_11.
"""

import math

import numpy as np
from ekore.anomalous_dimensions.unpolarized.time_like import as1
from ekore.harmonics import cache
from scipy.linalg import expm

from collinear_moments import ALPHA_S, CUTOFF_GEV, MOMENTS, START_GEV, textbook
from quadrature import write_reference

FLAVOURS = (3, 5)


def from_library(n, n_f):
    """The library's matrix as A of collinear_moments (rows Sigma, g; column = parent), and its non-singlet value."""
    gamma = np.real(as1.gamma_singlet(complex(n), n_f, cache.reset()))
    nonsinglet = float(np.real(as1.gamma_ns(complex(n), cache.reset())))
    g = -0.5 * gamma
    return np.array([[g[0, 0], 2 * n_f * g[1, 0]], [g[0, 1] / (2 * n_f), g[1, 1]]]), -0.5 * nonsinglet


def main():
    """Compute, check, write."""
    span = ALPHA_S / (2.0 * math.pi) * math.log(START_GEV**2 / CUTOFF_GEV**2)
    rows, worst = [], 0.0
    for n_f in FLAVOURS:
        for n in MOMENTS:
            matrix, nonsinglet = from_library(n, n_f)
            worst = max(worst, float(np.max(np.abs(matrix - textbook(n, n_f)))))
            evolved = expm(matrix * span)
            rows.append(
                {
                    "N": n,
                    "flavours": n_f,
                    "matrix": matrix,
                    "nonsinglet": nonsinglet,
                    "quark": {"Sigma": evolved[0, 0], "g": evolved[1, 0], "valence": math.exp(nonsinglet * span)},
                    "gluon": {"Sigma": evolved[0, 1], "g": evolved[1, 1], "valence": 0.0},
                }
            )
    assert worst < 1e-12, worst
    write_reference(
        "timelike_evolution",
        "Leading-order timelike evolution without a cut, from a public evolution library",
        ["eko (PyPI): Candido, Hekhorn & Magni 2022, arXiv:2202.02338", "Ellis, Stirling & Webber, ch. 4 (compared with)"],
        "A = adjoint of -gamma/2, in units of alpha_s/(2 pi); evolved = expm(A alpha_s/(2 pi) ln(start^2/cutoff^2))",
        {"largest_difference_to_the_textbook_formulas": worst},
        setup={"alpha_s": ALPHA_S, "start_virtuality_GeV": START_GEV, "virtuality_cutoff_GeV": CUTOFF_GEV},
        cases=rows,
    )


if __name__ == "__main__":
    main()
