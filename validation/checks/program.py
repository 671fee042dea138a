"""Running the program."""

import copy
import json
import pathlib
import subprocess

TIMEOUT_S = 300


class Program:
    """The binary, a folder to work in, and the folder of the project's configs."""

    def __init__(self, binary, work, configs):
        self.binary, self.work, self.configs = pathlib.Path(binary).resolve(), pathlib.Path(work), pathlib.Path(configs).resolve()

    def run(self, *arguments, expect=0):
        """Run a verb; assert its exit code; return (stdout, stderr)."""
        command = [str(self.binary), *(str(a) for a in arguments)]
        done = subprocess.run(command, cwd=self.work, capture_output=True, text=True, timeout=TIMEOUT_S)
        assert done.returncode == expect, f"{' '.join(command[1:])}: exit {done.returncode}, expected {expect}\n{done.stderr[-2000:]}"
        return done.stdout, done.stderr

    def exit_code(self, *arguments):
        """Run a verb; return its exit code and what it said."""
        command = [str(self.binary), *(str(a) for a in arguments)]
        done = subprocess.run(command, cwd=self.work, capture_output=True, text=True, timeout=TIMEOUT_S)
        return done.returncode, done.stderr

    def config(self, name):
        """A config of the project as a dictionary, with the paths in it made absolute."""
        value = json.loads((self.configs / name).read_text())
        field = (value.get("medium") or {}).get("field", {})
        if "file" in field:
            field["file"] = str((self.configs / field["file"]).resolve())
        return value

    def write_config(self, name, value):
        """Write a config into the working folder."""
        path = self.work / f"{name}.json"
        path.write_text(json.dumps(value, indent=1))
        return path

    def generate(self, name, config, events, *arguments):
        """Generate a sample from a dictionary; return the event file."""
        path, out = self.write_config(name, config), self.work / f"{name}.h5"
        self.run("generate", path, "--out", out, "--events", events, "--overwrite", "--quiet", *arguments)
        return out


def changed(config, **paths):
    """A copy of a config with keys set by path, dots written as double underscores; None removes a key."""
    value = copy.deepcopy(config)
    for path, new in paths.items():
        *parents, last = path.split("__")
        here = value
        for parent in parents:
            here = here.setdefault(parent, {})
        if new is None:
            here.pop(last, None)
        else:
            here[last] = new
    return value
