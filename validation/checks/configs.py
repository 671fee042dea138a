"""Configs against the program's own JSON Schema, and what is refused."""

import json

import jsonschema

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
        "angular": changed(base, shower__ordering="angular"),
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
