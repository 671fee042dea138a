"""Write lumpy-fireball.h5: an invented temperature field of a lumpy, expanding fireball.

Nothing here solves hydrodynamics or describes a real collision. The field has the shape that such calculations give,
so that spindrift has something to be tried on: hot spots, a falling temperature, a flow that grows outwards.

    python make_lumpy_fireball.py [OUT]

The picture behind the numbers:

* the entropy density is a sum of Gaussian lumps, s ~ T^3; one central lump, one broad elliptic background and
  LUMPS random hot spots drawn from a fixed seed;
* longitudinal expansion dilutes s like 1/tau, hence T ~ tau^(-1/3) (Bjorken 1983, Phys. Rev. D 27:140);
* every lump broadens, drifts outwards, and keeps its entropy per unit rapidity while doing so;
* the flow points along -grad T and grows with tau - tau0; its speed saturates below MAX_SPEED.
"""

import pathlib
import sys

import numpy as np
import xarray as xr

SEED = 20
LUMPS = 14

START_FM = 0.6
END_FM = 10.2
EDGE_FM = 10.0
STEP_FM = 0.25

PEAK_TEMPERATURE_GEV = 0.43
COLLISIONS = 900.0

BACKGROUND_WIDTH_X_FM, BACKGROUND_WIDTH_Y_FM = 2.9, 3.5
CENTRAL_WIDTH_FM = 1.0
CENTRAL_SHIFT_FM = (0.25, -0.25)
BROADENING_SPEED = 0.30
DRIFT_PER_FM = 0.045
MAX_SPEED = 0.75
PUSH = 0.55

# Values are rounded to this many mantissa bits: finer detail would be noise that does not compress.
MANTISSA_BITS = 12


def proper_times_fm():
    """Fine steps while the field changes fast, coarser ones later: the grid need not be even."""
    early = np.arange(START_FM, 2.0 - 1e-9, 0.2)
    middle = np.arange(2.0, 5.0 - 1e-9, 0.3)
    late = np.arange(5.0, END_FM + 1e-9, 0.4)
    return np.round(np.concatenate([early, middle, late]), 6)


def lumps():
    """Rows of (entropy, x_fm, y_fm, width_x_fm, width_y_fm) at the start."""
    random = np.random.default_rng(SEED)
    rows = [
        (60.0, 0.0, 0.0, BACKGROUND_WIDTH_X_FM, BACKGROUND_WIDTH_Y_FM),
        (7.0, *CENTRAL_SHIFT_FM, CENTRAL_WIDTH_FM, CENTRAL_WIDTH_FM),
    ]
    for _ in range(LUMPS):
        x_fm = random.normal(0.0, 0.8 * BACKGROUND_WIDTH_X_FM)
        y_fm = random.normal(0.0, 0.8 * BACKGROUND_WIDTH_Y_FM)
        width_fm = random.uniform(0.6, 0.95)
        entropy = random.uniform(1.0, 2.6)
        rows.append((entropy, x_fm, y_fm, width_fm, width_fm))
    return rows


def lump_sum(rows, elapsed_fm, x_fm, y_fm):
    """Transverse density of the lumps after some time, per fm^2, and its gradient, per fm^3."""
    stretch = 1.0 + DRIFT_PER_FM * elapsed_fm
    density, slope_x, slope_y = 0.0, 0.0, 0.0
    for amount, centre_x, centre_y, width_x, width_y in rows:
        wx2 = width_x**2 + (BROADENING_SPEED * elapsed_fm) ** 2
        wy2 = width_y**2 + (BROADENING_SPEED * elapsed_fm) ** 2
        dx, dy = x_fm - stretch * centre_x, y_fm - stretch * centre_y
        bump = amount * np.exp(-0.5 * (dx**2 / wx2 + dy**2 / wy2)) / (2.0 * np.pi * np.sqrt(wx2 * wy2))
        density = density + bump
        slope_x = slope_x - bump * dx / wx2
        slope_y = slope_y - bump * dy / wy2
    return density, slope_x, slope_y


def fields(tau_fm, x_fm, y_fm):
    """Temperature in GeV and four-velocity components u^x, u^y over (tau, x, y)."""
    grid_x, grid_y = np.meshgrid(x_fm, y_fm, indexing="ij")
    rows = lumps()
    start_peak = lump_sum(rows, 0.0, grid_x, grid_y)[0].max()
    temperature, ux, uy = [], [], []
    for tau in tau_fm:
        elapsed = tau - START_FM
        density, slope_x, slope_y = lump_sum(rows, elapsed, grid_x, grid_y)
        temperature.append(PEAK_TEMPERATURE_GEV * (density / start_peak * START_FM / tau) ** (1.0 / 3.0))
        # -grad ln T, since T ~ density^(1/3).
        push_x, push_y = -slope_x / (3.0 * density), -slope_y / (3.0 * density)
        push = np.hypot(push_x, push_y)
        speed = MAX_SPEED * np.tanh(PUSH * elapsed * push / MAX_SPEED)
        gamma = 1.0 / np.sqrt(1.0 - speed**2)
        along = np.divide(gamma * speed, push, out=np.zeros_like(push), where=push > 0.0)
        ux.append(along * push_x)
        uy.append(along * push_y)
    return np.array(temperature), np.array(ux), np.array(uy)


def collision_density(x_fm, y_fm):
    """Where hard collisions happen, per fm^2: the square of the starting density, scaled to COLLISIONS in all."""
    grid_x, grid_y = np.meshgrid(x_fm, y_fm, indexing="ij")
    squared = lump_sum(lumps(), 0.0, grid_x, grid_y)[0] ** 2
    return squared * COLLISIONS / (squared.sum() * STEP_FM**2)


def rounded(values):
    """Float32 with MANTISSA_BITS of mantissa."""
    mantissa, exponent = np.frexp(values)
    scale = float(1 << MANTISSA_BITS)
    return np.ldexp(np.round(mantissa * scale) / scale, exponent).astype(np.float32)


def dataset():
    """The whole field with units and provenance."""
    tau_fm = proper_times_fm()
    side = np.arange(-EDGE_FM, EDGE_FM + 1e-9, STEP_FM)
    temperature, ux, uy = fields(tau_fm, side, side)
    grid = ("tau", "x", "y")
    return xr.Dataset(
        {
            "temperature": (grid, rounded(temperature), {"units": "GeV", "long_name": "temperature in the local rest frame"}),
            "ux": (grid, rounded(ux), {"units": "1", "long_name": "u^x of the four-velocity"}),
            "uy": (grid, rounded(uy), {"units": "1", "long_name": "u^y of the four-velocity"}),
            "collision_density": (
                ("x", "y"),
                rounded(collision_density(side, side)),
                {"units": "fm^-2", "long_name": "density of hard collisions"},
            ),
        },
        coords={
            "tau": ("tau", tau_fm, {"units": "fm", "long_name": "proper time sqrt(t^2 - z^2), c = 1"}),
            "x": ("x", side, {"units": "fm"}),
            "y": ("y", side, {"units": "fm"}),
        },
        attrs={
            "title": "Lumpy fireball, an invented field for trying spindrift",
            "comment": "Invented: no hydrodynamic calculation and no measured collision stands behind these numbers.",
            "source": "demo-data/make_lumpy_fireball.py",
            "seed": SEED,
        },
    )


def main():
    """Write the file and say what it holds."""
    here = pathlib.Path(__file__).resolve().parent
    out = pathlib.Path(sys.argv[1]) if len(sys.argv) > 1 else here / "lumpy-fireball.h5"
    field = dataset()
    packing = {"zlib": True, "complevel": 9, "shuffle": True}
    field.to_netcdf(out, engine="h5netcdf", encoding={name: packing for name in field.data_vars})
    start = field["temperature"].isel(tau=0)
    hottest = start.isel(start.argmax(("x", "y")))
    speed = np.sqrt(1.0 - 1.0 / (1.0 + field["ux"] ** 2 + field["uy"] ** 2))
    print(f"{out}: {out.stat().st_size} bytes, shape {dict(field.sizes)}")
    print(f"hottest {float(hottest):.4f} GeV at ({float(hottest.x):.2f}, {float(hottest.y):.2f}) fm")
    print(f"at the origin, end: {float(field.temperature.sel(x=0, y=0).isel(tau=-1)):.4f} GeV; fastest {float(speed.max()):.3f} c")


if __name__ == "__main__":
    main()
