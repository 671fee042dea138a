"""Configs against the program's own JSON Schema, and what is refused."""

import json

import jsonschema

from checks import schema_agreement
from checks.program import changed


def schema(program):
    """The schema that the program prints, itself valid."""
    text, _ = program.run("schema")
    value = json.loads(text)
    jsonschema.validators.validator_for(value).check_schema(value)
    return value


def check_configs_fit_schema(program):
    """Every config of the project validates and is accepted."""
    validator = jsonschema.validators.validator_for(schema(program))(schema(program))
    paths = sorted(program.configs.glob("*.json"))
    assert paths, f"no configs in {program.configs}"
    for path in paths:
        errors = [error.message for error in validator.iter_errors(json.loads(path.read_text()))]
        assert not errors, f"{path.name}: {errors}"
        program.run("generate", path, "--events", 3, "--discard", "--quiet")


def check_schema_documents_keys(program):
    """Every property of the schema has a description."""
    undocumented = []

    def walk(value, where):
        if isinstance(value, dict):
            for name, item in value.get("properties", {}).items():
                if isinstance(item, dict) and not described(item, whole):
                    undocumented.append(f"{where}.{name}")
            for name, item in value.items():
                walk(item, f"{where}.{name}")
        elif isinstance(value, list):
            for index, item in enumerate(value):
                walk(item, f"{where}[{index}]")

    whole = schema(program)
    walk(whole, "")
    assert not undocumented, undocumented


def described(item, whole):
    """A description of its own, or behind its reference, or a constant that names a kind."""
    if "description" in item or "const" in item:
        return True
    reference = item.get("$ref", "")
    target = whole
    for part in reference.lstrip("#/").split("/") if reference else []:
        target = target[part]
    return bool(reference) and "description" in target


def bad_configs(program):
    """(name, config, a word that the complaint must hold, whether the schema alone can tell)."""
    base = program.config("first-look.json")
    yield "misspelt", changed(base, shower__virtuality_cutof_GeV=1.0), "virtuality_cutoff_GeV", True
    yield "unknown-kind", changed(base, source__kind="singel"), "single", True
    yield "text-for-number", changed(base, source__energy_GeV="100"), "energy_GeV", True
    yield "fractional-events", changed(base, events=2.5), "events", True
    yield "negative-events", changed(base, events=-1), "events", True
    yield "virtuality-above-energy", changed(base, source__start_virtuality_GeV=101.0), "start_virtuality_GeV", False
    yield "cutoff-above-start", changed(base, shower__virtuality_cutoff_GeV=40.0), "virtuality_cutoff_GeV", False
    yield "alpha-too-large", changed(base, coupling__alpha_s_mz=1.0), "alpha_s_mz", True
    yield "epsilon-too-large", changed(base, shower__z_range={"kind": "constant", "epsilon": 0.5}), "epsilon", True
    yield "unused-key", changed(base, coupling__alpha_s=0.15), "alpha_s", False
    yield "too-wide-window", changed(base, medium__effects=[{"kind": "collinear-expansion", "phase": "rescattering", "window": 1.25}]), "window", False
    yield "whose-qhat", changed(base, medium__transport__for=None), "for", True
    yield "collinear-medium", changed(base, shower__ordering="collinear"), "collinear", False
    field = base["medium"]["field"]["file"]
    radial = {"kind": "radial", "amplitude": 3.0, "q_per_fm": 0.25}
    yield "radial-without-start", changed(base, medium__field=radial), "start_fm", True
    yield "two-ways-to-name-files", changed(base, medium__field__files=[field]), "files", True
    yield "no-file", changed(base, medium__field__file=None), "file", True
    yield "how-many-events", changed(base, medium__field={"kind": "grid", "files": [field]}), "events_per_field", True
    yield "events-of-one-field", changed(base, medium__field__events_per_field=5), "events_per_field", True
    yield "degrees", changed(base, medium__field__rotation_rad=90), "radians", True
    yield "thermal-for", changed(base, medium__transport={"kind": "thermal", "alpha_s": 0.3, "for": "gluon"}), "for", True
    yield "nucleus-without-radius", changed(base, medium__origin={"kind": "overlap", "nucleus": "custom", "diffuseness_fm": 0.5, "impact_parameter_fm": 7}), "radius_fm", True
    yield "enhancement-of-nothing", changed(base, medium__effects=[{"kind": "singular-enhancement"}]), "factor", True
    yield "no-match", changed(base, medium__field={"kind": "grid", "files": "no-such/*.h5", "events_per_field": 5}), "no-such", False
    yield "absent-field", changed(base, medium__field__file="no-such-field.h5"), "no-such-field.h5", False


def check_bad_configs(program):
    """Each is refused with exit code 2 and a complaint that names the key; the schema sees what it can."""
    validator = jsonschema.validators.validator_for(schema(program))(schema(program))
    for name, config, word, by_schema in bad_configs(program):
        if by_schema:
            assert not validator.is_valid(config), f"{name}: the schema accepts it"
        out = program.work / f"never-{name}.h5"
        _, words = program.run("generate", program.write_config(name, config), "--out", out, "--quiet", expect=2)
        assert word in words, f"{name}: the complaint does not say '{word}': {words}"
        assert "panicked" not in words, words
        assert not out.exists(), f"{name}: an output was left"


def check_schema_and_checker_agree(program):
    """The schema refuses what the program refuses, as far as one section goes."""
    fields = []
    for place in range(3):
        fields.append(str(program.work / f"agreement-{place}.h5"))
        (program.work / fields[-1]).write_text(str(place))
    places, table = program.work / "agreement-places.csv", program.work / "agreement-qhat.csv"
    places.write_text("x_fm,y_fm,weight\n0,0,1\n")
    table.write_text("temperature_GeV,qhat_GeV2_per_fm\n0.1,0.1\n0.5,8\n")
    schema_agreement.check_schema_and_checker_agree(program, schema(program), (fields, str(places), str(table)))


def check_broken_json(program):
    """Broken JSON is told with file and line; duplicate keys are refused."""
    text = (program.configs / "first-look.json").read_text()
    cases = {
        "cut": (text[: len(text) // 2], "cut.json"),
        "comma": (text.replace(",", ",,", 1), "comma.json"),
        "twice": (text.replace('"seed": 1,', '"seed": 1, "seed": 2,', 1), "seed"),
        "empty": ("", "empty.json"),
        "list": ("[]", "list.json"),
    }
    for name, (content, word) in cases.items():
        path = program.work / f"{name}.json"
        path.write_text(content)
        _, words = program.run("generate", path, "--out", program.work / "never.h5", "--quiet", expect=2)
        assert word in words, f"{name}: {words}"
    assert not (program.work / "never.h5").exists()


def check_later_keys(program):
    """What a later version will know exits 2 and says so."""
    base = program.config("first-look.json")
    later = {
        "annihilation": {**base, "source": {"kind": "annihilation", "sqrt_s_GeV": 91.1876}},
        "variations": {**base, "variations": [{"name": "stronger", "transport_factor": 1.5}]},
        "massive": changed(base, shower__quark_masses="massive"),
    }
    for name, config in later.items():
        program.run("generate", program.write_config(f"later-{name}", config), "--out", program.work / "never.h5", "--quiet", expect=2)


def check_output_is_guarded(program):
    """An existing output is kept without --overwrite."""
    out = program.generate("guarded", program.config("first-look-vacuum.json"), 20)
    before = out.read_bytes()
    _, words = program.run("generate", program.work / "guarded.json", "--out", out, "--events", 5, "--quiet", expect=2)
    assert "--overwrite" in words, words
    assert out.read_bytes() == before, "the existing file was touched"
