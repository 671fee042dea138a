//! The files that a config names: found, hashed, and the small ones read.

use std::path::{Path, PathBuf};

use glob::{MatchOptions, Pattern};
use serde_json::Value;

use super::check::Places;
use super::digest;
use super::error::{ConfigError, Problem, Report};
use super::plan::InputFile;
use crate::files::event_file::MOST_FIELDS;
use crate::files::transport_table::read_transport_table;
use crate::medium::transport::TransportTable;

/// The section of the temperature field.
pub const FIELD: &str = "medium.field";
/// The section of the places of birth.
pub const PLACES: &str = "medium.origin";
/// The section of the transport coefficient.
const TRANSPORT: &str = "medium.transport";

const ALLOWED: &str = "a readable file; its path starts from the folder of the config";
const ALLOWED_PATTERN: &str = "a pattern that matches at least one file: * for any characters but /, ? for one, [abc] for one of some";

/// Every input file of a config.
#[derive(Debug, Default)]
pub struct Inputs {
    named: Vec<Named>,
    table: Option<TransportTable>,
}

/// The files that one key names.
#[derive(Debug)]
struct Named {
    section: &'static str,
    key: &'static str,
    /// Whether the key holds one path, else a list.
    single: bool,
    files: Vec<InputFile>,
}

impl Inputs {
    /// Every file, in the order of the config.
    pub fn files(&self) -> Vec<InputFile> {
        self.named
            .iter()
            .flat_map(|named| named.files.iter().cloned())
            .collect()
    }

    /// The files of a section, in the order of use.
    pub fn paths(&self, section: &str) -> Vec<PathBuf> {
        let named = self.named.iter().filter(|named| named.section == section);
        named
            .flat_map(|named| named.files.iter().map(|file| file.path.clone()))
            .collect()
    }

    /// The one file of a section.
    pub fn path(&self, section: &str) -> PathBuf {
        let mut paths = self.paths(section);
        paths
            .pop()
            .expect("the checker sees to it that the file is named")
    }

    /// The transport table.
    pub fn table(&self) -> TransportTable {
        let table = self.table.clone();
        table.expect("a table that cannot be read is an error of the config")
    }

    /// Where the resolved config names files (JSON pointers), and what stands there in the digest: the hash of a file, or
    /// the list of them.
    pub fn hashes(&self) -> Vec<(String, Value)> {
        let hash = |file: &InputFile| Value::from(format!("sha256:{}", file.sha256));
        self.named
            .iter()
            .map(|named| {
                let pointer = format!("/{}/{}", named.section.replace('.', "/"), named.key);
                let hashes: Vec<_> = named.files.iter().map(hash).collect();
                let value = match &hashes[..] {
                    [one] if named.single => one.clone(),
                    _ => Value::Array(hashes),
                };
                (pointer, value)
            })
            .collect()
    }
}

/// Finds every input file; where nothing else is wrong with the config, hashes them, and reads the transport table.
pub fn find(resolved: &Value, folder: &Path, places: &Places, report: &mut Report) -> Inputs {
    let mut finder = Finder {
        folder,
        places,
        report,
        named: Vec::new(),
    };
    for section in [FIELD, PLACES, TRANSPORT] {
        let path = format!("/{}", section.replace('.', "/"));
        let Some(value) = resolved.pointer(&path) else {
            continue;
        };
        if let Some(name) = value.get("file").and_then(Value::as_str) {
            finder.one(section, name);
        }
        match value.get("files") {
            Some(Value::Array(names)) => finder.list(section, names),
            Some(Value::String(pattern)) => finder.pattern(section, pattern),
            _ => {}
        }
    }
    finder.hash();
    let mut inputs = Inputs {
        named: finder.named,
        table: None,
    };
    if report.is_empty() && !inputs.paths(TRANSPORT).is_empty() {
        match read_transport_table(&inputs.path(TRANSPORT)) {
            Ok(table) => inputs.table = Some(table),
            Err(error) => complain(
                places,
                report,
                &format!("{TRANSPORT}.file"),
                error.to_string(),
                "a table of qhat over temperature, and perhaps energy, as CSV or HDF5",
                "correct the file",
            ),
        }
    }
    inputs
}

fn complain(
    places: &Places,
    report: &mut Report,
    path: &str,
    found: String,
    allowed: &str,
    remedy: &str,
) {
    report.add(|| ConfigError {
        problem: Problem::InputFile,
        line: places.line(path),
        path: path.to_owned(),
        found,
        allowed: allowed.to_owned(),
        remedy: remedy.to_owned(),
        nearest: None,
    });
}

struct Finder<'a, 'p> {
    folder: &'a Path,
    places: &'a Places<'p>,
    report: &'a mut Report,
    named: Vec<Named>,
}

impl Finder<'_, '_> {
    fn one(&mut self, section: &'static str, name: &str) {
        let files = vec![self.file(&format!("{section}.file"), name)];
        self.add(section, "file", files);
    }

    fn list(&mut self, section: &'static str, names: &[Value]) {
        let files = names.iter().enumerate().map(|(place, name)| {
            let name = name.as_str().expect("the checker gives strings");
            self.file(&format!("{section}.files[{place}]"), name)
        });
        let files = files.collect();
        self.add(section, "files", files);
    }

    fn add(&mut self, section: &'static str, key: &'static str, paths: Vec<Option<PathBuf>>) {
        let files = paths.into_iter().flatten().map(|path| InputFile {
            path,
            sha256: String::new(),
        });
        self.named.push(Named {
            section,
            key,
            single: key == "file",
            files: files.collect(),
        });
    }

    /// A file that is there.
    fn file(&mut self, path: &str, name: &str) -> Option<PathBuf> {
        let file = self.folder.join(name);
        let problem = match file.metadata() {
            Ok(about) if about.is_file() => return Some(file),
            Ok(_) => "no regular file".to_owned(),
            Err(error) => error.to_string(),
        };
        let found = format!("{}: {problem}", file.display());
        let remedy = "correct the path, or make the file";
        complain(self.places, self.report, path, found, ALLOWED, remedy);
        None
    }

    /// All files that match, sorted by name.
    fn pattern(&mut self, section: &'static str, pattern: &str) {
        let files = match matching(self.folder, pattern) {
            Ok(files) => files,
            Err(problem) => {
                let found = format!("\"{pattern}\": {problem}");
                let remedy = "correct the pattern, or make the files";
                let path = format!("{section}.files");
                complain(
                    self.places,
                    self.report,
                    &path,
                    found,
                    ALLOWED_PATTERN,
                    remedy,
                );
                Vec::new()
            }
        };
        self.add(section, "files", files.into_iter().map(Some).collect());
    }

    fn hash(&mut self) {
        for named in &mut self.named {
            for (place, file) in named.files.iter_mut().enumerate() {
                if !self.report.is_empty() {
                    return;
                }
                match digest::of_file(&file.path) {
                    Ok(sha256) => file.sha256 = sha256,
                    Err(error) => {
                        let path = if named.single {
                            format!("{}.{}", named.section, named.key)
                        } else {
                            format!("{}.{}[{place}]", named.section, named.key)
                        };
                        let found = format!("{}: {error}", file.path.display());
                        let remedy = "correct the path, or make the file";
                        complain(self.places, self.report, &path, found, ALLOWED, remedy);
                    }
                }
            }
        }
    }
}

/// The regular files that match a pattern, sorted; the pattern starts from `folder`, whose own name is taken as it is.
fn matching(folder: &Path, pattern: &str) -> Result<Vec<PathBuf>, String> {
    if pattern.contains("**") {
        return Err("** would search whole trees of folders".to_owned());
    }
    let whole = if folder.as_os_str().is_empty() || Path::new(pattern).is_absolute() {
        pattern.to_owned()
    } else {
        let folder = folder.to_str().ok_or("the folder's name is no UTF-8")?;
        format!("{}/{pattern}", Pattern::escape(folder))
    };
    let options = MatchOptions {
        case_sensitive: true,
        require_literal_separator: true,
        require_literal_leading_dot: true,
    };
    let found = glob::glob_with(&whole, options).map_err(|error| error.to_string())?;
    let mut files = Vec::new();
    for path in found {
        let path = path.map_err(|error| error.to_string())?;
        if path.is_file() {
            files.push(path);
        }
        if files.len() > MOST_FIELDS {
            return Err(format!("matches more than {MOST_FIELDS} files"));
        }
    }
    if files.is_empty() {
        return Err("matches no file".to_owned());
    }
    files.sort();
    Ok(files)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn patterns_match_sorted_files_in_folders_with_odd_names() {
        let outer = tempfile::tempdir().unwrap();
        let folder = outer.path().join("a [b]*?");
        std::fs::create_dir_all(folder.join("fields/in.h5")).unwrap();
        for name in ["2.h5", "10.h5", "1.h5", ".3.h5", "x.nc"] {
            std::fs::write(folder.join("fields").join(name), "").unwrap();
        }
        let names = |pattern: &str| {
            let files = matching(&folder, pattern)?;
            let name = |file: &PathBuf| file.file_name().unwrap().to_str().unwrap().to_owned();
            Ok::<Vec<_>, String>(files.iter().map(name).collect())
        };
        assert_eq!(names("fields/*.h5").unwrap(), ["1.h5", "10.h5", "2.h5"]);
        assert_eq!(names("fields/?.h5").unwrap(), ["1.h5", "2.h5"]);
        assert_eq!(names("fields/[!1]*").unwrap(), ["2.h5", "x.nc"]);
        assert_eq!(names("fields/x.nc").unwrap(), ["x.nc"]);
        for (pattern, words) in [
            ("*.h5", "no file"),
            ("**/*.h5", "trees"),
            ("fields/[", "invalid"),
            ("absent/*", "no file"),
        ] {
            let problem = names(pattern).unwrap_err();
            assert!(problem.contains(words), "{pattern}: {problem}");
        }
    }
}
