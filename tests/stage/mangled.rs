//! Whatever is typed, it is read or complained about: never a panic, never a bad file without a complaint.

use super::file;
use std::fs;
use std::path::Path;
use std::time::Instant;
use trued::stage::Stage;

/// Signs that mean something to YAML or to us.
const SIGNS: [&str; 18] = [
    "", "\n", "\t", ":", ": ", "#", " #", "\"", "'", "[", "]", "{", "}", ",", "*", "&", "- ", "é",
];

/// Every example and every bad file, with one sign put in or taken out at places all over it.
#[test]
fn one_sign_more_or_less_is_never_the_end() {
    let mut tried = 0;
    for folder in ["config", "tests/stage/bad"] {
        for entry in fs::read_dir(file(folder)).expect("the folder is there") {
            let path = entry.expect("an entry").path();
            if path.extension().is_none_or(|end| end != "yaml") {
                continue;
            }
            let text = fs::read_to_string(&path).expect("is text");
            // A prime step, so that every kind of place has its turn in some file.
            for (round, (at, sign)) in text.char_indices().step_by(7).enumerate() {
                let put = SIGNS[(round + at) % SIGNS.len()];
                let taken = format!("{}{put}{}", &text[..at], &text[at + sign.len_utf8()..]);
                let added = format!("{}{put}{}", &text[..at], &text[at..]);
                read(&path, &taken);
                read(&path, &added);
                tried += 2;
            }
        }
    }
    println!("{tried} texts");
    assert!(tried > 5_000, "only {tried}");
}

fn read(path: &Path, text: &str) {
    if let Err(complaints) = Stage::parse(path, text) {
        assert!(!complaints.is_empty(), "no complaint about\n{text}");
        for complaint in complaints {
            assert!(complaint.line > 0 && complaint.column > 0, "{complaint}");
            assert!(!complaint.wrong.is_empty() && !complaint.right.is_empty());
        }
    }
}

#[test]
fn texts_made_to_hurt_are_refused_soon() {
    let deep = format!("set: {}", "[".repeat(5_000));
    let deep_closed = format!("set: {}x{}", "[".repeat(5_000), "]".repeat(5_000));
    let mut bomb = String::from("a0: &a0 [x, x, x, x, x, x, x, x, x, x]\n");
    for level in 1..12 {
        let below = format!("*a{}, ", level - 1).repeat(10);
        bomb.push_str(&format!("a{level}: &a{level} [{below}]\n"));
    }
    let all_wrong: String = (0..500)
        .map(|number| format!("  - {{song: S{number}, tuning: nothing-like-it, tonick: D}}\n"))
        .collect();
    for (name, text) in [
        ("deep", deep),
        ("deep and closed", deep_closed),
        ("bomb", bomb),
        ("all wrong", format!("set:\n{all_wrong}")),
        ("one long line", format!("stage: {}", "x".repeat(1_000_000))),
        ("nothing but dashes", "- ".repeat(10_000)),
    ] {
        let before = Instant::now();
        let read = Stage::parse(&file("tests/stage/here.yaml"), &text);
        let took = before.elapsed();
        println!("{name}: {took:?}");
        assert!(read.is_err(), "{name}");
        // A reload while playing waits no longer than this, on a machine far slower than the one it was tried on.
        assert!(took.as_secs() < 60, "{name} took {took:?}");
    }
}

#[test]
fn a_set_has_its_limit() {
    let set: String = (0..513).map(|_| "  - A song\n").collect();
    let text = format!("songs: {{A song: }}\nset:\n{set}");
    let told = Stage::parse(&file("tests/stage/here.yaml"), &text)
        .err()
        .expect("too many");
    assert_eq!(told.len(), 1);
    assert_eq!(
        (told[0].line, told[0].wrong.as_str()),
        (515, "there are 513 songs tonight")
    );
    let book: String = (0..513)
        .map(|number| format!("  Song {number}: {{}}\n"))
        .collect();
    let text = format!("songs:\n{book}");
    let told = Stage::parse(&file("tests/stage/here.yaml"), &text)
        .err()
        .expect("too many");
    assert_eq!(told[0].right, "a set holds at most 512");
}

#[test]
fn a_file_that_is_not_text_says_so() {
    let folder = std::env::temp_dir().join(format!("trued-not-text-{}", std::process::id()));
    fs::create_dir_all(&folder).expect("can be made");
    let path = folder.join("stage.yaml");
    fs::write(&path, b"stage: First \xFF light\n").expect("can be written");
    let told = Stage::read(&path).err().expect("it is bad");
    fs::remove_dir_all(&folder).expect("can be removed");
    assert_eq!(told.len(), 1);
    assert_eq!(
        (told[0].wrong.as_str(), told[0].right.as_str()),
        ("is not UTF-8 text", "save it as UTF-8")
    );
    let nowhere = Stage::read(&folder.join("nowhere.yaml"))
        .err()
        .expect("it is not there");
    assert_eq!(nowhere[0].wrong, "there is no such file");
}
