//! What is wrong, where, and what would be right: word for word, since players read nothing else.

use super::file;
use std::fs;
use std::path::Path;
use trued::stage::Stage;

/// With `UPDATE=1` in the environment the expected complaints are written anew, to be read one by one.
#[test]
fn every_mistake_is_told_exactly() {
    let folder = file("tests/stage/bad");
    let mut wrong = Vec::new();
    let mut seen = 0;
    for entry in fs::read_dir(&folder).expect("the folder is there") {
        let path = entry.expect("an entry").path();
        if path.extension().is_none_or(|end| end != "yaml") {
            continue;
        }
        seen += 1;
        let told = complaints(&path);
        let beside = path.with_extension("txt");
        if std::env::var_os("UPDATE").is_some() {
            fs::write(&beside, &told).expect("can be written");
        }
        let name = path.display();
        match fs::read_to_string(&beside) {
            Err(_) => wrong.push(format!("{name} has no .txt beside it")),
            Ok(expected) if expected != told => {
                wrong.push(format!("{name}\nexpected:\n{expected}told:\n{told}"));
            }
            Ok(expected) if expected.is_empty() => {
                wrong.push(format!("{name} is not bad at all"));
            }
            Ok(_) => {}
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
    assert!(seen >= 160, "only {seen} bad files");
}

/// Every `.txt` belongs to a `.yaml`.
#[test]
fn no_expectation_is_left_behind() {
    for entry in fs::read_dir(file("tests/stage/bad")).expect("the folder is there") {
        let path = entry.expect("an entry").path();
        if path.extension().is_some_and(|end| end == "txt") {
            assert!(path.with_extension("yaml").is_file(), "{}", path.display());
        }
    }
}

/// One complaint a line, with the file's name in place of its path.
fn complaints(path: &Path) -> String {
    let Err(complaints) = Stage::read(path) else {
        return String::new();
    };
    let mut told = String::new();
    for mut complaint in complaints {
        if let Some(name) = complaint.file.file_name() {
            complaint.file = name.into();
        }
        told.push_str(&complaint.to_string());
        told.push('\n');
    }
    told
}
