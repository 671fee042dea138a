//! Small input files: transport tables and lists of places, read as they are meant, refused in words where they cannot
//! be used, never a panic.

mod common;

use std::path::PathBuf;

use common::field_maker::{FieldMaker, number};
use proptest::prelude::*;
use spindrift::files::number_table::TableFileError;
use spindrift::files::place_list::read_place_list;
use spindrift::files::transport_table::read_transport_table;
use spindrift::medium::origin::{Origin, PlaceList};
use spindrift::medium::transport::TransportTable;
use spindrift::random::{Key, Purpose};

struct Place {
    _folder: tempfile::TempDir,
    path: PathBuf,
}

fn place(name: &str) -> Place {
    let folder = tempfile::tempdir().unwrap();
    Place {
        path: folder.path().join(name),
        _folder: folder,
    }
}

fn table_of(text: impl AsRef<[u8]>) -> Result<TransportTable, TableFileError> {
    let place = place("table.csv");
    std::fs::write(&place.path, text).unwrap();
    read_transport_table(&place.path)
}

fn list_of(text: impl AsRef<[u8]>) -> Result<PlaceList, TableFileError> {
    let place = place("list.csv");
    std::fs::write(&place.path, text).unwrap();
    read_place_list(&place.path)
}

/// The message without the folder, so that it starts with the file's name.
fn words<T>(outcome: Result<T, TableFileError>) -> String {
    let Err(error) = outcome else {
        panic!("must be refused");
    };
    let whole = error.to_string();
    let name = error.path.file_name().unwrap().to_str().unwrap();
    whole[whole.find(name).unwrap()..].to_owned()
}

#[test]
fn a_table_without_energies() {
    let text = "\u{feff}# qhat of a quark\r\n\r\nqhat_GeV2_per_fm , temperature_GeV\r\n 0.1,0.15\r\n# hot\r\n1.5e0 ,.4\r\n";
    let table = table_of(text).unwrap();
    assert_eq!(table.temperature_gev(), [0.15, 0.4]);
    assert_eq!(table.energy_gev().len(), 1);
    assert_eq!(table.qhat_gev2_per_fm(), [0.1, 1.5]);
}

const FULL: &str = "temperature_GeV,energy_GeV,qhat_GeV2_per_fm\n";

#[test]
fn a_table_with_energies() {
    let text = format!("{FULL}0.2,5,0.3\n0.2,50,0.5\n0.3,5,0.9\n0.3,50,1.25\n");
    let table = table_of(text).unwrap();
    assert_eq!(table.temperature_gev(), [0.2, 0.3]);
    assert_eq!(table.energy_gev(), [5.0, 50.0]);
    assert_eq!(table.qhat_gev2_per_fm(), [0.3, 0.5, 0.9, 1.25]);
}

#[test]
fn what_is_no_table_is_refused_with_its_line() {
    let full = |rows: &str| words(table_of(format!("{FULL}{rows}")));
    let starts = |found: String, start: &str| assert!(found.starts_with(start), "{found}");
    starts(
        words(table_of("")),
        "table.csv:1: the header is \"\"; allowed: \"temperature_GeV,qhat_GeV2_per_fm\" or",
    );
    starts(
        words(table_of("# MeV\ntemperature_MeV,qhat_GeV2_per_fm\n150,1\n")),
        "table.csv:2: the header is \"temperature_MeV,qhat_GeV2_per_fm\"",
    );
    starts(
        words(table_of("0.15,0.1\n0.3,1.0\n")),
        "table.csv:1: the header is \"0.15,0.1\"",
    );
    starts(
        words(table_of("temperature_GeV;qhat_GeV2_per_fm\n0,15;1\n")),
        "table.csv:1: the header is",
    );
    starts(
        full("0.2,5\n"),
        "table.csv:2: has 2 fields, the header has 3; separate",
    );
    starts(
        full("0.2,5,nan\n"),
        "table.csv:2: qhat_GeV2_per_fm is \"nan\"; allowed: a finite number",
    );
    starts(
        full("0.2,5,1\n0.2,inf,1\n"),
        "table.csv:3: energy_GeV is \"inf\"",
    );
    starts(full("0.2,,1\n"), "table.csv:2: energy_GeV is \"\"");
    starts(
        full("0.2,5,-1\n"),
        "table.csv:2: qhat_GeV2_per_fm is \"-1\"; allowed: 0 to 10000 GeV^2/fm; none of these is negative",
    );
    starts(
        full("200,5,1\n"),
        "table.csv:2: temperature_GeV is \"200\"; allowed: 0 to 5 GeV; are the units right?",
    );
    starts(
        full("0.3,5,1\n0.2,5,1\n"),
        "table.csv:3: has a lower temperature (or, at the same one, energy) than the row before; sort",
    );
    starts(
        full("0.3,5,1\n\n0.3,5,2\n"),
        "table.csv:4: repeats the temperature (and energy)",
    );
    // Missing in the middle, at the end, and one too many.
    starts(
        full("0.2,5,1\n0.2,9,1\n0.3,9,1\n0.4,5,1\n0.4,9,1\n"),
        "table.csv:4: all temperatures need the same energies, but there is no row with temperature 0.3 GeV and energy 5 GeV",
    );
    starts(
        full("0.2,5,1\n0.2,9,1\n0.3,5,1\n"),
        "table.csv: all temperatures need the same energies, but there is no row with temperature 0.3 GeV and energy 9 GeV",
    );
    starts(
        full("0.2,5,1\n0.3,5,1\n0.3,9,1\n0.4,5,1\n"),
        "table.csv:4: all temperatures need the same energies, but there is no row with temperature 0.2 GeV and energy 9 GeV",
    );
    starts(
        full("0.2,5,1\n0.2,9,2\n"),
        "table.csv: holds 1 temperatures, at least 2 are needed",
    );
    starts(full(""), "table.csv: holds 0 temperatures");
    starts(
        words(table_of([0xff, 0xfe, 0x00])),
        "table.csv: cannot be read: it is not text",
    );
    starts(
        words(table_of(b"CDF\x01rest")),
        "table.csv: is a netCDF-3 file",
    );
    starts(
        words(table_of(b"\x89HDF\r\n\x1a\ntruncated")),
        "table.csv: cannot be read",
    );
    let nowhere = place("table.csv");
    starts(
        words(read_transport_table(&nowhere.path)),
        "table.csv: cannot be read: No such file",
    );
    let folder = tempfile::tempdir().unwrap();
    assert!(read_transport_table(folder.path()).is_err());
}

/// A sparse file that claims 1 TB is refused before memory is taken.
#[test]
fn huge_files_are_refused() {
    let place = place("table.csv");
    let file = std::fs::File::create(&place.path).unwrap();
    file.set_len(1 << 40).unwrap();
    assert!(words(read_transport_table(&place.path)).contains("has 1099511627776 bytes; at most"));
    assert!(words(read_place_list(&place.path)).contains("at most"));
}

const TEMPERATURES: [f64; 3] = [0.15, 0.3, 0.5];
const ENERGIES: [f64; 2] = [5.0, 100.0];
const VALUES: [f64; 6] = [0.1, 0.2, 0.9, 1.4, 3.0, 5.0];

fn read_made(make: impl Fn(&FieldMaker)) -> Result<TransportTable, TableFileError> {
    let place = place("table.nc");
    let maker = FieldMaker::new(&place.path);
    make(&maker);
    drop(maker);
    read_transport_table(&place.path)
}

fn with_axes(maker: &FieldMaker) {
    maker
        .axis("temperature", &TEMPERATURES, Some("GeV"))
        .axis("energy", &ENERGIES, Some("GeV"));
}

#[test]
fn hdf5_in_any_order_of_axes_and_units() {
    let names = ["temperature", "energy"];
    let plain = read_made(|maker| {
        with_axes(maker);
        maker.variable("qhat", &names, &VALUES, Some("GeV^2/fm"));
    })
    .unwrap();
    assert_eq!(plain.temperature_gev(), TEMPERATURES);
    assert_eq!(plain.energy_gev(), ENERGIES);
    assert_eq!(plain.qhat_gev2_per_fm(), VALUES);
    let other = read_made(|maker| {
        let mev = TEMPERATURES.map(|value| 1e3 * value);
        maker
            .axis("temperature", &mev, Some("MeV"))
            .axis("energy", &ENERGIES, Some("GeV"));
        let turned: Vec<f32> = [0, 2, 4, 1, 3, 5].map(|k| VALUES[k] as f32).to_vec();
        let qhat = maker.variable(
            "qhat",
            &["energy", "temperature"],
            &turned,
            Some("GeV**2/fm"),
        );
        number(&qhat, "_FillValue", f32::NAN);
    })
    .unwrap();
    let close = |one: &[f64], other: &[f64]| {
        one.len() == other.len()
            && one
                .iter()
                .zip(other)
                .all(|(a, b)| (a / b - 1.0).abs() < 1e-6)
    };
    assert!(close(other.temperature_gev(), &TEMPERATURES));
    assert!(close(other.qhat_gev2_per_fm(), &VALUES));
    let single = read_made(|maker| {
        maker.axis("temperature", &TEMPERATURES, Some("GeV"));
        maker.variable("qhat", &["temperature"], &VALUES[..3], Some("GeV^2/fm"));
    })
    .unwrap();
    assert_eq!(single.energy_gev().len(), 1);
    assert_eq!(single.qhat_gev2_per_fm(), &VALUES[..3]);
}

#[test]
fn hdf5_that_is_no_table_is_refused() {
    let names = ["temperature", "energy"];
    let refused = |make: &dyn Fn(&FieldMaker)| words(read_made(make));
    let contains = |found: String, part: &str| assert!(found.contains(part), "{found}");
    contains(
        refused(&|maker| with_axes(maker)),
        "has no variable \"qhat\" (found: energy, temperature)",
    );
    contains(
        refused(&|maker| {
            with_axes(maker);
            maker.variable("qhat", &names, &VALUES, None);
        }),
        "variable \"qhat\": units are missing; allowed: \"GeV^2/fm\"",
    );
    contains(
        refused(&|maker| {
            with_axes(maker);
            maker.variable("qhat", &names, &VALUES, Some("GeV^3"));
        }),
        "units \"GeV^3\" are not understood",
    );
    contains(
        refused(&|maker| {
            maker.axis("temperature", &TEMPERATURES, Some("K")).axis(
                "energy",
                &ENERGIES,
                Some("GeV"),
            );
            maker.variable("qhat", &names, &VALUES, Some("GeV^2/fm"));
        }),
        "variable \"temperature\": units \"K\"",
    );
    contains(
        refused(&|maker| {
            with_axes(maker);
            maker.axis("time", &[1.0], Some("fm"));
            maker.variable(
                "qhat",
                &["temperature", "time"],
                &VALUES[..3],
                Some("GeV^2/fm"),
            );
        }),
        "has dimensions (temperature, time); must be over temperature and perhaps energy",
    );
    contains(
        refused(&|maker| {
            with_axes(maker);
            let mut holes = VALUES;
            holes[3] = f64::NAN;
            maker.variable("qhat", &names, &holes, Some("GeV^2/fm"));
        }),
        "qhat at temperature[1] energy[1] is \"NaN\"; allowed: a finite number; fill the holes",
    );
    contains(
        refused(&|maker| {
            with_axes(maker);
            let mut negative = VALUES;
            negative[2] = -0.5;
            maker.variable("qhat", &names, &negative, Some("GeV^2/fm"));
        }),
        "qhat is \"-0.5\"; allowed: 0 to 10000 GeV^2/fm",
    );
    contains(
        refused(&|maker| {
            maker
                .axis("temperature", &[0.3, 0.2, 0.5], Some("GeV"))
                .axis("energy", &ENERGIES, Some("GeV"));
            maker.variable("qhat", &names, &VALUES, Some("GeV^2/fm"));
        }),
        "the temperature axis must be strictly increasing, but 0.3 GeV is followed by 0.2 GeV",
    );
    contains(
        refused(&|maker| {
            maker
                .axis("temperature", &[0.3], Some("GeV"))
                .axis("energy", &ENERGIES, Some("GeV"));
            maker.variable("qhat", &names, &VALUES[..2], Some("GeV^2/fm"));
        }),
        "holds 1 temperatures, at least 2",
    );
    // Declared sizes are checked before memory is taken; nothing is stored for a chunked dataset without values.
    contains(
        refused(&|maker| {
            let axis = |name: &str| {
                maker.bare_axis(name, 3);
            };
            axis("temperature");
            axis("energy");
            let qhat = maker
                .file
                .new_dataset::<f64>()
                .chunk([1024, 1024])
                .shape([1 << 30, 1 << 30])
                .create("qhat")
                .unwrap();
            common::field_maker::text(&qhat, "units", "GeV^2/fm");
            maker.attach(&qhat, "temperature", 0);
            maker.attach(&qhat, "energy", 1);
        }),
        "numbers are read; thin the table",
    );
}

#[test]
fn a_list_of_places() {
    let list = list_of("# places\nweight,x_fm,y_fm\n1,0.5,-2\n0,9,9\n3,1.25,4\n").unwrap();
    let mut stream = Key::event(1, 1).stream(Purpose::ORIGIN);
    let mut counts = [0; 2];
    for _ in 0..1000 {
        match list.draw(&mut stream) {
            [0.5, -2.0] => counts[0] += 1,
            [1.25, 4.0] => counts[1] += 1,
            other => panic!("{other:?} is not in the list, or has no weight"),
        }
    }
    assert!(counts[0] > 0 && counts[1] > 0);
}

#[test]
fn what_is_no_list_is_refused_with_its_line() {
    let header = "x_fm,y_fm,weight\n";
    let starts = |text: &str, start: &str| {
        let found = words(list_of(text));
        assert!(found.starts_with(start), "{found}");
    };
    starts(
        "x,y,w\n1,1,1\n",
        "list.csv:1: the header is \"x,y,w\"; allowed: \"x_fm,y_fm,weight\"; name the columns",
    );
    starts("x_fm,y_fm,x_fm\n", "list.csv:1: the header is");
    starts(&format!("{header}1,2\n"), "list.csv:2: has 2 fields");
    starts(
        &format!("{header}1,2,-1\n"),
        "list.csv:2: weight is \"-1\"; allowed: 0 or more",
    );
    starts(&format!("{header}1,NaN,1\n"), "list.csv:2: y_fm is \"NaN\"");
    starts(
        &format!("{header}1e-15,2e3,1\n"),
        "list.csv:2: y_fm is \"2000\"; allowed: -100 to 100 fm",
    );
    starts(
        &format!("{header}1,2,0\n"),
        "list.csv: the weight of a place is 0 everywhere",
    );
    starts(header, "list.csv: the weight of a place");
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::with_cases(1500) })]

    /// Any bytes, and any text near a table, give a table or words.
    #[test]
    fn no_bytes_make_it_panic(bytes in prop::collection::vec(any::<u8>(), 0..200), text in "[0-9eE.,+#\\n -]{0,120}") {
        let _ = table_of(&bytes);
        let _ = list_of(&bytes);
        let _ = table_of(format!("temperature_GeV,qhat_GeV2_per_fm\n{text}"));
        let _ = table_of(format!("{FULL}{text}"));
        let _ = list_of(format!("x_fm,y_fm,weight\n{text}"));
    }
}
