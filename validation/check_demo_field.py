"""The committed demo field is the one its script makes, and holds what its README says.

    python validation/check_demo_field.py
"""

import pathlib
import sys

import numpy as np
import xarray as xr

DEMO = pathlib.Path(__file__).resolve().parent.parent / "demo-data"
# Rounding in the last kept mantissa bit may differ between mathematics libraries.
RELATIVE_STEP = 2.0**-11
LARGEST_FILE_BYTES = 2_000_000


def main():
    """Compare, and assert the ranges."""
    sys.path.insert(0, str(DEMO))
    import make_lumpy_fireball

    path = DEMO / "lumpy-fireball.h5"
    made = make_lumpy_fireball.dataset()
    with xr.open_dataset(path, engine="h5netcdf") as stored:
        stored.load()
    assert path.stat().st_size < LARGEST_FILE_BYTES
    assert set(made.variables) == set(stored.variables)
    for name in made.variables:
        assert made[name].dims == stored[name].dims and made[name].attrs == stored[name].attrs, name
        difference = np.abs(made[name].values - stored[name].values)
        assert np.all(difference <= RELATIVE_STEP * np.abs(stored[name].values)), f"{name} differs by {difference.max()}"
    temperature = stored["temperature"]
    assert 0.40 <= temperature.max() <= 0.45 and temperature.min() > 0.0
    start = temperature.isel(tau=0)
    hottest = start.isel(start.argmax(("x", "y")))
    assert np.hypot(hottest["x"], hottest["y"]) < 1.5, "the hottest place is far from the origin"
    speed2 = 1.0 - 1.0 / (1.0 + stored["ux"] ** 2 + stored["uy"] ** 2)
    assert float(np.sqrt(speed2.max())) < 0.8
    print("1 passed, 0 failed")


if __name__ == "__main__":
    main()
