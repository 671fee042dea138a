//! Tells the program which commit it is built from, as `SPINDRIFT_COMMIT`.
//!
//! It runs again when a source file changes, not at every commit: a program that was built from changed files says
//! "modified" until it is built again.

use std::path::Path;
use std::process::Command;

const INPUTS: [&str; 3] = ["src", "Cargo.toml", "Cargo.lock"];

fn main() {
    for input in INPUTS {
        println!("cargo::rerun-if-changed={input}");
    }
    let commit = commit().unwrap_or_else(|| "unknown".to_owned());
    println!("cargo::rustc-env=SPINDRIFT_COMMIT={commit}");
}

/// The commit of this very repository, not of one that happens to lie around it.
fn commit() -> Option<String> {
    let root = git(&["rev-parse", "--show-toplevel"])?;
    let here = Path::new(env!("CARGO_MANIFEST_DIR")).canonicalize().ok()?;
    if Path::new(&root).canonicalize().ok()? != here {
        return None;
    }
    let commit = git(&["rev-parse", "HEAD"])?;
    let status = ["status", "--porcelain", "--"];
    let changes = git(&[&status[..], &INPUTS[..]].concat())?;
    Some(if changes.is_empty() {
        commit
    } else {
        format!("{commit} modified")
    })
}

fn git(arguments: &[&str]) -> Option<String> {
    let output = Command::new("git").args(arguments).output().ok()?;
    let text = String::from_utf8(output.stdout).ok()?;
    output.status.success().then(|| text.trim().to_owned())
}
