"""How the program behaves where no formula says by how much: more medium does more, and more where the path is longer.

    python validation/check_behaviour.py --binary target/release/spindrift [--only WORD]
"""

import argparse
import json
import pathlib
import sys
import tempfile

from checks import azimuth, behaviour
from checks.program import Program
from checks.tally import Tally

HERE = pathlib.Path(__file__).resolve().parent


def effects_of(program):
    """Names of the effects that the program knows."""
    text, _ = program.run("schema")
    return json.loads(text)["properties"]["medium"]["properties"]["effects"]["items"]["properties"]["kind"]["enum"]


def main():
    """Run all checks whose name holds the word."""
    words = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    words.add_argument("--binary", default=HERE.parent / "target/release/spindrift", help="the program")
    words.add_argument("--only", default="", help="run only checks whose name holds this word")
    chosen = words.parse_args()
    tally = Tally()
    with tempfile.TemporaryDirectory(prefix="spindrift-behaviour-") as work:
        program = Program(chosen.binary, work, HERE.parent / "configs")
        for name, check, *arguments in [*behaviour.behaviour_checks(program, effects_of(program)), *azimuth.azimuth_checks(program)]:
            if chosen.only in name:
                tally.run(name, check, *arguments)
    return tally.close()


if __name__ == "__main__":
    sys.exit(main())
