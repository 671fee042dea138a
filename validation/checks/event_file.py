"""The event file as the documentation promises it, read by h5py, awkward and xarray."""

import json
import re

import awkward as ak
import h5py
import numpy as np
import xarray as xr

ATTRIBUTES = {
    "format": str, "format_version": "number", "program_version": str, "commit": str, "command_line": str, "host": str,
    "config": str, "config_digest": str, "seed": "number", "first_id": "number", "last_id": "number", "complete": "number",
    "events_committed": "number", "partons_committed": "number", "created": str, "kinematics": str,
    "open_colour_lines": "number", "cross_section": "number", "cross_section_unit": str, "sum_of_source_weights": "number",
    "sum_of_weights": "number", "sum_of_squared_weights": "number",
}  # fmt: skip
EVENTS = {
    "id": ("i8", "1"), "source_weight": ("f8", "1"), "weight": ("f8", "1"), "partons_start": ("i8", "1"),
    "partons_count": ("i4", "1"), "hard_scale": ("f8", "GeV"), "origin": ("f4", "fm"), "field": ("i4", "1"),
}  # fmt: skip
PARTONS = {
    "pdg": ("i4", "1"), "status": ("i1", "1"), "parent": ("i4", "1"), "colour": ("i4", "1"), "anticolour": ("i4", "1"),
    "px": ("f8", "GeV"), "py": ("f8", "GeV"), "pz": ("f8", "GeV"), "energy": ("f8", "GeV"),
    "virtuality_squared": ("f4", "GeV^2"), "splitting_fraction": ("f4", "1"), "jet_fraction": ("f4", "1"),
    "birth_t": ("f4", "fm"), "birth_x": ("f4", "fm"), "birth_y": ("f4", "fm"), "birth_z": ("f4", "fm"), "channel": ("u1", "1"),
}  # fmt: skip
# Only where record.medium_exit is true, and then all of them.
EXITS = {
    "exit_t": ("f4", "fm"), "exit_x": ("f4", "fm"), "exit_y": ("f4", "fm"), "exit_z": ("f4", "fm"),
    "exit_temperature": ("f4", "GeV"), "exit_ux": ("f4", "1"), "exit_uy": ("f4", "1"), "exit_uz": ("f4", "1"),
}  # fmt: skip
FINAL = 1
SINGLE = float(np.finfo("f4").eps)
COUNTERS = ("trials", "overshoots")


def datasets_of(file):
    """Every dataset with its path."""
    found = []
    file.visititems(lambda name, item: found.append((name, item)) if isinstance(item, h5py.Dataset) else None)
    return found


def check_attributes(path):
    """All provenance is there, with the right kind of value."""
    with h5py.File(path) as file:
        for name, kind in ATTRIBUTES.items():
            assert name in file.attrs, f"attribute {name} is missing"
            value = file.attrs[name]
            good = isinstance(value, str) if kind is str else np.issubdtype(np.asarray(value).dtype, np.number) and np.ndim(value) == 0
            assert good, f"attribute {name} is {value!r}"
        assert file.attrs["format"] == "spindrift events"
        assert file.attrs["complete"] == 1
        assert re.fullmatch("[0-9a-f]{64}", file.attrs["config_digest"]), file.attrs["config_digest"]
        assert isinstance(json.loads(file.attrs["config"]), dict)
        assert re.match(r"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d", file.attrs["created"]), file.attrs["created"]
        for counter in COUNTERS:
            assert any(counter in name for name in file.attrs), f"no counter of {counter}"


def records_exits(file):
    """Whether the config in the file asks for exits from the medium."""
    return json.loads(file.attrs["config"])["record"]["medium_exit"]


def parton_columns(file):
    """The columns that a file's table of partons must have."""
    return PARTONS | EXITS if records_exits(file) else PARTONS


def check_layout(path):
    """Every dataset: type, units, description, chunks, growth, checksum, named axis; nothing undocumented."""
    with h5py.File(path) as file:
        for group, columns, scale in (("events", EVENTS, "event"), ("partons", parton_columns(file), "parton")):
            names = set(file[group])
            assert set(columns) <= names, f"missing in /{group}: {set(columns) - names}"
            assert names - set(columns) <= {"variation_weights"}, f"undocumented in /{group}: {names - set(columns)}"
            for name, (kind, units) in columns.items():
                dataset = file[group][name]
                assert dataset.dtype == np.dtype("<" + kind), f"/{group}/{name} is {dataset.dtype}"
                assert dataset.attrs["units"] == units, f"/{group}/{name} has units {dataset.attrs['units']}"
                axis = dataset.dims[0]
                assert len(axis) == 1 and axis[0].is_scale, f"/{group}/{name} has no dimension scale"
                assert axis[0].name.rsplit("/", 1)[-1] == scale, axis[0].name
        for name, dataset in datasets_of(file):
            assert dataset.chunks and dataset.maxshape[0] is None, f"{name} cannot grow"
            assert dataset.fletcher32, f"{name} has no checksum"
            assert isinstance(dataset.attrs["units"], str), f"{name} has no units"
            assert len(dataset.attrs["description"]) > 3, f"{name} has no description"
        assert set(file["fields"]) == {"name", "sha256", "weight"}, set(file["fields"])


def check_extents(path):
    """Extents equal the counts; rows of events follow one another; ids ascend; everything can be read."""
    with h5py.File(path) as file:
        events, partons = int(file.attrs["events_committed"]), int(file.attrs["partons_committed"])
        for group, rows in (("events", events), ("partons", partons)):
            for name, dataset in file[group].items():
                assert dataset.shape[0] == rows, f"/{group}/{name} has {dataset.shape[0]} rows, {rows} committed"
                assert dataset[()].shape == dataset.shape
        start, count = file["events/partons_start"][()], file["events/partons_count"][()].astype("i8")
        assert np.array_equal(start, np.concatenate([[0], np.cumsum(count)[:-1]])), "partons_start does not follow partons_count"
        assert count.sum() == partons
        ids = file["events/id"][()]
        assert np.all(np.diff(ids) > 0) and ids[0] == file.attrs["first_id"] and ids[-1] == file.attrs["last_id"]
        for name, column in (("sum_of_source_weights", "source_weight"), ("sum_of_weights", "weight")):
            assert np.isclose(file.attrs[name], file["events"][column][()].sum(), rtol=1e-12), name
        squares = (file["events/weight"][()] ** 2).sum()
        assert np.isclose(file.attrs["sum_of_squared_weights"], squares, rtol=1e-12)


def check_xarray(path):
    """xarray opens both tables by either engine, with named dimensions."""
    for engine in ("h5netcdf", "netcdf4"):
        for group, dimension in (("events", "event"), ("partons", "parton")):
            with xr.open_dataset(path, group=group, engine=engine) as table:
                assert dimension in table.sizes, f"{engine}: /{group} has dimensions {dict(table.sizes)}"
                for variable in table.data_vars.values():
                    variable.load()


def jagged(path):
    """partons[event, row] with all columns, and the attributes."""
    with h5py.File(path) as file:
        columns = {name: file["partons"][name][()] for name in parton_columns(file)}
        return ak.unflatten(ak.zip(columns), file["events/partons_count"][()]), dict(file.attrs)


def check_exits(path):
    """Exits: final partons alone have them, whole; on the light-like path from birth, not colder than the end temperature."""
    partons, attributes = jagged(path)
    field = json.loads(attributes["config"])["medium"]["field"]
    rows = {name: np.asarray(ak.flatten(partons[name])).astype("f8") for name in ak.fields(partons)}
    missing = np.array([np.isnan(rows[name]) for name in EXITS])
    assert np.all(missing.all(axis=0) == missing.any(axis=0)), "an exit is there in part"
    there = ~missing[0]
    assert np.all(rows["status"][there] == FINAL), "a row that is no final parton has an exit"
    finals = rows["status"] == FINAL
    assert 0 < there.sum() <= finals.sum(), f"{there.sum()} exits of {finals.sum()} final partons"
    rows = {name: column[there] for name, column in rows.items()}
    length = rows["exit_t"] - rows["birth_t"]
    assert np.all(length >= 0.0), "an exit before birth"
    size = np.sqrt(rows["px"] ** 2 + rows["py"] ** 2 + rows["pz"] ** 2)
    for axis in "xyz":
        off = rows[f"exit_{axis}"] - rows[f"birth_{axis}"] - rows[f"p{axis}"] / size * length
        allowed = SINGLE * (np.abs(rows[f"exit_{axis}"]) + rows["exit_t"]) + 1e-9 * length
        assert np.all(np.abs(off) <= allowed), f"an exit off its path along {axis} by {np.abs(off).max():.1e} fm"
    coldest = np.float32(field["end_temperature_GeV"])
    assert rows["exit_temperature"].min() >= coldest, f"an exit at {rows['exit_temperature'].min()} GeV"
    if field["kind"] == "brick":
        assert np.allclose(rows["exit_t"], field["length_fm"], rtol=1e-5), "the brick is not left at its end"
        assert np.all(rows["exit_ux"] == 0.0) and np.all(rows["exit_uz"] == 0.0), "a brick moves"


def flat_tables(path):
    """All columns of both tables as plain arrays, keyed by path."""
    with h5py.File(path) as file:
        return {f"{group}/{name}": dataset[()] for group in ("events", "partons") for name, dataset in file[group].items()}


def check_checksum_is_real(path, work):
    """A byte flipped in stored data is noticed by HDF5 itself, for every column."""
    with h5py.File(path) as file:
        targets = [f"events/{name}" for name in EVENTS] + [f"partons/{name}" for name in parton_columns(file)]
    for target in targets:
        with h5py.File(path) as file:
            chunk = file[target].id.get_chunk_info(0)
        content = bytearray(path.read_bytes())
        content[chunk.byte_offset + chunk.size // 2] ^= 0x10
        broken = work / "broken.h5"
        broken.write_bytes(content)
        try:
            with h5py.File(broken) as file:
                file[target][()]
        except OSError:
            continue
        raise AssertionError(f"a flipped byte in /{target} went unnoticed")
