//! The stage files that come with trued.

use super::file;
use std::fs;
use trued::stage::Stage;

/// They load, and there is nothing to advise about: they are what a newcomer copies.
#[test]
fn every_example_stage_loads_clean() {
    let mut seen = 0;
    for entry in fs::read_dir(file("config")).expect("the folder is there") {
        let path = entry.expect("an entry").path();
        if path.extension().is_none_or(|end| end != "yaml") {
            continue;
        }
        seen += 1;
        match Stage::read(&path) {
            Ok(stage) => assert_eq!(stage.advice, [""; 0], "{}", path.display()),
            Err(complaints) => panic!("{complaints:#?}"),
        }
        let text = fs::read_to_string(&path).expect("can be read");
        assert!(
            text.starts_with("# "),
            "{} does not say what it teaches",
            path.display()
        );
    }
    assert!(seen >= 4, "only {seen} example stages");
}
