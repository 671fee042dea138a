"""More medium does more: longer paths, hotter fields, stronger transport make more branchings and softer spectra.

Each ladder climbs one of the three; neighbouring rungs share seed and events, so their difference is taken event by
event. Hypothesis refused: a rung does not do more than the one below. A step passes if its mean difference is positive
by more than LARGEST_PULL standard errors; were there no difference, it would pass with a probability of 5e-7.
"""

import math

import awkward as ak
import numpy as np

from checks.event_file import jagged
from checks.program import changed

EVENTS = 20_000
# One-sided normal quantile of 5e-7.
LARGEST_PULL = 4.8916
FINAL, BRANCHED, TAKEN = 1, 2, 4

LADDERS = {
    "longer path": ("medium__field__length_fm", (1.0, 2.0, 4.0, 8.0)),
    "hotter field": ("medium__field__temperature_GeV", (0.2, 0.27, 0.36, 0.48)),
    "stronger transport": ("medium__transport__coefficient", (1.0, 2.0, 4.0, 8.0)),
}
EFFECTS = {
    "collinear-expansion": [{"kind": "collinear-expansion"}],
    "singular-enhancement": [{"kind": "singular-enhancement", "law": "path", "slope_per_GeV2": 0.1}],
    "virtuality-diffusion": [{"kind": "virtuality-diffusion"}],
    "single-hard": [{"kind": "single-hard"}],
    "multiple-soft": [{"kind": "multiple-soft"}],
    "drag": [{"kind": "drag"}],
    "broadening": [{"kind": "broadening"}],
}
# Stronger transport where steps would be too small to see with so many events; the spectra of scattering in a brick are
# negative above half of omega_c, so that only a strong medium (omega_c of the order of E) makes more branchings at all.
COEFFICIENT_FACTORS = {"virtuality-diffusion": 6.0, "collinear-expansion": 4.0, "single-hard": 6.0, "multiple-soft": 6.0}
BASE = {
    "events": EVENTS,
    "seed": 21,
    "source": {"kind": "single", "parton": "u", "energy_GeV": 100.0, "start_virtuality_GeV": 20.0, "direction": [1.0, 0.0, 0.0]},
    "shower": {"virtuality_cutoff_GeV": 1.0},
    "medium": {
        "field": {"kind": "brick", "temperature_GeV": 0.36, "length_fm": 2.0},
        "transport": {"kind": "cubic", "coefficient": 4.0, "for": "gluon"},
    },
    "record": {"history": "full"},
}


def observables(path, effect):
    """What must grow, one value an event each."""
    partons, _ = jagged(path)
    final = partons[partons.status == FINAL]
    x = ak.values_astype(final.jet_fraction, "f8")
    if effect in ("drag", "broadening"):
        transverse = final.py * final.py + final.pz * final.pz
        exchanged = partons[(partons.status == TAKEN) | (partons.status == TAKEN + 1)]
        size = exchanged.energy if effect == "drag" else exchanged.py**2 + exchanged.pz**2
        name = {"drag": "energy lost", "broadening": "transverse momentum exchanged squared"}[effect]
        values = {name: ak.sum(size, axis=1)}
        return values | ({"transverse momentum squared": ak.sum(transverse, axis=1)} if effect == "broadening" else {})
    return {
        "branchings": ak.sum(partons.status == BRANCHED, axis=1),
        # sum x ln(1/x): 0 for one parton, larger for softer spectra.
        "softness": ak.sum(-x * np.log(x), axis=1),
    }


def climb(program, effect, ladder):
    """Rows (rung, name, mean, its error, mean step from the rung below, its error)."""
    key, rungs = LADDERS[ladder]
    rows, below = [], None
    for rung in rungs:
        config = changed(BASE, medium__effects=EFFECTS[effect], **{key: rung})
        config["medium"]["transport"]["coefficient"] *= COEFFICIENT_FACTORS.get(effect, 1.0)
        values = {name: np.asarray(v, float) for name, v in observables(program.generate("behaviour", config, EVENTS), effect).items()}
        for name, value in values.items():
            step = value - below[name] if below else np.zeros(0)
            error = step.std(ddof=1) / math.sqrt(len(step)) if below else math.nan
            rows.append((rung, name, value.mean(), value.std(ddof=1) / math.sqrt(len(value)), step.mean() if below else math.nan, error))
        below = values
    return rows


def check_ladder(program, effect, ladder):
    """Every step of one ladder goes up, significantly."""
    failed = falls(climb(program, effect, ladder))
    assert not failed, failed


def falls(rows):
    """The steps that do not significantly go up, in words."""
    steps = [row for row in rows if not math.isnan(row[4])]
    return "; ".join(f"{name} at {rung}: {step:.4g} +- {error:.2g}" for rung, name, _, _, step, error in steps if not step > LARGEST_PULL * error)


def check_flat_ladder_is_seen(program):
    """A step between two seeds of the same medium does not pass for one that goes up."""
    base = changed(BASE, medium__effects=EFFECTS["collinear-expansion"])
    one, other = (observables(program.generate("behaviour", changed(base, seed=seed), EVENTS), "collinear-expansion") for seed in (21, 22))
    for name in one:
        step = np.asarray(other[name], float) - np.asarray(one[name], float)
        row = (0.0, name, 0.0, 0.0, step.mean(), step.std(ddof=1) / math.sqrt(len(step)))
        assert falls([row]), f"two seeds of the same medium differ: {row}"


def behaviour_checks(program, built):
    """One check an effect and a ladder; only effects that the program knows."""
    for effect in EFFECTS:
        if effect in built:
            for ladder in LADDERS:
                yield f"{ladder}, {effect}", check_ladder, program, effect, ladder
    yield "a flat ladder fails", check_flat_ladder_is_seen, program
