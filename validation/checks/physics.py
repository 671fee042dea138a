"""Samples read back from event files, held against the tables of references/.

Every comparison states its significance: a true sampler fails one comparison with probability SIGNIFICANCE. With EVENTS
events the Kolmogorov-Smirnov distance that fails is sqrt(ln(2/SIGNIFICANCE)/(2 n)), 0.013 where all events branch: a
shift of 1.3 % of the events across some t or z is seen. Means are seen to about 5 standard errors.
"""

import json
import math
import pathlib

import awkward as ak
import h5py
import numpy as np

from checks.event_file import jagged
from checks.program import changed

REFERENCES = pathlib.Path(__file__).resolve().parent.parent / "references"
EVENTS = 40_000
SIGNIFICANCE = 1e-6
# Two-sided normal quantile of SIGNIFICANCE (scipy.stats.norm.isf(SIGNIFICANCE/2)).
LARGEST_PULL = 4.8916
FINAL, BRANCHED, HARD = 1, 2, 3
GLUON = 21


def table(name):
    """The cases of a reference table."""
    return json.loads((REFERENCES / f"{name}.json").read_text())


def config_of(case):
    """The config of a case of first_branching, medium or virtuality_shower."""
    source = {
        "kind": "single",
        "parton": "u" if case["parton"] == "quark" else "g",
        "energy_GeV": max(100.0, case["start_virtuality_GeV"]),
        "start_virtuality_GeV": case["start_virtuality_GeV"],
        "direction": [1.0, 0.0, 0.0],
    }
    shower = {
        "virtuality_cutoff_GeV": case["virtuality_cutoff_GeV"],
        "z_range": case.get("z_range", {"kind": "kinematic"}),
        "flavours": case.get("flavours", 5),
        "flavour_opening": case.get("flavour_opening", "pair-threshold"),
    }
    config = {"events": EVENTS, "seed": 11, "source": source, "coupling": case["coupling"], "shower": shower, "record": {"history": "full"}}
    if "medium" in case:
        medium = case["medium"]
        source["energy_GeV"] = medium["energy_GeV"]
        config["medium"] = {
            "field": {"kind": "brick", "temperature_GeV": 0.3, "length_fm": medium["length_fm"]},
            "transport": {"kind": "constant", "qhat_GeV2_per_fm": medium["gluon_qhat_GeV2_per_fm"], "for": "gluon"},
            "effects": [medium["effect"]],
            "limit_to_small_angles": medium["limit_to_small_angles"],
        }
    return config


class FirstBranchings:
    """What the primaries of a single source did, one entry an event."""

    def __init__(self, path):
        with h5py.File(path) as file:
            rows = {name: file["partons"][name][()] for name in ("status", "parent", "pdg", "virtuality_squared", "splitting_fraction")}
            start = file["events/partons_start"][()]
            count = file["events/partons_count"][()]
            self.weight = file["events/weight"][()]
        assert np.all(rows["status"][start] == HARD), "the hard parton does not stand first"
        # The primary is the only child of the hard parton, the daughters are the primary's children.
        event = np.repeat(np.arange(len(start)), count)
        parent = rows["parent"] + start[event]
        primary = np.flatnonzero((rows["parent"] >= 0) & (parent == start[event]))
        assert len(primary) == len(start), "not one primary an event"
        self.branched = rows["status"][primary] == BRANCHED
        self.t = rows["virtuality_squared"][primary].astype("f8")
        daughters = np.flatnonzero((rows["parent"] >= 0) & (parent == primary[event]))
        first = daughters[0::2]
        assert len(daughters) == 2 * self.branched.sum()
        fraction, pdg = rows["splitting_fraction"].astype("f8"), rows["pdg"]
        z = np.where(pdg[first] < 0, fraction[daughters[1::2]], fraction[first])
        self.z, self.first_is_gluon = np.full(len(start), np.nan), np.zeros(len(start), bool)
        self.z[self.branched], self.first_is_gluon[self.branched] = z, pdg[first] == GLUON
        self.from_gluon = pdg[primary] == GLUON

    def channel(self, name):
        """Which events branched first in this channel."""
        if name == "q-qg":
            return self.branched & ~self.from_gluon
        return self.branched & self.from_gluon & (self.first_is_gluon == (name == "g-gg"))


def distance(sample, grid, cdf):
    """Kolmogorov-Smirnov distance of a sample to a tabulated distribution, and the distance that fails."""
    expected = np.interp(np.sort(sample), grid, cdf)
    n = len(sample)
    above = np.max(np.arange(1, n + 1) / n - expected)
    below = np.max(expected - np.arange(n) / n)
    return max(above, below), math.sqrt(math.log(2.0 / SIGNIFICANCE) / (2.0 * n))


def binomial_pull(hits, trials, probability):
    """Deviation in standard deviations."""
    return (hits - trials * probability) / math.sqrt(trials * probability * (1.0 - probability))


def label(case):
    """A short name of a case."""
    medium = case.get("medium")
    words = [case["parton"], f"{case['start_virtuality_GeV']:g}-{case['virtuality_cutoff_GeV']:g}", case["coupling"]["argument"]]
    if medium:
        words += [medium["effect"]["phase"], f"{medium['length_fm']:g} fm", "limited" if medium["limit_to_small_angles"] else "free"]
    return " ".join(words)


def normalised(case):
    """(ln t, cdf), {channel: (share of branchings, logit z, cdf)} of a vacuum or a positive medium case."""
    t = case["t"]
    if "cdf" in t:
        return (t["ln_t"], t["cdf"]), {name: (z["share"], z["logit_z"], z["cdf"]) for name, z in case["z"].items()}
    branched = t["cumulative"][-1]
    channels = {name: (z["total"] / branched, z["logit_z"], np.array(z["cumulative"]) / z["total"]) for name, z in case["z"].items()}
    return (t["ln_t"], np.array(t["cumulative"]) / branched), channels


def compare_first_branchings(first, case):
    """All deviations of a sample from a case: (what, size, the size that fails)."""
    no_branching = case["no_branching_probability"]
    yield "no branching", abs(binomial_pull(np.sum(~first.branched), len(first.t), no_branching)), LARGEST_PULL
    (ln_t, t_cdf), channels = normalised(case)
    yield "t", *distance(np.log(first.t[first.branched]), ln_t, t_cdf)
    for name, (share, logit, cdf) in channels.items():
        inside = first.channel(name)
        z = first.z[inside]
        if share < 1.0 - 1e-6:
            yield f"share of {name}", abs(binomial_pull(inside.sum(), first.branched.sum(), share)), LARGEST_PULL
        yield f"z of {name}", *distance(np.log(z / (1.0 - z)), logit, cdf)


def compare_weighted(first, case):
    """The same for weighted samples: cumulative weights at points of t and z, in standard errors."""
    n = len(first.t)

    def pull(value, expected):
        return abs(value.mean() - expected) / (value.std(ddof=1) / math.sqrt(n))

    yield "mean weight", pull(first.weight, 1.0), LARGEST_PULL
    yield "no branching", pull(first.weight * ~first.branched, case["no_branching_probability"]), LARGEST_PULL
    for part in (0.2, 0.4, 0.6, 0.8):
        ln_t, cumulative = np.array(case["t"]["ln_t"]), case["t"]["cumulative"]
        cut = ln_t[0] + part * (ln_t[-1] - ln_t[0])
        below = first.branched & (np.log(np.maximum(first.t, 1e-30)) < cut)
        yield f"t below {math.exp(cut):.3g}", pull(first.weight * below, np.interp(cut, ln_t, cumulative)), LARGEST_PULL
        for name, z in case["z"].items():
            cut = z["logit_z"][0] + part * (z["logit_z"][-1] - z["logit_z"][0])
            fraction = np.where(first.branched, first.z, 0.5)
            below = first.channel(name) & (np.log(fraction / (1.0 - fraction)) < cut)
            yield f"{name} logit z below {cut:.3g}", pull(first.weight * below, np.interp(cut, z["logit_z"], z["cumulative"])), LARGEST_PULL


def assert_small(deviations):
    """None fails."""
    failed = [f"{what}: {size:.4g} (fails from {limit:.4g})" for what, size, limit in deviations if not size < limit]
    assert not failed, "; ".join(failed)


def first_branching_checks(program):
    """One check a case of the vacuum and medium tables."""
    for case in table("first_branching")["cases"] + table("medium")["cases"]:
        yield f"first branching, {label(case)}", check_first_branching, program, case


def check_first_branching(program, case):
    """Generate, read back, compare."""
    first = FirstBranchings(program.generate("physics", config_of(case), EVENTS))
    if case.get("density_changes_sign"):
        assert_small(compare_weighted(first, case))
        return
    assert np.all(first.weight == 1.0), "weights of a positive density"
    assert_small(compare_first_branchings(first, case))


def check_bias_is_seen(program):
    """The comparison fails for a coupling 6 % too large, and for a transport coefficient 10 % too large."""
    vacuum, medium = table("first_branching")["cases"][0], table("medium")["cases"][0]
    assert vacuum["coupling"]["alpha_s"] == 0.15 and medium["medium"]["gluon_qhat_GeV2_per_fm"] == 1.0
    biased = {
        "coupling": (vacuum, changed(config_of(vacuum), coupling__alpha_s=0.159)),
        "transport coefficient": (medium, changed(config_of(medium), medium__transport__qhat_GeV2_per_fm=1.1)),
    }
    for name, (case, config) in biased.items():
        first = FirstBranchings(program.generate("physics-biased", config, EVENTS))
        failed = [what for what, size, limit in compare_first_branchings(first, case) if not size < limit]
        assert failed, f"a biased {name} went unnoticed"


def multiplicity_checks(program):
    """One check a case of the second Monte Carlo."""
    for case in table("virtuality_shower")["cases"]:
        # A pair's start virtuality may not exceed the energy of either parton; the table goes beyond.
        allowed = case["source"].get("sqrt_s_GeV", math.inf) / 2.0
        if "joint" in case["daughters_start_at"] and case["start_virtuality_GeV"] <= allowed:
            ordering = "angular" if "angles" in case["daughters_start_at"] else "virtuality"
            yield f"multiplicity, {case['source']['kind']} {label(case)} {ordering}", check_multiplicity, program, case


def check_multiplicity(program, case):
    """Mean number of partons and quarks, and fraction moments, against the second Monte Carlo."""
    config = config_of(case)
    config["record"]["history"] = "final"
    if case["source"]["kind"] == "pair":
        partons = ["u", "ubar"] if case["parton"] == "quark" else ["g", "g"]
        sqrt_s, start = case["source"]["sqrt_s_GeV"], case["start_virtuality_GeV"]
        config["source"] = {"kind": "pair", "partons": partons, "sqrt_s_GeV": sqrt_s, "start_virtuality_GeV": start}
    if "angles" in case["daughters_start_at"]:
        config["shower"]["ordering"] = "angular"
    partons, _ = jagged(program.generate("physics-multiplicity", config, EVENTS))
    final = partons[partons.status == FINAL]
    x = final.jet_fraction
    values = {
        "mean_multiplicity": ak.num(final),
        "mean_quark_multiplicity": ak.sum(final.pdg != GLUON, axis=1),
        "mean_sum_of_squared_fractions": ak.sum(x * x, axis=1),
        "mean_sum_of_cubed_fractions": ak.sum(x * x * x, axis=1),
    }
    assert_small((name, abs(pull_of_means(np.asarray(value), case[name])), LARGEST_PULL) for name, value in values.items())


def pull_of_means(value, known):
    """Difference of two means over its standard error."""
    mean, error = known
    return (value.mean() - mean) / math.hypot(error, value.std(ddof=1) / math.sqrt(len(value)))


def collinear_checks(program):
    """One check a cut and a parton."""
    whole = table("collinear_moments")
    for case in whole["cases"]:
        for parton in ("quark", "gluon"):
            yield f"collinear moments, {parton} cut {case['epsilon']:g}", check_collinear, program, whole["setup"], case, parton


def check_collinear(program, setup, case, parton):
    """Moments of quarks, gluons and valence against the matrix exponential."""
    words = {**setup, "parton": parton, "z_range": {"kind": "constant", "epsilon": case["epsilon"]}}
    config = config_of(words)
    config["shower"]["ordering"] = "collinear"
    config["record"]["history"] = "final"
    # Small cuts make many partons; fewer events do.
    events = EVENTS if case["epsilon"] >= 0.01 else EVENTS // 4
    partons, attributes = jagged(program.generate("physics-collinear", config, events))
    assert attributes["kinematics"] == "collinear"
    final = partons[partons.status == FINAL]
    x, pdg = ak.values_astype(final.jet_fraction, "f8"), final.pdg
    deviations = []
    for row in case["moments"]:
        power = x ** (row["N"] - 1)
        sums = {"Sigma": pdg != GLUON, "g": pdg == GLUON, "valence": ak.values_astype(pdg == 2, "f8") - ak.values_astype(pdg == -2, "f8")}
        for name, selected in sums.items():
            if row["N"] == 1 and name == "valence":
                continue
            value = np.asarray(ak.sum(power * selected, axis=1))
            deviations.append((f"N={row['N']} {name}", abs(pull_of_means(value, (row[parton][name], 0.0))), LARGEST_PULL))
    assert_small(deviations)
