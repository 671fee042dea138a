"""Virtuality diffusion against quadrature: the share of events with exactly two final partons.

Two partons are left if the primary branches and neither daughter does. That share is exact in spite of the joint
constraint (references/path_effects.py says why), and falls as the daughters start higher.
"""

import awkward as ak

from checks.event_file import jagged
from checks.physics import EVENTS, LARGEST_PULL, binomial_pull, config_of, label, table

# C_A/C_F: the table's qhat is the branching parton's own.
GLUON_OVER_QUARK = 9.0 / 4.0


def two_partons(program, case, qhat):
    """Number of events with two final partons."""
    config = config_of(case)
    config["source"]["energy_GeV"] = case["energy_GeV"]
    config["record"]["history"] = "final"
    config["medium"] = {
        "field": {"kind": "brick", "temperature_GeV": case["temperature_GeV"], "length_fm": case["length_fm"]},
        "transport": {"kind": "constant", "qhat_GeV2_per_fm": qhat * (GLUON_OVER_QUARK if case["parton"] == "quark" else 1.0), "for": "gluon"},
        "effects": [{"kind": "virtuality-diffusion"}],
    }
    partons, _ = jagged(program.generate("diffusion", config, EVENTS))
    return int(ak.sum(ak.sum(partons.status == 1, axis=1) == 2))


def check_share(program, case, row):
    """One qhat of one case."""
    share = sum(row["shares"].values())
    pull = binomial_pull(two_partons(program, case, row["diffusing_qhat_GeV2_per_fm"]), EVENTS, share)
    assert abs(pull) < LARGEST_PULL, f"{pull:.1f} standard deviations from {share:.5f}"


def check_missing_colour_factor_is_seen(program):
    """A quark that diffuses with the gluon's qhat is seen."""
    case = table("path_effects")["cases"][0]
    row = case["both_daughters_unbranched"][1]
    hits = two_partons(program, case, row["diffusing_qhat_GeV2_per_fm"] * GLUON_OVER_QUARK)
    assert abs(binomial_pull(hits, EVENTS, sum(row["shares"].values()))) > LARGEST_PULL, "the colour factor went unnoticed"


def diffusion_checks(program):
    """One check a case and a qhat above 0, and one that fails."""
    for case in table("path_effects")["cases"]:
        for row in case["both_daughters_unbranched"]:
            if row["diffusing_qhat_GeV2_per_fm"] > 0.0:
                yield f"virtuality diffusion, {label(case)} qhat {row['diffusing_qhat_GeV2_per_fm']:g}", check_share, program, case, row
    yield "a missing colour factor is seen", check_missing_colour_factor_is_seen, program
