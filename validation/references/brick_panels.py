"""Gauss panels for the oscillating integrals of the brick spectra."""

import numpy as np

from quadrature import gauss

NODES = 16
PHASE_PER_PANEL = 2.5


def nodes_of(edges, count=NODES):
    """Nodes and weights of Gauss and Legendre on each interval between the edges, in one row."""
    nodes, weights = gauss(count)
    edges = np.asarray(edges)
    half = 0.5 * np.diff(edges)[:, None]
    return (edges[:-1, None] + half * (1.0 + nodes)).ravel(), (half * weights).ravel()


def stepped_edges(first, last, frequency, oscillates_until, ratio=0.3, widest=np.inf):
    """Edges from 0 to last: growing by a ratio from `first`, and by less than a phase while the integrand oscillates."""
    edges = [0.0, min(first, last)]
    while edges[-1] < last:
        here = edges[-1]
        step = min(ratio * here, widest)
        if here < oscillates_until:
            step = min(step, PHASE_PER_PANEL / frequency)
        edges.append(min(here + step, last))
    return edges
