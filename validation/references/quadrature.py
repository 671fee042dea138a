"""Quadrature rules that work on whole arrays of intervals at once, and the writer of reference files."""

import json
import pathlib

import numpy as np

HERE = pathlib.Path(__file__).resolve().parent
SIGNIFICANT_DIGITS = 12
# Long columns are for interpolation, whose own error is larger.
LONG_COLUMN, COLUMN_DIGITS = 50, 8


def gauss(order):
    """Nodes and weights of Gauss and Legendre on [-1, 1]."""
    return np.polynomial.legendre.leggauss(order)


def integrate_rows(function, edges, rule):
    """Sum over the segments of each row of `edges` [n, m+1] of the integral of function(nodes [n, m, k])."""
    nodes, weights = rule
    low, high = edges[:, :-1, None], edges[:, 1:, None]
    half = 0.5 * (high - low)
    values = function(low + half * (1.0 + nodes))
    return np.sum(values * (half * weights), axis=(1, 2))


def antiderivative_matrix(order):
    """B[i, j] = integral from -1 to node i of the j-th Lagrange polynomial on the Gauss nodes."""
    nodes, _ = gauss(order)
    legendre = np.polynomial.legendre
    vandermonde = legendre.legvander(nodes, order - 1)
    to_coefficients = np.linalg.inv(vandermonde)
    columns = [legendre.legval(nodes, legendre.legint(to_coefficients[:, j], lbnd=-1)) for j in range(order)]
    return np.array(columns).T


def thinned(x, cumulative, tolerance=1e-5):
    """A subset of the points from which linear interpolation gives all others within tolerance * (their range)."""
    allowed = tolerance * np.ptp(cumulative)
    keep, open_segments = {0, len(x) - 1}, [(0, len(x) - 1)]
    while open_segments:
        low, high = open_segments.pop()
        if high - low < 2:
            continue
        inside = slice(low + 1, high)
        line = np.interp(x[inside], x[[low, high]], cumulative[[low, high]])
        distance = np.abs(cumulative[inside] - line)
        worst = low + 1 + int(np.argmax(distance))
        if distance[worst - low - 1] > allowed:
            keep.add(worst)
            open_segments += [(low, worst), (worst, high)]
    chosen = sorted(keep)
    return x[chosen], cumulative[chosen]


def short(value, digits=SIGNIFICANT_DIGITS):
    """Plain Python values with floats cut to so many significant digits."""
    if isinstance(value, dict):
        return {key: short(item) for key, item in value.items()}
    if isinstance(value, (list, tuple, np.ndarray)):
        return [short(item, COLUMN_DIGITS if len(value) > LONG_COLUMN else digits) for item in value]
    if isinstance(value, (bool, np.bool_, str)) or value is None:
        return bool(value) if isinstance(value, np.bool_) else value
    if isinstance(value, (int, np.integer)):
        return int(value)
    return float(f"{float(value):.{digits}g}")


def text_of(value, depth=0):
    """JSON with lists of numbers on one line."""
    pad, inner = " " * depth, " " * (depth + 1)
    if isinstance(value, dict):
        rows = [f"{inner}{json.dumps(key)}: {text_of(item, depth + 1)}" for key, item in value.items()]
        return "{\n" + ",\n".join(rows) + f"\n{pad}}}"
    if isinstance(value, list) and any(isinstance(item, (dict, list)) for item in value):
        return "[\n" + ",\n".join(inner + text_of(item, depth + 1) for item in value) + f"\n{pad}]"
    return json.dumps(value)


def write_reference(name, title, sources, formula, precision, **content):
    """Write NAME.json beside this file: what it is, where it comes from, how exact it is, then the numbers."""
    head = {"title": title, "made_by": f"validation/references/{name}.py", "sources": sources, "formula": formula, "precision": precision}
    path = HERE / f"{name}.json"
    path.write_text(text_of(short({**head, **content})) + "\n")
    print(f"{path.name}: {path.stat().st_size} bytes")
