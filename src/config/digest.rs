//! SHA-256 of input files and of the resolved config.

use std::fs::File;
use std::io::{self, Read};
use std::path::Path;

use serde_json::Value;
use sha2::{Digest, Sha256};

const BUFFER_BYTES: usize = 1 << 16;

/// Keys of the top level that do not belong to what a sample is.
const LEFT_OUT: [&str; 1] = ["events"];

/// SHA-256 (hex) of a file, read in pieces.
pub fn of_file(path: &Path) -> io::Result<String> {
    let mut file = File::open(path)?;
    let mut hasher = Sha256::new();
    let mut buffer = vec![0; BUFFER_BYTES];
    loop {
        match file.read(&mut buffer) {
            Ok(0) => return Ok(hex(hasher)),
            Ok(read) => hasher.update(&buffer[..read]),
            Err(error) if error.kind() == io::ErrorKind::Interrupted => {}
            Err(error) => return Err(error),
        }
    }
}

/// SHA-256 (hex) of a resolved config, without the number of events, with the names of input files (at JSON pointers)
/// replaced by their hashes.
pub fn of_config(resolved: &Value, inputs: &[(String, Value)]) -> String {
    let mut config = resolved.clone();
    if let Value::Object(members) = &mut config {
        members.retain(|key, _| !LEFT_OUT.contains(&key.as_str()));
    }
    for (pointer, hashes) in inputs {
        if let Some(value) = config.pointer_mut(pointer) {
            *value = hashes.clone();
        }
    }
    let mut text = String::new();
    write_canonical(&config, &mut text);
    let mut hasher = Sha256::new();
    hasher.update(text.as_bytes());
    hex(hasher)
}

fn hex(hasher: Sha256) -> String {
    hasher
        .finalize()
        .iter()
        .map(|byte| format!("{byte:02x}"))
        .collect()
}

/// JSON with sorted keys, no blanks, and floats as their shortest exact digits with an exponent.
fn write_canonical(value: &Value, text: &mut String) {
    match value {
        Value::Object(members) => {
            let mut keys: Vec<_> = members.keys().collect();
            keys.sort();
            text.push('{');
            for (place, key) in keys.into_iter().enumerate() {
                separate(place, text);
                text.push_str(&Value::from(key.as_str()).to_string());
                text.push(':');
                write_canonical(&members[key], text);
            }
            text.push('}');
        }
        Value::Array(items) => {
            text.push('[');
            for (place, item) in items.iter().enumerate() {
                separate(place, text);
                write_canonical(item, text);
            }
            text.push(']');
        }
        Value::Number(number) => match number.as_u64() {
            Some(integer) => text.push_str(&integer.to_string()),
            None => {
                let float = number.as_f64().expect("a checked number is a double");
                text.push_str(&format!("{float:e}"));
            }
        },
        Value::Null | Value::Bool(_) | Value::String(_) => text.push_str(&value.to_string()),
    }
}

fn separate(place: usize, text: &mut String) {
    if place > 0 {
        text.push(',');
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use serde_json::json;
    use std::io::Write;

    #[test]
    fn canonical_form_sorts_and_fixes_numbers() {
        let mut text = String::new();
        write_canonical(
            &json!({"b": [1, 2.5, -0.125, 1e300], "a": {"y": null, "x": "q\""}}),
            &mut text,
        );
        assert_eq!(
            text,
            r#"{"a":{"x":"q\"","y":null},"b":[1,2.5e0,-1.25e-1,1e300]}"#
        );
    }

    #[test]
    fn the_digest_sees_files_and_values_but_not_events() {
        let config = json!({"events": 1, "seed": 1, "medium": {"field": {"file": "a.h5"}}});
        let mut other = config.clone();
        other["events"] = json!(2);
        other["medium"]["field"]["file"] = json!("b.h5");
        let digest = |config: &Value, sha: &str| {
            of_config(config, &[("/medium/field/file".to_owned(), json!(sha))])
        };
        assert_eq!(digest(&config, "00"), digest(&other, "00"));
        assert_ne!(digest(&config, "00"), digest(&config, "01"));
        other["seed"] = json!(2);
        assert_ne!(digest(&config, "00"), digest(&other, "00"));
    }

    #[test]
    fn the_digest_of_a_file_is_the_published_one() {
        // FIPS 180-4, example of the one-block message "abc".
        let mut file = tempfile::NamedTempFile::new().unwrap();
        file.write_all(b"abc").unwrap();
        assert_eq!(
            of_file(file.path()).unwrap(),
            "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"
        );
    }
}
