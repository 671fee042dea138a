"""The JSON Schema against the program's own checker, on many configs that were made by editing valid ones.

What concerns one section is in both, so they must agree on every config: the schema refuses it exactly where the program
tells of an unknown, missing, unused or duplicate key, a wrong type, a value out of range or an unknown word. Rules that
tie sections together, and files that cannot be used, are the program's alone and do not count.
"""

import copy
import json
import random
import re

import jsonschema

SEED = 20_260_101
CONFIGS = 1500
# One edit more often than two, which mostly leave nothing valid.
EDITS = [1, 1, 2]
# Fewer than this share of refused, or of accepted, configs would test little.
LEAST_SHARE = 0.2

OF_ONE_SECTION = re.compile(
    r": (unknown key|duplicate key|key that is not used here|missing key|wrong type|value out of range|unknown choice"
    r"|known to a later version of spindrift, not built yet)$",
    re.MULTILINE,
)

WRONG = [None, True, -1, 0.5, 1e300, "", "word", [], [0], {}, {"kind": "word"}]
TOP = ["events", "source"]


def bases(files):
    """Valid configs that together hold every kind; `files` is the list of field files, a place list and a table."""
    fields, places, table = files
    source = {"kind": "single", "parton": "u", "energy_GeV": 100.0, "start_virtuality_GeV": 40.0}
    pair = {"kind": "pair", "partons": ["g", "g"], "sqrt_s_GeV": 91.0, "start_virtuality_GeV": 45.0, "direction": [1, 0, 0]}
    cubic = {"kind": "cubic", "coefficient": 4.0, "for": "gluon"}
    brick = {"kind": "brick", "temperature_GeV": 0.3, "length_fm": 4.0}
    longitudinal = {"kind": "longitudinal", "temperature_GeV": 0.4, "start_fm": 0.6}
    radial = {"kind": "radial", "amplitude": 3.0, "q_per_fm": 0.25, "start_fm": 0.6, "pre_equilibrium": "hold"}
    grid = {"kind": "grid", "file": fields[0], "rotation_rad": 0.5, "shift_fm": [1, -1]}
    listed = {"kind": "grid", "files": fields, "events_per_field": 100}
    matched = {"kind": "grid", "files": fields[0], "events_per_field": 1}
    custom = {"kind": "overlap", "nucleus": "custom", "radius_fm": 6.6, "diffuseness_fm": 0.5, "impact_parameter_fm": 7.0}
    effects = [
        {"kind": "collinear-expansion"},
        {"kind": "collinear-expansion", "phase": "rescattering", "window": 1.0},
        {"kind": "singular-enhancement", "factor": 0.5},
        {"kind": "singular-enhancement", "law": "path", "slope_per_GeV2": 0.1},
        {"kind": "resolved-only"},
        {"kind": "broadening"},
        {"kind": "drag"},
        {"kind": "virtuality-diffusion"},
        {"kind": "multiple-soft"},
        {"kind": "single-hard"},
    ]

    def run(**sections):
        return {"events": 10, "source": source, **sections}

    def medium(**sections):
        return run(medium={"field": brick, "transport": cubic, "effects": [], **sections})

    yield run()
    yield run(source=pair, quark_masses_GeV=[1.4, 4.5], record={"history": "full", "momentum_bits": 30, "medium_exit": True})
    yield run(coupling={"argument": "fixed", "alpha_s": 0.2}, shower={"ordering": "angular"})
    yield run(coupling={"argument": "virtuality", "loops": 2, "freeze_GeV": 1.2}, shower={"z_range": {"kind": "constant", "epsilon": 0.01}})
    for field in (brick, longitudinal, radial, grid, listed, matched):
        yield medium(field=field)
    for origin in ({"kind": "fixed", "x_fm": 1.0}, {"kind": "overlap", "nucleus": "Pb208", "impact_parameter_fm": 7.0}, custom, {"kind": "list", "file": places}):
        yield medium(origin=origin)
    for origin in ({"kind": "field-weighted", "power": 3.0}, {"kind": "collision-density"}):
        yield medium(field=grid, origin=origin)
    for transport in ({"kind": "constant", "qhat_GeV2_per_fm": 1.0, "for": "quark"}, {"kind": "thermal", "alpha_s": 0.3}, {"kind": "table", "file": table, "for": "quark"}):
        yield medium(transport=transport)
    for effect in effects:
        yield medium(effects=[effect])


def sections(config, schema):
    """Every section of a config with its schema."""
    if not isinstance(config, dict):
        return
    yield config, schema
    for name, value in config.items():
        inner = schema.get("properties", {}).get(name, {})
        if isinstance(value, dict) and "properties" in inner:
            yield from sections(value, inner)
        elif isinstance(value, list) and "properties" in inner.get("items", {}):
            for item in value:
                yield from sections(item, inner["items"])


def around(form, rng):
    """A value at, inside or just beyond the ends of what a form allows."""
    if "oneOf" in form:
        return around(rng.choice(form["oneOf"]), rng)
    if "const" in form:
        return form["const"]
    if "enum" in form:
        return rng.choice(form["enum"])
    kind = form.get("type")
    if kind in ("number", "integer"):
        low = form.get("minimum", form.get("exclusiveMinimum", -1.0))
        high = form.get("maximum", form.get("exclusiveMaximum", 1.0))
        step = 1 if kind == "integer" else 1e-3
        inside = [low + step, form.get("default", low + step)]
        return rng.choice([low, high, low - step, high + step, *(2 * inside)])
    if kind == "boolean":
        return rng.random() < 0.5
    if kind == "array":
        lengths = [form.get("minItems", 0), form.get("maxItems", 1), form.get("maxItems", 1) + 1]
        length = rng.choice([length for length in lengths if length < 50])
        return [around(form.get("items", {"type": "number"}), rng) for _ in range(length)]
    if kind == "string":
        return rng.choice(["some-name", ""])
    return {"kind": "word"}


def edit(config, schema, rng):
    """One change of one section."""
    section, form = rng.choice(list(sections(config, schema)))
    properties = form["properties"]
    action = rng.choice(["remove", "wrong", "unknown", *(3 * ["set", "word"])])
    if action == "remove" and section:
        del section[rng.choice(list(section))]
    elif action == "word":
        words = [name for name, key in properties.items() if "enum" in key]
        if words:
            name = rng.choice(words)
            section[name] = rng.choice(properties[name]["enum"])
    elif action == "wrong" and section:
        section[rng.choice(list(section))] = copy.deepcopy(rng.choice(WRONG))
    elif action == "unknown":
        section["unheard_of"] = 1
    else:
        name = rng.choice(list(properties))
        section[name] = around(properties[name], rng)


def check_schema_and_checker_agree(program, schema, files):
    """On every config, and both verdicts are common."""
    validator = jsonschema.validators.validator_for(schema)(schema)
    rng = random.Random(SEED)
    base = list(bases(files))
    nowhere = program.work / "no-such-folder" / "never.h5"
    refused, disagreements = 0, []
    for place in range(CONFIGS):
        config = copy.deepcopy(base[place % len(base)])
        # The first round takes the bases as they are.
        for _ in range(rng.choice(EDITS) if place >= len(base) else 0):
            edit(config, schema, rng)
        path = program.write_config("agreement", config)
        _, said = program.run("generate", path, "--out", nowhere, "--quiet", expect=2)
        by_program = bool(OF_ONE_SECTION.search(said))
        by_schema = not validator.is_valid(config)
        assert place >= len(base) or not by_program, f"a base is refused: {json.dumps(config)}\n{said}"
        refused += by_program
        if by_program != by_schema:
            why = said if by_program else [error.message for error in validator.iter_errors(config)]
            disagreements.append(f"{json.dumps(config)}: {'program' if by_program else 'schema'} alone refuses it: {why}")
    assert not disagreements, f"{len(disagreements)} of {CONFIGS}; the first: {disagreements[0]}"
    share = refused / CONFIGS
    assert LEAST_SHARE < share < 1.0 - LEAST_SHARE, f"{share:.2f} of the configs are refused: the comparison says little"
