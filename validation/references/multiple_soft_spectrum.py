"""The gluon spectrum of multiple soft scattering in a static brick, double differential, by its double time integral.

With x = omega/omega_c, omega_c = qhat L^2/2, y = kappa^2/(qhat L), u = y/x = kappa^2 L/(2 omega), theta^2 = -i/x:
h = (pi/(2 alpha_s C_R)) kappa^2 omega dI_med/(domega dkappa^2), so that the vacuum has h = 1/2. Times in units of L.
"""

import mpmath
import numpy as np

from brick_panels import nodes_of, stepped_edges
from quadrature import write_reference

X_POINTS = (1e-3, 1e-2, 0.1, 0.3, 0.5, 1.0, 2.0, 5.0, 10.0, 50.0)
Y_POINTS = (1e-3, 0.03, 0.3, 1.0, 4.0, 30.0, 1e3)
E1_POINTS = ((0.01, 0.3), (0.1, 1.0), (0.5, 0.3), (1.0, 4.0), (10.0, 4.0))
INTEGRAL_X = (0.03, 0.1, 0.5, 1.0, 2.0)
RADIATION_PARAMETERS = (100.0, 1000.0, 1e4)
# check-values.md of the design: omega dI/domega in units 2 alpha_s C_R/pi, without limit and with k_T < omega, R = 1000.
PUBLISHED_FORM = {0.1: (1.540261, 1.287061), 0.5: (0.2573165, 0.2492515), 1.0: (0.0772454, 0.0752414), 2.0: (0.0204229, 0.0199227)}
TOLERANCE = 3e-8
# exp(-120 ...) is far below rounding: the medium has damped the oscillation of the vertex by then.
DAMPED = 120.0


def theta_of(x):
    """Omega L."""
    return (1.0 - 1.0j) / np.sqrt(2.0 * x)


def time_nodes(x, u):
    """Nodes for the emission's duration s/L in (0, 1)."""
    edges = stepped_edges(1e-3 * min(x, 1.0 / u, 1.0), 1.0, u, (DAMPED * x / u) ** (1.0 / 3.0), widest=0.05)
    return nodes_of(edges)


def by_double_integral(x, y):
    """h from both times: duration s, and the medium left after the emission has formed."""
    u, theta = y / x, theta_of(x)
    duration, weights = time_nodes(x, u)
    left_share, left_weights = nodes_of([0.0, *np.geomspace(1e-9, 1.0, 24)], 12)
    total = 0.0
    for start in range(0, len(duration), 2000):
        s = duration[start : start + 2000, None]
        left = (1.0 - s) * left_share
        tangent = np.tan(theta * s)
        before = 1.0j * u * tangent / theta
        after = 1.0 / (1.0 / before + left / y)
        ratio = after / before
        integrand = -(theta**2) * (1.0 + 1.0 / tangent**2) * after * np.exp(-after) * (1.0 - ratio * (1.0 - after))
        total += np.sum(weights[start : start + 2000] * (1.0 - s[:, 0]) * (integrand @ left_weights))
    leaves = np.exp(-1.0j * u * np.tan(theta) / theta) - 1.0
    return float((total + leaves).real)


def by_single_integral(x, y):
    """h after one of the two integrals and two integrations by parts: Re int ds (1/r)' exp(-i u g)."""
    u, theta = y / x, theta_of(x)
    s, weights = time_nodes(x, u)
    tangent = np.tan(theta * s)
    g = tangent / (theta * (1.0 - theta * (1.0 - s) * tangent))
    slope = theta * tangent - theta**2 * (1.0 - s) * (1.0 + tangent**2)
    return float(np.sum(weights * slope * np.exp(-1.0j * u * g)).real)


def by_exponential_integrals(x, y):
    """h from the form with exponential integrals (the inner time integral closed), at 30 digits."""
    mpmath.mp.dps = 30
    x, y = mpmath.mpf(x), mpmath.mpf(y)
    u, theta = y / x, mpmath.mpc(1, -1) / mpmath.sqrt(2 * x)

    def integrand(s):
        before = 1j * u * mpmath.tan(theta * s) / theta
        after = 1 / (1 / before + (1 - s) / y)
        bracket = after / before * mpmath.exp(-after) - mpmath.exp(-before) + mpmath.e1(after) - mpmath.e1(before)
        return -y * theta**2 / mpmath.sin(theta * s) ** 2 * bracket

    inside = mpmath.quad(integrand, [0, x / 10, x, *mpmath.linspace(x, 1, 6)[1:]] if x < 1 else mpmath.linspace(0, 1, 6))
    return float((inside + mpmath.exp(-1j * u * mpmath.tan(theta) / theta) - 1).real)


def closed_integral(x):
    """ln |cos((1 + i)/sqrt(2 x))|: int h d ln y over all y."""
    return float(np.log(np.abs(np.cos((1.0 + 1.0j) / np.sqrt(2.0 * x)))))


def integral(x, ln_y_max):
    """int h d ln y up to a limit, by quadrature."""
    ln_y, weights = nodes_of(np.linspace(-40.0, ln_y_max, 160), 12)
    values = np.array([by_single_integral(x, y) for y in np.exp(ln_y)])
    return float(np.sum(weights * values))


def main():
    """Compute, check, write."""
    points, worst = [], 0.0
    for x in X_POINTS:
        for y in Y_POINTS:
            double = by_double_integral(x, y)
            worst = max(worst, abs(double - by_single_integral(x, y)))
            points.append({"x": x, "y": y, "h": double})
    special = max(abs(by_exponential_integrals(x, y) - by_double_integral(x, y)) for x, y in E1_POINTS)
    smallest = min(point["h"] for point in points)
    integrals, closure, published = [], 0.0, 0.0
    for x in INTEGRAL_X:
        closed = closed_integral(x)
        # What lies above y = 400: 1/y + 1/y^2 + ...
        ln_top = np.log(400.0)
        closure = max(closure, abs(integral(x, ln_top) + 1.0 / 400.0 + 1.0 / 400.0**2 - closed))
        limited = [{"radiation_parameter": r, "integral": integral(x, np.log(0.5 * x * x * r))} for r in RADIATION_PARAMETERS]
        integrals.append({"x": x, "integral": closed, "small_angles": limited})
        if x in PUBLISHED_FORM:
            published = max(published, abs(closed - PUBLISHED_FORM[x][0]), abs(limited[1]["integral"] - PUBLISHED_FORM[x][1]))
    print(f"single-double {worst:.1e} E1 {special:.1e} closure {closure:.1e} check values {published:.1e} smallest h {smallest:.4f}")
    assert worst < TOLERANCE and special < TOLERANCE and closure < 1e-6 and published < 1e-6 and smallest > -0.5
    write_reference(
        "multiple_soft_spectrum",
        "Double-differential gluon spectrum of multiple soft scattering in a static brick",
        [
            "Wiedemann 2000, hep-ph/0005129; Salgado & Wiedemann 2003, hep-ph/0302184 (the double time integral; from memory, re-derived)",
            "Baier, Dokshitzer, Mueller, Peigne & Schiff 1997, hep-ph/9607355 (the spectrum after all transverse momenta)",
        ],
        "x = omega/omega_c, omega_c = qhat L^2/2, y = kappa^2/(qhat L); h = (pi/(2 alpha_s C_R)) kappa^2 omega dI/(domega dkappa^2) less the vacuum's 1/2; "
        "integral = int h d ln y = ln|cos((1+i)/sqrt(2x))|; small_angles: up to kappa = omega, y = x^2 R/2, R = omega_c L",
        {
            "largest_difference_of_double_and_single_integral": worst,
            "largest_difference_to_the_form_with_exponential_integrals": special,
            "largest_difference_of_the_integral_to_its_closed_form": closure,
        },
        points=points,
        integrals=integrals,
    )


if __name__ == "__main__":
    main()
