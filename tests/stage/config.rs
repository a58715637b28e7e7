//! The stage files that come with trued.

use super::file;
use std::fs;
use trued::stage::Stage;

/// What an example shows on purpose.
fn advice_of(name: &str) -> &[&str] {
    match name {
        "evensong.yaml" => &[
            "Lamp hymn a semitone down: `transpose: -1` under an unequal tuning changes the key: G plays F#, with the chords \
             of F#; to sound lower with the chords of G, write `pitch: A4 = 415.30 Hz` in its place",
            "Lamp hymn a semitone down in G: the third G-B is 427.4 c, 41.1 c wide (transposed, it sounds as F#-Bb)",
            "Lamp hymn a semitone down in G: the third C-E is 427.4 c, 41.1 c wide (transposed, it sounds as B-Eb)",
            "Lamp hymn a semitone down in G: the third D-F# is 427.4 c, 41.1 c wide (transposed, it sounds as C#-F)",
        ],
        _ => &[],
    }
}

/// They load, and there is nothing to advise about but what their comments are about: they are what a newcomer copies.
#[test]
fn every_example_stage_loads_clean() {
    let readme = fs::read_to_string(file("README.md")).expect("the README");
    let mut seen = 0;
    for entry in fs::read_dir(file("config")).expect("the folder is there") {
        let path = entry.expect("an entry").path();
        if path.extension().is_none_or(|end| end != "yaml") {
            continue;
        }
        seen += 1;
        let name = path.file_name().expect("a name").to_string_lossy();
        match Stage::read(&path) {
            Ok(stage) => assert_eq!(stage.advice, advice_of(&name), "{name}"),
            Err(complaints) => panic!("{complaints:#?}"),
        }
        let text = fs::read_to_string(&path).expect("can be read");
        assert!(
            text.starts_with("# "),
            "{name} does not say what it teaches"
        );
        assert!(
            readme.contains(&format!("`{name}`")),
            "{name} is not in the README's table"
        );
    }
    assert!(seen >= 9, "only {seen} example stages");
}
