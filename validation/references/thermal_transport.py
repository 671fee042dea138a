"""Transport coefficients of a perturbative thermal medium: qhat, Debye mass, drag."""

import functools
import math

import mpmath

import conventions as qcd
from quadrature import write_reference

SETTINGS = ((0.3, 3), (0.2, 3), (0.3, 2), (0.25, 0))
TEMPERATURES_GEV = (0.15, 0.2, 0.3, 0.45, 0.8)
ENERGIES_GEV = (2.0, 10.0, 50.0, 100.0, 500.0)
ZETA_3 = 1.2020569031595943


def debye_mass(temperature, alpha_s, flavours):
    """m_D in GeV."""
    return temperature * math.sqrt(4.0 * math.pi * alpha_s * (1.0 + flavours / 6.0))


def qhat(colour, temperature, energy, alpha_s, flavours):
    """GeV^2/fm."""
    logarithm = math.log(2.0 * energy * temperature / debye_mass(temperature, alpha_s, flavours) ** 2)
    size = colour * 2.0 * ZETA_3 / math.pi * (12.0 + 3.0 * flavours) * alpha_s**2 * temperature**3
    return size * max(0.0, logarithm) / qcd.HBAR_C_GEV_FM


@functools.lru_cache
def thermal_integrals(temperature, flavours):
    """int d^3p/(2 pi)^3 [2 C_A n_B + 2 n_f n_F] and int p dp of the same, over Bose and Fermi distributions."""

    def occupied(p):
        return 2 * qcd.C_A / mpmath.expm1(p / temperature) + 2 * flavours / (mpmath.exp(p / temperature) + 1)

    marks = [0, temperature, 5 * temperature, 20 * temperature, 80 * temperature]
    return mpmath.quad(lambda p: p * p * occupied(p), marks) / (2 * mpmath.pi**2), mpmath.quad(lambda p: p * occupied(p), marks)


def from_distributions(colour, temperature, energy, alpha_s, flavours):
    """qhat and m_D with the thermal integrals done numerically.

    Scattering off a dilute thermal parton: C(q) = g^4 C_R/q^4 int d^3p/(2 pi)^3 [2 C_A n_B + 2 n_f n_F]; its second moment
    in q between m_D and sqrt(2 E T) is qhat. m_D^2 = g^2/pi^2 int p dp [2 C_A n_B + 2 n_f n_F].
    """
    g2 = 4.0 * math.pi * alpha_s
    number, weighted = thermal_integrals(temperature, flavours)
    debye2 = g2 / math.pi**2 * weighted
    top = 2.0 * energy * temperature
    if top <= debye2:
        return 0.0, float(mpmath.sqrt(debye2))
    second = mpmath.log(top / debye2) / (4.0 * math.pi)
    return float(g2**2 * colour * number * second / qcd.HBAR_C_GEV_FM), float(mpmath.sqrt(debye2))


def main():
    """Compute, check, write."""
    rows, worst = [], 0.0
    for alpha_s, flavours in SETTINGS:
        for temperature in TEMPERATURES_GEV:
            debye = debye_mass(temperature, alpha_s, flavours)
            for energy in ENERGIES_GEV:
                values = {}
                for name, colour in (("quark", qcd.C_F), ("gluon", qcd.C_A)):
                    value = qhat(colour, temperature, energy, alpha_s, flavours)
                    other, other_debye = from_distributions(colour, temperature, energy, alpha_s, flavours)
                    worst = max(worst, abs(value - other) / max(other, 1e-3), abs(debye / other_debye - 1.0))
                    values |= {f"{name}_qhat_GeV2_per_fm": value, f"{name}_drag_GeV_per_fm": value / (4.0 * temperature)}
                rows.append(
                    {"alpha_s": alpha_s, "flavours": flavours, "temperature_GeV": temperature, "energy_GeV": energy, "debye_mass_GeV": debye, **values}
                )
    assert worst < 1e-12, worst
    quoted = [qhat(qcd.C_F, temperature, 100.0, 0.3, 3) for temperature in (0.2, 0.3, 0.45)]
    assert all(abs(a / b - 1.0) < 2e-6 for a, b in zip(quoted, (0.404613, 1.25858, 3.88662))), quoted
    peaks = [
        {"alpha_s": alpha_s, "flavours": flavours, "energy_GeV": energy, "temperature_GeV": peak}
        for alpha_s, flavours in SETTINGS
        for energy in ENERGIES_GEV[:2]
        for peak in [2.0 * energy / (4.0 * math.pi * alpha_s * (1.0 + flavours / 6.0)) * math.exp(-1.0 / 3.0)]
    ]
    for row in peaks:
        here = [qhat(qcd.C_A, row["temperature_GeV"] * f, row["energy_GeV"], row["alpha_s"], row["flavours"]) for f in (0.999, 1.0, 1.001)]
        assert here[0] < here[1] > here[2], row
    write_reference(
        "thermal_transport",
        "Thermal transport coefficients: qhat, Debye mass and drag",
        [
            "Arnold & Xiao 2008, arXiv:0810.1026 (hard part)",
            "Aurenche, Gelis & Zaraket 2002, hep-ph/0204146 (soft part)",
            "drag by the fluctuation-dissipation relation ehat = qhat/(4T): common practice",
        ],
        "qhat_R = C_R (2 zeta(3)/pi)(12 + 3 n_f) alpha_s^2 T^3 max(0, ln(2 E T/m_D^2))/(hbar c), E in the fluid's frame; "
        "m_D^2 = 4 pi alpha_s T^2 (1 + n_f/6); drag = qhat_R/(4T); peaks: temperature at which qhat is largest for that energy",
        {"largest_relative_difference_to_numerical_thermal_integrals": worst},
        cases=rows,
        peaks=peaks,
    )


if __name__ == "__main__":
    main()
