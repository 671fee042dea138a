"""Reading an event file with h5py and awkward: jagged arrays, multiplicity, a fragmentation function, momentum sums.

    python validation/reading_example.py first-look.h5

Needs h5py, numpy and awkward. Nothing of spindrift is imported: the file is plain HDF5.
"""

import sys

import awkward as ak
import h5py
import numpy as np

FINAL, HARD = 1, 3
GIVEN_TO_MEDIUM, TAKEN_FROM_MEDIUM = 4, 5
RELATIVE_TOLERANCE = 1e-9


def read_events(path, columns=("pdg", "status", "px", "py", "pz", "energy", "jet_fraction")):
    """Event weights and a jagged array partons[event, parton] with the columns asked for."""
    with h5py.File(path) as file:
        assert file.attrs["format"] == "spindrift events", "not an event file"
        # A file that is still being written (complete = 0) is valid up to these counts.
        events, partons = int(file.attrs["events_committed"]), int(file.attrs["partons_committed"])
        counts = file["events/partons_count"][:events]
        weights = file["events/weight"][:events]
        flat = {name: file["partons"][name][:partons] for name in columns}
        lossless = int(file.attrs.get("momentum_bits", 52)) >= 52
        attributes = dict(file.attrs)
    return weights, ak.unflatten(ak.zip(flat), counts), attributes, lossless


def main():
    """Print what a first look at a sample would want."""
    path = sys.argv[1] if len(sys.argv) > 1 else "first-look.h5"
    weights, partons, attributes, lossless = read_events(path)
    final = partons[partons.status == FINAL]
    hard = partons[partons.status == HARD]

    multiplicity = ak.num(final)
    mean = np.average(multiplicity, weights=weights)
    # Of a weighted mean: sum of w^2 (n - mean)^2 over (sum of w)^2.
    error = np.sqrt(np.sum(weights**2 * (multiplicity - mean) ** 2)) / np.sum(weights)
    print(f"{path}: {len(weights)} events, {ak.sum(ak.num(partons))} rows")
    print(f"mean number of final partons {mean:.3f} +- {error:.3f}, largest {ak.max(multiplicity)}")

    edges = np.linspace(0.0, 6.0, 13)
    xi = ak.flatten(np.log(1.0 / final.jet_fraction))
    row_weights = ak.flatten(ak.broadcast_arrays(weights, final.jet_fraction)[0])
    density = np.histogram(xi, edges, weights=row_weights)[0] / (np.sum(weights) * np.diff(edges))
    print("xi = ln(1/x)   dN/dxi")
    for low, high, value in zip(edges[:-1], edges[1:], density):
        print(f"{low:4.1f} - {high:4.1f}   {value:8.4f}")

    # Energy: final partons, plus what the medium was given, less what it gave.
    given = partons[partons.status == GIVEN_TO_MEDIUM]
    taken = partons[partons.status == TAKEN_FROM_MEDIUM]
    balance = ak.sum(final.energy, axis=1) + ak.sum(given.energy, axis=1) - ak.sum(taken.energy, axis=1)
    offset = ak.max(abs(balance / ak.sum(hard.energy, axis=1) - 1.0))
    print(f"largest relative difference of final and hard energy {offset:.1e}")
    if attributes["kinematics"] != "collinear" and lossless:
        assert offset < RELATIVE_TOLERANCE, "energy is not conserved"


if __name__ == "__main__":
    main()
