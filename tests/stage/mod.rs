//! Stage files: `bad/*.yaml` beside `bad/*.txt` with the exact complaints, and everything that must load.

mod bad;
mod check;
mod config;
mod forms;
mod good;
mod mangled;
mod plans;

use std::path::{Path, PathBuf};
use trued::stage::Stage;

/// A file of the repository.
fn file(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join(name)
}

/// The stage of a text that must load, as if it stood in `tests/stage/`.
fn load(text: &str) -> Stage {
    match Stage::parse(&file("tests/stage/here.yaml"), text) {
        Ok(stage) => stage,
        Err(complaints) => {
            let told: Vec<String> = complaints.iter().map(ToString::to_string).collect();
            panic!("does not load:\n{}\n---\n{text}", told.join("\n"))
        }
    }
}
