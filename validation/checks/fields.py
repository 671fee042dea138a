"""Temperature fields as people write them with xarray, good and bad, and what the program says to each."""

import xml.etree.ElementTree

import h5py
import numpy as np
import xarray as xr

from checks.event_file import flat_tables
from checks.program import changed

HBAR_C_GEV_FM = 0.1973269804
ENGINES = ("h5netcdf", "netcdf4")
EVENTS = 200
# Of events whose rows are the same kind of partons although T differs by rounding: a wrong unit changes nearly all.
SAME_SHARE = 0.97


def small_field(flow=False, eta=False):
    """A small hot spot that expands; smooth on purpose, so that it can be written in many ways."""
    tau = np.array([0.6, 0.8, 1.1, 1.6, 2.4, 3.6, 5.0, 7.0])
    side = np.linspace(-6.0, 6.0, 25)
    t, x, y = np.meshgrid(tau, side, side, indexing="ij")
    temperature = 0.42 * (0.6 / t) ** (1 / 3) * np.exp(-(x**2 + 1.3 * y**2) / 60.0)
    dims, data = ("tau", "x", "y"), {"temperature": temperature}
    coordinates = {"tau": tau, "x": side, "y": side}
    if flow:
        data |= {"ux": 0.08 * (t - 0.6) * x / 3.0, "uy": 0.08 * (t - 0.6) * y / 3.0}
    if eta:
        rapidity = np.linspace(-3.0, 3.0, 13)
        shape = np.exp(-(rapidity**2) / 40.0)
        data = {name: values[..., None] * (shape if name == "temperature" else np.ones(13)) for name, values in data.items()}
        if flow:
            data["ueta"] = np.zeros_like(data["ux"])
        dims, coordinates = (*dims, "eta"), {**coordinates, "eta": rapidity}
    field = xr.Dataset({name: (dims, values) for name, values in data.items()}, coordinates)
    field["temperature"].attrs["units"] = "GeV"
    for axis in ("tau", "x", "y"):
        field[axis].attrs["units"] = "fm"
    return field


def scaled(field, factor, units):
    """The same temperature in other units."""
    other = field.copy(deep=True)
    other["temperature"] = field["temperature"] * factor
    other["temperature"].attrs["units"] = units
    return other


def packed():
    """Encoding of the temperature as 16-bit integers with scale and offset."""
    return {"temperature": {"dtype": "int16", "scale_factor": 0.5 / 60000, "add_offset": 0.25, "_FillValue": -32768}}


def run_in(program, name, field_path):
    """Generate in a field with the first-look config; the tables."""
    config = changed(program.config("first-look.json"), medium__field__file=str(field_path))
    return flat_tables(program.generate(name, config, EVENTS, "--threads", 1))


def same_share(one, other):
    """Share of events that have the same rows of partons in both samples."""
    def events(tables):
        ends = np.cumsum(tables["events/partons_count"])
        return [tables["partons/pdg"][end - n : end].tobytes() for end, n in zip(ends, tables["events/partons_count"])]

    return np.mean([a == b for a, b in zip(events(one), events(other))])


def check_good_fields(program):
    """Every way to write the same field is accepted, by both engines, and gives the same jets."""
    plain = small_field()
    ways = {
        "plain": (plain, {}),
        "permuted": (plain.transpose("y", "tau", "x"), {}),
        "single": (plain.astype("f4").assign_coords({n: plain[n] for n in plain.coords}), {}),
        "mev": (scaled(plain, 1e3, "MeV"), {}),
        "per-fm": (scaled(plain, 1.0 / HBAR_C_GEV_FM, "1/fm"), {}),
        "packed": (plain, packed()),
        "compressed": (plain, {"temperature": {"zlib": True, "complevel": 4, "shuffle": True, "chunksizes": (3, 10, 7)}}),
    }
    # astype drops attributes of no variable, but coordinates keep theirs only if given back.
    reference = None
    for engine in ENGINES:
        for name, (field, encoding) in ways.items():
            path = program.work / f"field-{name}-{engine}.h5"
            field.to_netcdf(path, engine=engine, encoding=encoding)
            program.run("field", "check", path)
            tables = run_in(program, f"in-{name}-{engine}", path)
            reference = reference or tables
            share = same_share(reference, tables)
            exact = name in ("plain", "permuted", "compressed")
            assert share == 1.0 if exact else share > SAME_SHARE, f"{name} by {engine}: only {share:.3f} of the events agree"


def check_units_matter(program):
    """The comparison above can fail: half the temperature changes many events."""
    plain = small_field()
    for name, factor in (("whole", 1.0), ("half", 0.5)):
        scaled(plain, factor, "GeV").to_netcdf(program.work / f"field-{name}.h5", engine="h5netcdf")
    tables = [run_in(program, f"in-{name}", program.work / f"field-{name}.h5") for name in ("whole", "half")]
    share = same_share(*tables)
    assert share < SAME_SHARE, f"{share:.3f} of the events agree although the medium differs"


def check_flow_and_rapidity(program):
    """Fields with flow, with three-velocities, with a rapidity axis, with a density of collisions."""
    flow = small_field(flow=True)
    lorentz = np.sqrt(1.0 + flow["ux"] ** 2 + flow["uy"] ** 2)
    velocity = flow.drop_vars(["ux", "uy"]).assign(vx=flow["ux"] / lorentz, vy=flow["uy"] / lorentz)
    density = np.exp(-(flow["x"] ** 2 + flow["y"] ** 2) / 8.0).transpose("x", "y")
    density.attrs["units"] = "fm^-2"
    ways = {
        "flow": flow,
        "velocity": velocity,
        "rapidity": small_field(eta=True),
        "all": small_field(flow=True, eta=True),
        "density": flow.assign(collision_density=density),
    }
    tables = {}
    for engine in ENGINES:
        for name, field in ways.items():
            path = program.work / f"field-{name}-{engine}.h5"
            field.to_netcdf(path, engine=engine)
            program.run("field", "check", path)
            tables[name, engine] = run_in(program, f"in-{name}-{engine}", path)
    for engine in ENGINES:
        share = same_share(tables["flow", engine], tables["velocity", engine])
        assert share > SAME_SHARE, f"four- and three-velocities: {share:.3f} agree"
        assert same_share(tables["flow", engine], tables["density", engine]) == 1.0
    assert same_share(tables["flow", "h5netcdf"], tables["flow", "netcdf4"]) == 1.0


def check_made_field(program):
    """`field make` writes a file that xarray opens: axes, units, and the radial solution's numbers (arXiv:1006.0006)."""
    amplitude, q, start = 80.0**0.25, 1.0 / 4.3, 0.6
    config = changed(program.config("brick.json"), medium__field={"kind": "radial", "amplitude": amplitude, "q_per_fm": q, "start_fm": start})
    path, out = program.write_config("made", config), program.work / "made-field.h5"
    program.run("field", "make", path, "--out", out, "--extent-fm", 6, "--spacing-fm", 0.5, "--last-tau-fm", 4.6)
    with xr.open_dataset(out, engine="h5netcdf") as field:
        assert field["temperature"].dims == ("tau", "x", "y") and field["temperature"].attrs["units"] == "GeV"
        assert all(field[axis].attrs["units"] == "fm" for axis in ("tau", "x", "y"))
        assert field["tau"].values[[0, -1]].tolist() == [start, 4.6] and field["x"].size == 25
        tau, x, y = xr.broadcast(field["tau"], field["x"], field["y"])
        a, b = (q * tau) ** 2, q**2 * (x**2 + y**2)
        spread = 1.0 + 2.0 * (a + b) + (a - b) ** 2
        temperature = amplitude * HBAR_C_GEV_FM * (4.0 * q**2 / (tau * spread)) ** (1 / 3)
        np.testing.assert_allclose(field["temperature"], temperature, rtol=2e-7)
        # the transverse rapidity is artanh of v = 2 q^2 tau r/(1 + a + b)
        radius = np.sqrt(x**2 + y**2)
        u = np.sinh(np.arctanh(2.0 * q**2 * tau * radius / (1.0 + a + b)))
        for name, axis in (("ux", x), ("uy", y)):
            np.testing.assert_allclose(field[name] * radius, u * axis, rtol=1e-6, atol=1e-6)
    picture = program.work / "made-field.svg"
    program.run("field", "check", out, "--picture", picture)
    root = xml.etree.ElementTree.parse(picture).getroot()
    assert root.tag.endswith("svg") and "made-field.h5" in root[0].text


def bad_fields():
    """(name, field, encoding, a word that the complaint must hold)."""
    plain = small_field()
    holes = plain.copy(deep=True)
    holes["temperature"][2, 3, 4] = np.nan
    yield "nan", holes, {}, "fillna"
    # Integers with a fill value where nothing was measured.
    yield "fill-value", holes, packed(), "fillna"
    without = plain.copy(deep=True)
    del without["temperature"].attrs["units"]
    yield "no-units", without, {}, "units"
    without = plain.copy(deep=True)
    del without["x"].attrs["units"]
    yield "no-units-on-x", without, {}, "units"
    yield "kelvin", scaled(plain, 1.0, "K"), {}, "units"
    yield "mev-called-gev", scaled(plain, 1e3, "GeV"), {}, "MeV"
    yield "backwards", plain.isel(tau=slice(None, None, -1)), {}, "increas"
    yield "repeated", plain.isel(x=[0, 1, 1, 2, 3]), {}, "increas"
    yield "negative", scaled(plain, -1.0, "GeV"), {}, "negative"
    yield "other-name", plain.rename(temperature="T"), {}, "temperature"
    yield "other-axis", plain.rename(tau="time"), {}, "tau"
    yield "flat", plain.isel(y=3, drop=True), {}, "y"
    fast = plain.assign(vx=plain["temperature"] * 0.0 + 0.9, vy=plain["temperature"] * 0.0 + 0.9)
    yield "faster-than-light", fast, {}, "v"


def check_bad_fields(program):
    """Each is refused with exit code 2 by both verbs, names the trouble, and leaves no output."""
    for name, field, encoding, word in bad_fields():
        path = program.work / f"bad-{name}.h5"
        field.to_netcdf(path, engine="h5netcdf", encoding=encoding)
        refused(program, name, path, word)
    netcdf3 = program.work / "bad-netcdf3.nc"
    small_field().to_netcdf(netcdf3, engine="scipy")
    refused(program, "netcdf3", netcdf3, "h5netcdf")
    text = program.work / "bad-text.h5"
    text.write_text("tau x y T\n0.6 0 0 0.4\n")
    refused(program, "text", text, "HDF5")
    refused(program, "absent", program.work / "no-such-field.h5", "no-such-field")
    refused(program, "folder", program.work, str(program.work))
    hand_made = program.work / "bad-hand-made.h5"
    with h5py.File(hand_made, "w") as file:
        file["temperature"] = np.full((2, 2, 2), 0.3)
        file["temperature"].attrs["units"] = "GeV"
    refused(program, "hand-made", hand_made, "dimension")


def check_truncated_fields(program):
    """A field file cut anywhere is refused with exit code 2, never read as something else."""
    whole = program.work / "field-to-cut.h5"
    small_field(flow=True).to_netcdf(whole, engine="h5netcdf")
    content = whole.read_bytes()
    for tenth in range(10):
        cut = program.work / "field-cut.h5"
        cut.write_bytes(content[: len(content) * tenth // 10])
        refused(program, f"cut-{tenth}", cut, "field-cut")


def refused(program, name, path, word):
    """Both verbs exit with 2 and a complaint that holds the word."""
    _, words = program.run("field", "check", path, expect=2)
    assert word in words, f"{name}: the complaint does not say '{word}': {words}"
    assert "panicked" not in words, words
    config = changed(program.config("first-look.json"), medium__field__file=str(path))
    out = program.work / f"never-{name}.h5"
    _, words = program.run("generate", program.write_config(f"bad-{name}", config), "--out", out, "--events", 5, "--quiet", expect=2)
    assert word in words, f"{name}: generate does not say '{word}': {words}"
    assert not out.exists(), f"{name}: an output was left"
