"""Checks spindrift's files and refusals from Python: h5py, awkward, xarray, netCDF4, jsonschema.

    python validation/check_files.py --binary target/release/spindrift [EVENT_FILE ...]

Event files given by name are checked like those made here. Exit code 0 if all checks pass, else 1.
"""

import argparse
import pathlib
import sys
import tempfile

import numpy as np

import reading_example
from checks import configs, event_file, fields, history, twins
from checks.program import Program, changed
from checks.tally import Tally

HERE = pathlib.Path(__file__).resolve().parent
SAMPLE_EVENTS = 1500
# audit's complaint, or a refusal to read on.
AUDIT_FAILED, REFUSED = 1, 2


def check_one_file(tally, label, path, work):
    """All checks that any complete event file must pass."""
    tally.run(f"{label}: attributes", event_file.check_attributes, path)
    tally.run(f"{label}: datasets, units, descriptions, scales, checksums", event_file.check_layout, path)
    tally.run(f"{label}: extents and counts", event_file.check_extents, path)
    tally.run(f"{label}: opens with xarray", event_file.check_xarray, path)
    tally.run(f"{label}: energy is conserved, read with awkward", check_energy, path)


def check_energy(path):
    """Final energy equals the hard partons' (with what the medium took and gave), event by event."""
    partons, attributes = event_file.jagged(path)
    if attributes["kinematics"] == "collinear":
        return
    sums = {status: np.asarray(reading_example.ak.sum(partons[partons.status == status].energy, axis=1)) for status in (1, 3, 4, 5)}
    offset = np.max(np.abs((sums[1] + sums[4] - sums[5]) / sums[3] - 1.0))
    assert offset < reading_example.RELATIVE_TOLERANCE, f"energy off by {offset:.1e}"


def samples(program):
    """Small samples of every config: (label, path, cutoff in GeV, whether the history is full)."""
    for path in sorted(program.configs.glob("*.json")):
        config = program.config(path.name)
        for kept in ("final", "full"):
            name = f"{path.stem}-{kept}"
            out = program.generate(name, changed(config, record__history=kept), SAMPLE_EVENTS)
            cutoff = config.get("shower", {}).get("virtuality_cutoff_GeV", 1.0)
            yield name, out, cutoff, kept == "full"


def check_samples(tally, program):
    """Every config, with both kinds of history."""
    for label, path, cutoff, full in samples(program):
        check_one_file(tally, label, path, program.work)
        tally.run(f"{label}: audit agrees", program.run, "audit", path)
        tally.run(f"{label}: show", program.run, "show", path, "--event", 0)
        if full:
            tally.run(f"{label}: four-momentum at every vertex", history.check_momentum_at_vertices, path)
            tally.run(f"{label}: invariant masses", history.check_masses, path)
            tally.run(f"{label}: ordering and ranges", history.check_ordering, path, cutoff)
            tally.run(f"{label}: flavour and colour at every vertex", history.check_flavour_and_colour, path)
            tally.run(f"{label}: parents first", history.check_parents_first, path)


def check_exits(tally, program):
    """Every config with a medium, exits recorded: the same events with further columns."""
    for path in sorted(program.configs.glob("*.json")):
        config = program.config(path.name)
        if not config.get("medium"):
            continue
        label = f"{path.stem}-exits"
        plain = program.generate(f"{path.stem}-plain", changed(config, record__medium_exit=False), SAMPLE_EVENTS)
        out = program.generate(label, changed(config, record__medium_exit=True), SAMPLE_EVENTS)
        check_one_file(tally, label, out, program.work)
        tally.run(f"{label}: audit agrees", program.run, "audit", out)
        tally.run(f"{label}: on the paths of final partons", event_file.check_exits, out)
        tally.run(f"{label}: nothing else changes", check_same_but_for_exits, plain, out)


def check_same_but_for_exits(plain, out):
    """The columns that both files have are the same."""
    one, other = event_file.flat_tables(plain), event_file.flat_tables(out)
    assert set(other) - set(one) == {f"partons/{name}" for name in event_file.EXITS}, set(other) ^ set(one)
    for name, column in one.items():
        assert np.array_equal(column, other[name]), f"{name} differs"


def check_damage(program):
    """A flipped byte in any column is noticed by HDF5 and by audit."""
    config = changed(program.config("first-look.json"), record__medium_exit=True)
    path = program.generate("to-damage", config, 200)
    event_file.check_checksum_is_real(path, program.work)
    # The last column tried is left broken.
    code, words = program.exit_code("audit", program.work / "broken.h5")
    assert code in (AUDIT_FAILED, REFUSED), f"audit exits {code} on a damaged file"
    assert "panicked" not in words, words


def main():
    """Run all checks."""
    words = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    words.add_argument("--binary", default=HERE.parent / "target/release/spindrift", help="the program")
    words.add_argument("--configs", default=HERE.parent / "configs", help="folder of configs")
    words.add_argument("files", nargs="*", type=pathlib.Path, help="event files to check as well")
    chosen = words.parse_args()
    tally = Tally()
    with tempfile.TemporaryDirectory(prefix="spindrift-checks-") as work:
        program = Program(chosen.binary, work, chosen.configs)
        for path in chosen.files:
            check_one_file(tally, path.name, path, program.work)
        check_samples(tally, program)
        check_exits(tally, program)
        tally.run("damage is noticed", check_damage, program)
        for module in (configs, twins, fields):
            for name in [name for name in vars(module) if name.startswith("check_")]:
                tally.run(name.removeprefix("check_").replace("_", " "), getattr(module, name), program)
    return tally.close()


if __name__ == "__main__":
    sys.exit(main())
