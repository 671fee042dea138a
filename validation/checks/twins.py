"""The same seed gives the same events: with any number of threads, and with or without a medium that does nothing."""

import numpy as np

from checks.event_file import flat_tables
from checks.program import changed

EVENTS = 400


def assert_same(one, other, names, words):
    """The columns agree to the last bit."""
    for name in names:
        assert one[name].dtype == other[name].dtype and one[name].tobytes() == other[name].tobytes(), f"{words}: {name} differs"


def check_empty_effects_are_vacuum(program):
    """`"effects": []` is the vacuum to the last bit, in every kind of field."""
    base = changed(program.config("first-look.json"), record__history="full")
    vacuum = flat_tables(program.generate("twin-vacuum", changed(base, medium=None), EVENTS))
    names = [name for name in vacuum if name != "events/field"]
    fields = {
        "grid": base["medium"]["field"],
        "brick": {"kind": "brick", "temperature_GeV": 0.3, "length_fm": 4.0},
        "longitudinal": {"kind": "longitudinal", "temperature_GeV": 0.45, "start_fm": 0.6},
    }
    for kind, field in fields.items():
        empty = changed(base, medium__effects=[], medium__field=field)
        tables = flat_tables(program.generate(f"twin-empty-{kind}", empty, EVENTS))
        assert_same(vacuum, tables, names, f"effects: [] in {kind}")


def check_medium_does_something(program):
    """The medium twin differs from its vacuum partner in some events and agrees in others."""
    base = program.config("first-look.json")
    medium = flat_tables(program.generate("twin-medium", base, EVENTS))
    vacuum = flat_tables(program.generate("twin-none", changed(base, medium__effects=[]), EVENTS))
    assert_same(vacuum, medium, ["events/id", "events/origin", "events/hard_scale"], "twins")
    same = np.mean(medium["events/partons_count"] == vacuum["events/partons_count"])
    assert 0.0 < same < 1.0, f"{same} of the twins have the same number of partons"
    assert np.any(medium["partons/channel"] >= 2), "no induced branching in the sample"
    assert not np.any(vacuum["partons/channel"] >= 2)


def check_vanishing_medium(program):
    """A brick too thin to act, although its channel is drawn, leaves the vacuum to the last bit."""
    base = changed(program.config("brick.json"), medium__field__length_fm=1e-9)
    thin = flat_tables(program.generate("twin-thin", base, EVENTS))
    none = flat_tables(program.generate("twin-thin-none", changed(base, medium__effects=[]), EVENTS))
    assert_same(none, thin, list(none), "vanishing medium")


def check_threads(program):
    """One thread or several: the same content."""
    for config in ("first-look.json", "brick.json"):
        tables = [flat_tables(program.generate(f"threads-{n}", program.config(config), 3 * EVENTS, "--threads", n)) for n in (1, 2, 5)]
        for other in tables[1:]:
            assert_same(tables[0], other, list(tables[0]), f"threads in {config}")


def check_longer_run_starts_alike(program):
    """Event n is the same in a shorter and a longer run, and another seed gives other events."""
    config = program.config("first-look.json")
    short = flat_tables(program.generate("shorter", config, EVENTS))
    long = flat_tables(program.generate("longer", config, 2 * EVENTS))
    for name in short:
        assert long[name][: len(short[name])].tobytes() == short[name].tobytes(), f"{name} differs in the common part"
    other = flat_tables(program.generate("reseeded", config, EVENTS, "--seed", 2))
    assert other["partons/px"].tobytes() != short["partons/px"].tobytes()
