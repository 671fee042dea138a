"""Loss against azimuth in a non-central overlap: paths out of the plane are longer, so more is lost there.

The field is the overlap of two Woods-Saxon nuclei (impact parameter along x), thinning along the beam; origins come
from the program's `overlap`. The primary loses energy by drag before its first branching. Three statements:
- event by event the loss is the line integral of ehat through the field, computed here with the field's own formula;
- the mean of loss * cos 2 phi is negative at b = 8 fm, by more than LARGEST_PULL standard errors, and agrees with the
  line integrals; at b = 0 it is compatible with 0; turned by a right angle (with origins that turn) it is positive;
- the partons that induced branchings add to each event's vacuum twin follow the same signs.
"""

import math

import numpy as np
import xarray as xr

from checks.event_file import flat_tables

EVENTS = 20_000
# Two-sided 1e-6, and its one-sided reading.
LARGEST_PULL = 4.8916
RADIUS_FM, DIFFUSENESS_FM = 6.62, 0.546
START_FM, START_TEMPERATURE_GEV, END_TEMPERATURE_GEV = 0.6, 0.4, 0.15
IMPACT_FM = 8.0
COEFFICIENT = 4.0
HBAR_C_GEV_FM = 0.1973269804
C_F, C_A = 4.0 / 3.0, 3.0
HARD, TAKEN = 3, 4
# Cells of 0.2 fm and slices 5 % apart in tau: linear interpolation between them costs (0.05/3)^2/8 of T and less, the
# sum of 1200 points here as much; an event also stops losing up to a point's width early or late.
MEAN_TOLERANCE, EVENT_TOLERANCE_GEV = 0.002, 0.005
SIDE_FM, CELLS = 10.0, 101


def thickness():
    """int dz of a Woods-Saxon density over the distance from the axis, in any unit."""
    radii, z = np.linspace(0.0, 40.0, 4001), np.linspace(0.0, 15.0, 301)
    r = np.hypot(radii[:, None], z)
    return radii, np.trapezoid(1.0 / (1.0 + np.exp((r - RADIUS_FM) / DIFFUSENESS_FM)), z, axis=1)


THICKNESS = thickness()


def temperature(tau, x, y, impact):
    """T ~ (overlap)^(1/4), falling like tau^(-1/3)."""
    radii, profile = THICKNESS
    density = np.interp(np.hypot(x + impact / 2.0, y), radii, profile) * np.interp(np.hypot(x - impact / 2.0, y), radii, profile)
    centre = np.interp(impact / 2.0, radii, profile) ** 2
    return START_TEMPERATURE_GEV * (START_FM / tau) ** (1.0 / 3.0) * (density / centre) ** 0.25


def write_field(path, impact):
    """The field on a grid."""
    tau = np.geomspace(START_FM, 14.0, 60)
    side = np.linspace(-SIDE_FM, SIDE_FM, CELLS)
    x, y = np.meshgrid(side, side, indexing="ij")
    slices = temperature(START_FM, x, y, impact) * (START_FM / tau)[:, None, None] ** (1.0 / 3.0)
    field = xr.Dataset({"temperature": (("tau", "x", "y"), slices)}, {"tau": tau, "x": side, "y": side})
    field["temperature"].attrs["units"] = "GeV"
    for axis in ("tau", "x", "y"):
        field[axis].attrs["units"] = "fm"
    field.to_netcdf(path, engine="h5netcdf")


def config_of(path, effects, origin, rotation=0.0):
    """A quark at rapidity 0 in every azimuth; with drag it hardly branches, so that the primary's own loss is seen."""
    drag = effects == ["drag"]
    return {
        "events": EVENTS,
        "seed": 31,
        "source": {"kind": "single", "parton": "u", "energy_GeV": 100.0, "start_virtuality_GeV": 1.0001 if drag else 15.0},
        "shower": {"virtuality_cutoff_GeV": 1.0},
        "medium": {
            "field": {"kind": "grid", "file": str(path), "end_temperature_GeV": END_TEMPERATURE_GEV, "rotation_rad": rotation},
            "origin": origin,
            "transport": {"kind": "cubic", "coefficient": COEFFICIENT, "for": "gluon"},
            "effects": [{"kind": effect} for effect in effects],
        },
    }


class Sample:
    """Azimuth, origin, loss and number of partons of every event."""

    def __init__(self, tables):
        rows = {name: tables[f"partons/{name}"] for name in ("status", "px", "py", "energy")}
        count = tables["events/partons_count"]
        event = np.repeat(np.arange(len(count)), count)
        hard = rows["status"] == HARD
        self.phi = np.arctan2(rows["py"][hard], rows["px"][hard])
        self.origin = tables["events/origin"].astype("f8")
        given = np.where(rows["status"] == TAKEN, rows["energy"], 0.0) - np.where(rows["status"] == TAKEN + 1, rows["energy"], 0.0)
        self.loss = np.bincount(event, given, minlength=len(count))
        self.partons = np.bincount(event, rows["status"] == 1, minlength=len(count)).astype(float)

    def modulation(self, value):
        """Mean of value * cos 2 phi and its standard error."""
        term = value * np.cos(2.0 * self.phi)
        return term.mean(), term.std(ddof=1) / math.sqrt(len(term))


def line_integrals(sample, impact, chosen):
    """int ehat dl of a quark along each path, at rapidity 0 through a medium at rest in the transverse plane."""
    nodes = np.linspace(START_FM, 14.0, 1201)
    x = sample.origin[chosen, 1, None] + nodes * np.cos(sample.phi[chosen, None])
    y = sample.origin[chosen, 2, None] + nodes * np.sin(sample.phi[chosen, None])
    hot = temperature(nodes, x, y, impact)
    loss_rate = np.where(hot >= END_TEMPERATURE_GEV, C_F / C_A * COEFFICIENT * hot**2 / 4.0 / HBAR_C_GEV_FM, 0.0)
    return np.trapezoid(loss_rate, nodes, axis=1)


def sample_of(program, impact, effects, origin, rotation=0.0):
    """A sample in the overlap's own field."""
    path = program.work / f"overlap-{impact:g}.h5"
    if not path.exists():
        write_field(path, impact)
    return Sample(flat_tables(program.generate("azimuth", config_of(path, effects, origin, rotation), EVENTS)))


def overlap(impact):
    """The program's own origins."""
    return {"kind": "overlap", "nucleus": "Pb208", "impact_parameter_fm": impact}


def check_loss_is_the_line_integral(program):
    """Loss of single events, and its azimuthal mean, against line integrals."""
    sample = sample_of(program, IMPACT_FM, ["drag"], overlap(IMPACT_FM))
    chosen = np.arange(2000)
    expected = line_integrals(sample, IMPACT_FM, chosen)
    difference = sample.loss[chosen] - expected
    assert abs(difference.mean()) < MEAN_TOLERANCE * expected.mean(), (sample.loss[chosen].mean(), expected.mean())
    assert np.max(np.abs(difference)) < EVENT_TOLERANCE_GEV, f"{np.max(np.abs(difference))} GeV from the line integral"
    cosine = np.cos(2.0 * sample.phi[chosen])
    modulations = (sample.loss[chosen] * cosine).mean(), (expected * cosine).mean()
    assert abs(modulations[0] - modulations[1]) < MEAN_TOLERANCE * expected.mean(), modulations


def signal(program, impact, effect, origin, rotation=0.0):
    """Mean and error of cos 2 phi times what the medium did: energy lost, or partons added to the vacuum twin."""
    sample = sample_of(program, impact, [effect], origin, rotation)
    if effect == "drag":
        return sample.modulation(sample.loss)
    twin = sample_of(program, impact, [], origin, rotation)
    assert np.array_equal(twin.phi, sample.phi), "twins of different directions"
    return sample.modulation(sample.partons - twin.partons)


def check_signs(program, effect):
    """More out of the plane; nothing in a central overlap; the other way round when turned."""
    cases = {
        "overlap": (-1, IMPACT_FM, effect, overlap(IMPACT_FM)),
        "central": (0, 0.0, effect, overlap(0.0)),
        "turned": (1, IMPACT_FM, effect, {"kind": "field-weighted", "power": 4.0}, math.pi / 2.0),
    }
    for name, (sign, *setup) in cases.items():
        mean, error = signal(program, *setup)
        good = abs(mean) < LARGEST_PULL * error if sign == 0 else sign * mean > LARGEST_PULL * error
        assert good, f"{name}: {mean:.4g} +- {error:.2g}"


def azimuth_checks(program):
    """All checks of this file."""
    yield "loss against line integrals in an overlap", check_loss_is_the_line_integral, program
    for effect in ("drag", "collinear-expansion"):
        yield f"azimuthal dependence in an overlap, {effect}", check_signs, program, effect
