//! Stage files that are right and far from obvious: what they advise, word for word; nothing where no `.txt` stands beside.

use super::file;
use std::fs;
use trued::stage::Stage;

/// With `UPDATE=1` in the environment the expected advice is written anew, to be read line by line.
#[test]
fn what_is_right_loads_and_advises_exactly() {
    let mut wrong = Vec::new();
    let mut seen = 0;
    for entry in fs::read_dir(file("tests/stage/good")).expect("the folder is there") {
        let path = entry.expect("an entry").path();
        if path.extension().is_none_or(|end| end != "yaml") {
            continue;
        }
        seen += 1;
        let advice = match Stage::read(&path) {
            Ok(stage) => stage.advice,
            Err(complaints) => panic!("{complaints:#?}"),
        };
        let told: String = advice.iter().map(|line| format!("{line}\n")).collect();
        let beside = path.with_extension("txt");
        if std::env::var_os("UPDATE").is_some() && !told.is_empty() {
            fs::write(&beside, &told).expect("can be written");
        }
        let expected = fs::read_to_string(&beside).unwrap_or_default();
        if expected != told {
            wrong.push(format!(
                "{}\nexpected:\n{expected}told:\n{told}",
                path.display()
            ));
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
    assert!(seen >= 14, "only {seen} good files");
}
