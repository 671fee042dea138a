"""Multiplicities of the three orderings: makes validation/studies/orderings.json and orderings.md.

    python validation/ordering_study.py --binary target/release/spindrift

A study, not a check: what the choice of `shower.ordering` does to the numbers that depend on it most. Where a table of
references/ holds the same mean (collinear: check by quadrature; the others: the second Monte Carlo), it stands beside.
"""

import argparse
import json
import math
import pathlib
import sys
import tempfile

import awkward as ak
import numpy as np

from checks.event_file import jagged
from checks.program import Program

HERE = pathlib.Path(__file__).resolve().parent
ORDERINGS = ("collinear", "virtuality", "angular")
FIXED = {"argument": "fixed", "alpha_s": 0.15}
RUNNING = {"argument": "transverse-momentum", "loops": 1, "alpha_s_mz": 0.118}
# (start, cutoff, coupling); collinear evolution with a coupling that runs in k_T makes events without bound at high scales.
SETUPS = ((10.0, 1.0, FIXED), (30.0, 1.0, FIXED), (100.0, 1.0, FIXED), (100.0, 2.0, FIXED), (10.0, 1.0, RUNNING), (100.0, 1.0, RUNNING))
EVENTS = {"collinear": 4_000, "virtuality": 40_000, "angular": 40_000}
HARDER_THAN = 0.02
GLUON = 21


def collinear_runs_away(start, coupling):
    """Too many partons for the program's limit of an event."""
    return coupling is RUNNING and start > 30.0


def config_of(parton, ordering, start, cutoff, coupling):
    """A single parton."""
    return {
        "events": EVENTS[ordering],
        "seed": 41,
        "source": {"kind": "single", "parton": parton, "energy_GeV": max(100.0, start), "start_virtuality_GeV": start},
        "coupling": coupling,
        "shower": {"ordering": ordering, "virtuality_cutoff_GeV": cutoff, "flavour_opening": "always"},
    }


def mean(values):
    """[mean, standard error]."""
    values = np.asarray(values, float)
    return [float(values.mean()), float(values.std(ddof=1) / math.sqrt(len(values)))]


def row_of(program, parton, ordering, start, cutoff, coupling):
    """Means of one sample."""
    partons, _ = jagged(program.generate("orderings", config_of(parton, ordering, start, cutoff, coupling), EVENTS[ordering]))
    final = partons[partons.status == 1]
    x = ak.values_astype(final.jet_fraction, "f8")
    return {
        "parton": "gluon" if parton == "g" else "quark",
        "ordering": ordering,
        "start_virtuality_GeV": start,
        "virtuality_cutoff_GeV": cutoff,
        "coupling": coupling["argument"],
        "events": EVENTS[ordering],
        "partons": mean(ak.num(x)),
        "partons_with_x_above_0.02": mean(ak.sum(x > HARDER_THAN, axis=1)),
        "quarks": mean(ak.sum(final.pdg != GLUON, axis=1)),
        "sum_of_squared_fractions": mean(ak.sum(x * x, axis=1)),
    }


def references():
    """Known mean multiplicities by (parton, ordering, start, cutoff, coupling)."""
    known = {}
    for case in json.loads((HERE / "references/virtuality_shower.json").read_text())["cases"]:
        if case["source"]["kind"] != "single" or "joint" not in case["daughters_start_at"] or case["flavour_opening"] != "always":
            continue
        ordering = "angular" if "angles" in case["daughters_start_at"] else "virtuality"
        key = (case["parton"], ordering, case["start_virtuality_GeV"], case["virtuality_cutoff_GeV"], case["coupling"]["argument"])
        known[key] = case["mean_multiplicity"]
    return known


def words(value):
    """Mean with its error in the last digits."""
    number, error = value
    digits = max(0, 1 - int(math.floor(math.log10(error)))) if error > 0.0 else 3
    return f"{number:.{digits}f}({round(error * 10**digits)})"


def markdown(rows, program_version):
    """The table, and the ratios that it is made for."""
    lines = [
        "# Multiplicities of the three orderings",
        "",
        f"Made by `validation/ordering_study.py` with spindrift {program_version}; errors of the last digits in brackets. One parton in vacuum, kinematic z",
        "range, five flavours always open; fixed: alpha_s = 0.15; running: one loop in k_T, frozen below 1 GeV. The last column is the same mean from",
        "`references/virtuality_shower.json`, a Monte Carlo that shares nothing with the program. `collinear` starts both daughters at t and",
        "has no joint constraint, so it makes many more partons; it is for leading-log comparisons (moments), not for jets.",
        "",
        "| parton | start, cutoff (GeV) | coupling | ordering | partons | with x > 0.02 | quarks | sum x^2 | reference |",
        "| --- | --- | --- | --- | --- | --- | --- | --- | --- |",
    ]
    for row in rows:
        columns = [words(row[name]) for name in ("partons", "partons_with_x_above_0.02", "quarks", "sum_of_squared_fractions")]
        kind = "fixed" if row["coupling"] == "fixed" else "running"
        reference = words(row["reference_partons"]) if "reference_partons" in row else ""
        scales = f"{row['start_virtuality_GeV']:g}, {row['virtuality_cutoff_GeV']:g}"
        lines.append(f"| {row['parton']} | {scales} | {kind} | {row['ordering']} | {' | '.join(columns)} | {reference} |")
    return "\n".join(lines) + "\n"


def main():
    """Run all, write both files, fail where a reference disagrees."""
    arguments = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    arguments.add_argument("--binary", default=HERE.parent / "target/release/spindrift", help="the program")
    chosen = arguments.parse_args()
    known, rows, pulls = references(), [], []
    with tempfile.TemporaryDirectory(prefix="spindrift-orderings-") as work:
        program = Program(chosen.binary, work, HERE.parent / "configs")
        version = program.run("--version")[0].split()[-1]
        for parton in ("u", "g"):
            for start, cutoff, coupling in SETUPS:
                for ordering in ORDERINGS:
                    if ordering == "collinear" and collinear_runs_away(start, coupling):
                        continue
                    row = row_of(program, parton, ordering, start, cutoff, coupling)
                    reference = known.get((row["parton"], ordering, start, cutoff, coupling["argument"]))
                    if reference:
                        row["reference_partons"] = reference
                        pulls.append((row["partons"][0] - reference[0]) / math.hypot(row["partons"][1], reference[1]))
                    rows.append(row)
                    print(row["parton"], ordering, start, cutoff, coupling["argument"], words(row["partons"]), flush=True)
    folder = HERE / "studies"
    folder.mkdir(exist_ok=True)
    content = {"made_by": "validation/ordering_study.py", "program_version": version, "numbers": "[mean an event, standard error]", "rows": rows}
    (folder / "orderings.json").write_text(json.dumps(content, indent=1) + "\n")
    (folder / "orderings.md").write_text(markdown(rows, version))
    print("pulls against the second Monte Carlo:", [f"{pull:.1f}" for pull in pulls])
    return 0 if max(map(abs, pulls)) < 4.9 else 1


if __name__ == "__main__":
    sys.exit(main())
