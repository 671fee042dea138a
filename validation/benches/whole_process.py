#!/usr/bin/env python3
"""Speed and memory of the whole program, as ratios taken side by side.

Every figure is the median over rounds; in each round all commands run one after another, so that a machine whose speed
drifts slows both sides of a ratio. Work of reference: u quark, 100 GeV, start virtuality 100 GeV, cutoff 1 GeV, one-loop
coupling at the transverse momentum. The floor is `floor.c`, the barest loop that draws the same vacuum branchings and
does nothing else. One-thread figures are taken on one processor (all threads of the program share it).

usage: whole_process.py --binary target/release/spindrift [--events 200000] [--rounds 5] [--memory-events 1000000]
"""

import argparse
import json
import os
import pathlib
import statistics
import subprocess
import sys
import tempfile
import time

HERE = pathlib.Path(__file__).resolve().parent
ROOT = HERE.parent.parent
SOURCE = {"kind": "single", "parton": "u", "energy_GeV": 100.0, "start_virtuality_GeV": 100.0}
MEDIUM = {
    "field": {"kind": "grid", "file": str(ROOT / "demo-data" / "lumpy-fireball.h5")},
    "transport": {"kind": "cubic", "coefficient": 4.0, "for": "gluon"},
    "effects": [{"kind": "collinear-expansion", "phase": "interference"}],
}
RECORD = {"history": "final", "compression": 1}
MEBIBYTE = 1 << 20


def config(folder, name, **more):
    path = folder / f"{name}.json"
    path.write_text(json.dumps({"events": 1, "source": SOURCE, "record": RECORD, **more}))
    return path


def run(command, processors):
    """Wall seconds, peak memory in bytes, and what the command printed."""
    begin = time.perf_counter()
    child = subprocess.Popen(
        command,
        stdout=subprocess.PIPE,
        stderr=subprocess.DEVNULL,
        preexec_fn=lambda: os.sched_setaffinity(0, processors),
    )
    output = child.stdout.read()
    _, status, usage = os.wait4(child.pid, 0)
    if status:
        sys.exit(f"{command} failed")
    return time.perf_counter() - begin, usage.ru_maxrss * 1024, output


def main():
    parser = argparse.ArgumentParser()
    parser.add_argument("--binary", required=True)
    parser.add_argument("--events", type=int, default=200_000)
    parser.add_argument("--rounds", type=int, default=5)
    parser.add_argument("--memory-events", type=int, default=1_000_000)
    arguments = parser.parse_args()
    processors = sorted(os.sched_getaffinity(0))
    one, two = {processors[0]}, set(processors[:2])
    events = str(arguments.events)
    with tempfile.TemporaryDirectory() as name:
        folder = pathlib.Path(name)
        floor = folder / "floor"
        subprocess.run(["cc", "-O3", "-o", floor, HERE / "floor.c", "-lm"], check=True)
        vacuum, medium = config(folder, "vacuum"), config(folder, "medium", medium=MEDIUM)

        def generate(path, *more, count=events):
            base = [arguments.binary, "generate", str(path), "--events", count, "--quiet", "--json"]
            where = [] if "--discard" in more else ["--out", str(folder / "out.h5"), "--overwrite"]
            return base + where + list(more)

        commands = {
            "floor": ([floor, events, "100", "1", "1", "1"], one),
            "vacuum, nothing written": (generate(vacuum, "--discard", "--threads", "1"), one),
            "vacuum, written": (generate(vacuum, "--threads", "1"), one),
            "vacuum, written, 2 threads": (generate(vacuum, "--threads", "2"), two),
            "medium, nothing written": (generate(medium, "--discard", "--threads", "1"), one),
        }
        times = {name: [] for name in commands}
        summaries = {}
        for _ in range(arguments.rounds):
            for name, (command, where) in commands.items():
                seconds, _, output = run(command, where)
                times[name].append(seconds)
                summaries[name] = json.loads(output)
        size = (folder / "out.h5").stat().st_size
        finals = summaries["vacuum, written"]["final_partons"]
        report(times, summaries, arguments.events, size / finals)
        for count in (10_000, arguments.memory_events):
            _, peak, _ = run(generate(vacuum, "--threads", str(len(two)), count=str(count)), two)
            print(f"peak memory, {count:>9,} events, written, {len(two)} threads: {peak / MEBIBYTE:6.1f} MiB")


def report(times, summaries, events, bytes_per_parton):
    def ratio(above, below, scale=1.0):
        return statistics.median(a / b for a, b in zip(times[above], times[below])) * scale

    for name, seconds in times.items():
        print(f"{name:28} {statistics.median(seconds) / events * 1e6:8.3f} us an event")
    branchings = [summaries[name]["branchings_per_event"] for name in ("vacuum, nothing written", "medium, nothing written")]
    print(f"vacuum over floor, nothing written            {ratio('vacuum, nothing written', 'floor'):6.2f}")
    print(f"vacuum over floor, written                    {ratio('vacuum, written', 'floor'):6.2f}")
    print(f"one thread over two, written                  {ratio('vacuum, written', 'vacuum, written, 2 threads'):6.2f}")
    per_branching = ratio("medium, nothing written", "vacuum, nothing written", branchings[0] / branchings[1])
    print(f"medium over vacuum, per branching             {per_branching:6.2f}")
    print(f"bytes a final parton                          {bytes_per_parton:6.1f}")


if __name__ == "__main__":
    main()
