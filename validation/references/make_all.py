"""Make every table again, or compare the quick ones with what is committed.

    python validation/references/make_all.py            all tables, a few minutes
    python validation/references/make_all.py --check    recompute the quick ones, compare, change nothing
"""

import argparse
import importlib
import json
import time

import numpy as np

import quadrature

QUICK = ("coupling", "collinear_moments", "timelike_evolution", "first_branching", "thermal_transport", "thermal")
# Of these some cases are recomputed; each names them and offers cases(chosen).
PARTLY = ("rate_effects", "radial_paths", "path_effects", "expanding_scaling", "energy_loss")
SLOW = ("no_branching", "longitudinal", "medium", "virtuality_shower", "overlap", "multiple_soft_spectrum", "single_hard_spectrum")
# Numbers are stored to 12 digits, long columns to 8.
RELATIVE_TOLERANCE, ABSOLUTE_TOLERANCE = 1e-7, 1e-9
# Twice what linear interpolation costs in a stored curve.
CURVE_TOLERANCE = 2e-5


def same(one, other):
    """Whether two tables hold the same numbers and words; what is said about precision may differ."""
    if isinstance(one, dict) and isinstance(other, dict):
        grid = next((name for name in ("ln_t", "logit_z") if name in one and name in other), None)
        if grid is not None:
            return same_curve(one, other, grid)
        return one.keys() == other.keys() and all(same(one[k], other[k]) for k in one if k != "precision")
    if isinstance(one, list) and isinstance(other, list):
        return len(one) == len(other) and all(same(a, b) for a, b in zip(one, other))
    if isinstance(one, float) or isinstance(other, float):
        return abs(one - other) <= ABSOLUTE_TOLERANCE + RELATIVE_TOLERANCE * abs(other)
    return one == other


def same_curve(one, other, grid):
    """Whether two tabulated distributions agree between their points too: the points kept may differ by a rounding."""
    column = "cdf" if "cdf" in one else "cumulative"
    points = np.union1d(one[grid], other[grid])
    curves = [np.interp(points, table[grid], table[column]) for table in (one, other)]
    return bool(np.max(np.abs(curves[0] - curves[1])) < CURVE_TOLERANCE)


def check(name):
    """Recompute one table without writing it; assert that it is the committed one."""
    kept = []
    module = importlib.import_module(name)
    module.write_reference = lambda _, *head, **content: kept.append((head, content))
    module.main()
    (_, content), = kept
    committed = json.loads((quadrature.HERE / f"{name}.json").read_text())
    fresh = json.loads(json.dumps(quadrature.short(content)))
    for key, value in fresh.items():
        assert same(value, committed[key]), f"{name}.json: {key} differs from what its script computes"


def check_part(name):
    """Recompute the cases that a table's script names; assert that they are the committed ones."""
    module = importlib.import_module(name)
    committed = json.loads((quadrature.HERE / f"{name}.json").read_text())["cases"]
    fresh = json.loads(json.dumps(quadrature.short(module.cases(module.CHECKED_CASES))))
    for number, entry in zip(module.CHECKED_CASES, fresh, strict=True):
        assert same(entry, committed[number]), f"{name}.json: case {number} differs from what its script computes"


def main():
    """Make or check."""
    words = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    words.add_argument("--check", action="store_true", help="compare the quick tables, change nothing")
    chosen = words.parse_args()
    failed = 0
    for name in QUICK + PARTLY if chosen.check else QUICK + PARTLY + SLOW:
        start = time.perf_counter()
        if not chosen.check:
            importlib.import_module(name).main()
            continue
        try:
            (check_part if name in PARTLY else check)(name)
            print(f"ok      {name} ({time.perf_counter() - start:.1f} s)")
        except AssertionError as error:
            failed += 1
            print(f"FAILED  {name}: {error}")
    if chosen.check:
        print(f"{len(QUICK + PARTLY) - failed} passed, {failed} failed")
    return 1 if failed else 0


if __name__ == "__main__":
    raise SystemExit(main())
