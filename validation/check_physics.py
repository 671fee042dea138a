"""Samples of spindrift, read back from its event files, against the tables of references/.

    python validation/check_physics.py --binary target/release/spindrift [--only WORD]
"""

import argparse
import pathlib
import sys
import tempfile

from checks import diffusion, physics
from checks.program import Program
from checks.tally import Tally

HERE = pathlib.Path(__file__).resolve().parent


def main():
    """Run all checks whose name holds the word."""
    words = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    words.add_argument("--binary", default=HERE.parent / "target/release/spindrift", help="the program")
    words.add_argument("--only", default="", help="run only checks whose name holds this word")
    chosen = words.parse_args()
    tally = Tally()
    with tempfile.TemporaryDirectory(prefix="spindrift-physics-") as work:
        program = Program(chosen.binary, work, HERE.parent / "configs")
        checks = [
            *physics.first_branching_checks(program),
            *physics.multiplicity_checks(program),
            *physics.collinear_checks(program),
            *diffusion.diffusion_checks(program),
            ("a biased sampler is seen", physics.check_bias_is_seen, program),
        ]
        for name, check, *arguments in checks:
            if chosen.only in name:
                tally.run(name, check, *arguments)
    return tally.close()


if __name__ == "__main__":
    sys.exit(main())
