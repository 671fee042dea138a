//! The attributes of an event file, read back and checked.

use std::path::Path;

use hdf5::{File, H5Type};

use super::error::EventFileError;
use super::layout::{
    EXIT_COLUMNS, FORMAT_NAME, FORMAT_VERSION, FULL_MANTISSA_BITS, MOST_FIELDS, Table,
};
use super::provenance::{
    CrossSection, FieldEntry, Kinematics, Provenance, WeightSums, history_from_name,
};
use crate::files::attributes::{get_number, get_text, get_texts, read_texts};

/// The largest deflate level.
const LARGEST_COMPRESSION: i32 = 9;
/// Channels before those of the effects.
const FIXED_CHANNELS: usize = 2;

/// How far the sample has come.
#[derive(Debug)]
pub(super) struct SampleState {
    pub(super) complete: bool,
    pub(super) events_committed: usize,
    pub(super) partons_committed: usize,
    pub(super) sums: WeightSums,
    pub(super) counters: Vec<(String, u64)>,
}

/// Reads all attributes of the file's root, and the lists of channels and fields.
pub(super) fn read_provenance(
    path: &Path,
    file: &File,
) -> Result<(Provenance, SampleState), EventFileError> {
    let reader = AttributeReader { path, file };
    reader.check_format()?;
    let (effects, fields) = (reader.effects()?, reader.fields()?);
    let state = SampleState {
        complete: reader.within("complete", 0, 1)? == 1,
        events_committed: reader.count("events_committed")?,
        partons_committed: reader.count("partons_committed")?,
        sums: WeightSums {
            source_weights: reader.number("sum_of_source_weights")?,
            weights: reader.number("sum_of_weights")?,
            squared_weights: reader.number("sum_of_squared_weights")?,
        },
        counters: reader.counters()?,
    };
    let kept_bits = reader.within("momentum_bits", 1, i32::from(FULL_MANTISSA_BITS))? as u8;
    let unit = reader.text("cross_section_unit")?;
    let value = reader.number("cross_section")?;
    let provenance = Provenance {
        program_version: reader.text("program_version")?,
        commit: reader.text("commit")?,
        command_line: reader.text("command_line")?,
        host: reader.text("host")?,
        created: reader.text("created")?,
        config: reader.text("config")?,
        config_digest: reader.text("config_digest")?,
        seed: reader.number("seed")?,
        first_id: reader.number("first_id")?,
        last_id: reader.number("last_id")?,
        kinematics: reader.choice("kinematics", Kinematics::from_name)?,
        open_colour_lines: reader.within("open_colour_lines", 0, 2)?,
        cross_section: (unit != "none").then_some(CrossSection { value, unit }),
        history: reader.choice("history", history_from_name)?,
        compression: reader.within("compression", 0, LARGEST_COMPRESSION)? as u8,
        momentum_bits: (kept_bits < FULL_MANTISSA_BITS).then_some(kept_bits),
        medium_exit: reader.has_exits()?,
        effects,
        fields,
        counters: state
            .counters
            .iter()
            .map(|(name, _)| name.clone())
            .collect(),
    };
    Ok((provenance, state))
}

struct AttributeReader<'a> {
    path: &'a Path,
    file: &'a File,
}

impl AttributeReader<'_> {
    fn check_format(&self) -> Result<(), EventFileError> {
        let foreign = |reason: String| EventFileError::Foreign {
            path: self.path.to_owned(),
            reason,
        };
        match get_text(self.file, "format").map_err(foreign)? {
            Some(format) if format == FORMAT_NAME => {}
            Some(format) => return Err(foreign(format!("its format is \"{format}\""))),
            None => return Err(foreign("it has no attribute \"format\"".into())),
        }
        let version: i64 = self.number("format_version")?;
        if version == i64::from(FORMAT_VERSION) {
            return Ok(());
        }
        Err(foreign(format!(
            "its format version is {version}, this program reads {FORMAT_VERSION}"
        )))
    }

    fn damaged(&self, name: &str, reason: String) -> EventFileError {
        EventFileError::Damaged {
            path: self.path.to_owned(),
            place: format!("attribute {name}"),
            reason,
        }
    }

    fn present<T>(
        &self,
        name: &str,
        found: Result<Option<T>, String>,
    ) -> Result<T, EventFileError> {
        found
            .map_err(|reason| self.damaged(name, reason))?
            .ok_or_else(|| self.damaged(name, "is missing".into()))
    }

    fn number<T: H5Type + Copy>(&self, name: &str) -> Result<T, EventFileError> {
        self.present(name, get_number(self.file, name))
    }

    fn text(&self, name: &str) -> Result<String, EventFileError> {
        self.present(name, get_text(self.file, name))
    }

    fn within(&self, name: &str, least: i32, most: i32) -> Result<i32, EventFileError> {
        let value: i64 = self.number(name)?;
        match i32::try_from(value) {
            Ok(value) if (least..=most).contains(&value) => Ok(value),
            _ => Err(self.damaged(name, format!("is {value}, must be {least} to {most}"))),
        }
    }

    fn count(&self, name: &str) -> Result<usize, EventFileError> {
        let value: i64 = self.number(name)?;
        usize::try_from(value)
            .map_err(|_| self.damaged(name, format!("is {value}, must not be negative")))
    }

    fn choice<T>(
        &self,
        name: &str,
        from_name: impl Fn(&str) -> Option<T>,
    ) -> Result<T, EventFileError> {
        let text = self.text(name)?;
        from_name(&text).ok_or_else(|| self.damaged(name, format!("\"{text}\" is not known")))
    }

    fn effects(&self) -> Result<Vec<String>, EventFileError> {
        let place = "/partons/channel";
        let column = self.file.dataset(place);
        let column = column.map_err(|error| self.damaged(place, error.to_string()))?;
        let mut names = self.present("names of /partons/channel", get_texts(&column, "names"))?;
        if names.len() < FIXED_CHANNELS {
            return Err(self.damaged(
                "names of /partons/channel",
                format!("holds {} names, at least {FIXED_CHANNELS}", names.len()),
            ));
        }
        Ok(names.split_off(FIXED_CHANNELS))
    }

    /// Whether the table of partons has columns of exits: any of them promises all.
    fn has_exits(&self) -> Result<bool, EventFileError> {
        let name = Table::Partons.group();
        let group = self.file.group(name);
        let group = group.map_err(|error| self.damaged(name, error.to_string()))?;
        Ok(EXIT_COLUMNS
            .iter()
            .any(|column| group.link_exists(column.name)))
    }

    fn fields(&self) -> Result<Vec<FieldEntry>, EventFileError> {
        let list = |name: &str| {
            let place = format!("/fields/{name}");
            let column = self.file.dataset(&place);
            let column = column.map_err(|error| self.damaged(&place, error.to_string()))?;
            if column.size() > MOST_FIELDS {
                let reason = format!("{} fields, at most {MOST_FIELDS}", column.size());
                return Err(self.damaged(&place, reason));
            }
            Ok((place, column))
        };
        let texts = |name: &str| {
            let (place, column) = list(name)?;
            read_texts(&column).map_err(|reason| self.damaged(&place, reason))
        };
        let (names, digests) = (texts("name")?, texts("sha256")?);
        let (place, column) = list("weight")?;
        let weights: Vec<f64> = column
            .read_raw()
            .map_err(|error| self.damaged(&place, error.to_string()))?;
        if names.len() != digests.len() || names.len() != weights.len() {
            return Err(self.damaged("/fields", "its columns differ in length".into()));
        }
        let rows = names.into_iter().zip(digests).zip(weights);
        Ok(rows
            .map(|((name, sha256), weight)| FieldEntry {
                name,
                sha256,
                weight,
            })
            .collect())
    }

    /// The attributes that no other reader claims: unsigned counts.
    fn counters(&self) -> Result<Vec<(String, u64)>, EventFileError> {
        let names = self.file.attr_names();
        let names = names.map_err(|error| self.damaged("list", error.to_string()))?;
        let mut counters = Vec::new();
        for name in names {
            if name == "seed" {
                continue;
            }
            let attribute = self.file.attr(&name);
            let attribute = attribute.map_err(|error| self.damaged(&name, error.to_string()))?;
            if attribute.dtype().is_ok_and(|element| element.is::<u64>()) {
                counters.push((name.clone(), self.number(&name)?));
            }
        }
        Ok(counters)
    }
}
