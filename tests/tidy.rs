//! House rules that the compiler does not know: who may know whom, which crate lives where, what the core must not say,
//! how long a file may be. A rule that cannot fail is none, so each is tried on a bad snippet below.

mod paths;

use paths::{Token, functions, named, tokens};
use std::fs;
use std::path::{Path, PathBuf};

/// Who may know whom. Arrows point down the floor plan of `src/lib.rs`.
const ARROWS: &[(&str, &[&str])] = &[
    ("limits", &[]),
    ("time", &[]),
    ("pitch", &["limits"]),
    ("midi", &["pitch", "limits"]),
    ("tuning", &["pitch", "limits"]),
    ("intonation", &["pitch", "tuning", "time", "limits"]),
    (
        "engine",
        &["pitch", "midi", "tuning", "intonation", "time", "limits"],
    ),
    (
        "stage",
        &[
            "engine",
            "midi",
            "tuning",
            "intonation",
            "pitch",
            "time",
            "limits",
        ],
    ),
    // Ports do not know the engine.
    ("ports", &["time", "limits"]),
    // Offline does not know ports.
    (
        "offline",
        &[
            "stage",
            "engine",
            "midi",
            "tuning",
            "intonation",
            "pitch",
            "time",
            "limits",
        ],
    ),
    (
        "daemon",
        &[
            "ports",
            "stage",
            "engine",
            "midi",
            "intonation",
            "tuning",
            "pitch",
            "time",
            "limits",
        ],
    ),
    (
        "cli",
        &[
            "stage", "offline", "daemon", "ports", "midi", "tuning", "pitch", "time", "limits",
        ],
    ),
];

const CORE: &[&str] = &[
    "limits",
    "time",
    "pitch",
    "midi",
    "tuning",
    "intonation",
    "engine",
];

/// Each outside crate and the rooms that may name it.
const CRATES: &[(&str, &[&str])] = &[
    ("alsa", &["ports"]),
    ("clap", &["cli"]),
    ("crossbeam_channel", &["ports"]),
    ("hound", &["offline"]),
    ("jack", &["ports"]),
    ("libc", &["ports", "daemon"]),
    ("midir", &["ports"]),
    ("midly", &["offline"]),
    ("notify", &["stage"]),
    ("rtrb", &["daemon", "ports"]),
    ("rustysynth", &["offline"]),
    ("serde", &["stage", "offline"]),
    ("serde_json", &["offline", "daemon", "cli"]),
    ("serde_yaml", &["stage"]),
    ("signal_hook", &["daemon"]),
    ("tracing", &["stage", "ports", "offline", "daemon", "cli"]),
    ("tracing_subscriber", &["cli"]),
    ("wmidi", &["midi"]),
];

/// Not in the core: the outside world, locks, clocks, and maps whose order changes from run to run.
const BANNED_PATHS: &[&str] = &[
    "std::fs",
    "std::net",
    "std::io",
    "std::thread",
    "std::env",
    "std::process",
    "std::sync",
    "std::time",
];
const BANNED_WORDS: &[&str] = &[
    "Instant",
    "SystemTime",
    "HashMap",
    "HashSet",
    "unsafe",
    "println",
    "eprintln",
    "print",
    "eprint",
    "dbg",
];
/// Where an exact path is allowed all the same.
const ALLOWED: &[(&str, &str)] = &[("engine/plan.rs", "std::sync::Arc")];
/// No floating point here: it decides nothing and reaches no wire. (`pitch`, `tuning` and `time` print for people.)
const WHOLE_NUMBERS_ONLY: &[&str] = &["limits", "midi", "intonation", "engine"];
/// Nowhere in the sources.
const UNFINISHED: &[&str] = &["todo", "unimplemented", "dbg"];
/// The only file that asks what time it is.
const CLOCK: &str = "ports/clock.rs";

const FILE_LINES_MAX: usize = 450;
const FUNCTION_LINES_MAX: usize = 60;

const DOOR_PLATE: &[&str] = &[
    "What this room is",
    "Start reading at",
    "May know",
    "Owns",
    "Not here",
];

const TOP_LEVEL: &[&str] = &[
    "Cargo.toml",
    "Cargo.lock",
    "README.md",
    "DEVELOPERS.md",
    "LICENSE",
    "src",
    "config",
    "tests",
    "systemd",
    ".ci",
    ".gitignore",
];

/// Paths of the machines this was written on; split, so that this file does not name them.
const MACHINES: &[&str] = &[
    concat!("/wo", "rk/"),
    concat!("/ro", "ot/"),
    concat!("/ho", "me/"),
    concat!("/tmp/", "wt"),
];

fn root() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

/// Every file below, by path from there, in order.
fn files(below: &Path) -> Vec<PathBuf> {
    let mut out = Vec::new();
    let mut folders = vec![below.to_owned()];
    while let Some(folder) = folders.pop() {
        for entry in fs::read_dir(&folder).expect("a folder of the repository") {
            let path = entry.expect("an entry").path();
            if path.is_dir() {
                folders.push(path);
            } else {
                out.push(path.strip_prefix(below).expect("below").to_owned());
            }
        }
    }
    out.sort();
    out
}

/// Runs a rule over every Rust file of `src/` and complains of all breaches at once.
fn every_source(rule: impl Fn(&str, &str) -> Vec<String>) {
    let src = root().join("src");
    let mut breaches = Vec::new();
    let mut seen = 0;
    for path in files(&src) {
        let name = path.to_string_lossy().replace('\\', "/");
        if name.ends_with(".rs") {
            let text = fs::read_to_string(src.join(&path)).expect("a source file");
            breaches.extend(
                rule(&name, &text)
                    .into_iter()
                    .map(|b| format!("src/{name}:{b}")),
            );
            seen += 1;
        }
    }
    assert!(
        seen > 20,
        "only {seen} files found: is this the right folder?"
    );
    assert!(breaches.is_empty(), "\n{}\n", breaches.join("\n"));
}

/// `engine` for `engine/plan.rs`, `time` for `time.rs`.
fn room(file: &str) -> &str {
    file.split(['/', '.']).next().unwrap_or(file)
}

/// Folders between `src/` and the module of this file, itself included.
fn depth(file: &str) -> usize {
    let parts = file.trim_end_matches(".rs").split('/');
    parts.filter(|part| *part != "mod").count()
}

fn arrows(file: &str, text: &str) -> Vec<String> {
    let from = room(file);
    if matches!(file, "lib.rs" | "main.rs") {
        return Vec::new();
    }
    let Some((_, known)) = ARROWS.iter().find(|(room, _)| *room == from) else {
        return vec![format!("1: {from} is no room of the floor plan")];
    };
    let mut out = Vec::new();
    for name in named(text) {
        let supers = name.path.iter().take_while(|word| *word == "super").count();
        let to = match name.path.first().map(String::as_str) {
            Some("crate") => name.path.get(1),
            Some("super") if supers >= depth(file) => name.path.get(supers),
            _ => None,
        };
        if let Some(to) = to
            && to != from
            && !known.contains(&to.as_str())
        {
            out.push(format!(
                "{}: {from} may not know {to} ({})",
                name.line,
                name.text()
            ));
        }
    }
    out
}

fn outside_crates(file: &str, text: &str) -> Vec<String> {
    let from = room(file);
    let mut out = Vec::new();
    for name in named(text) {
        let Some((owned, owners)) = CRATES
            .iter()
            .find(|(c, _)| name.path.first().is_some_and(|f| f == c))
        else {
            continue;
        };
        if (name.path.len() > 1 || name.imported) && !owners.contains(&from) {
            out.push(format!(
                "{}: {owned} lives in {} ({})",
                name.line,
                owners.join(", "),
                name.text()
            ));
        }
    }
    out
}

fn banned(file: &str, text: &str) -> Vec<String> {
    let mut out = Vec::new();
    let core = CORE.contains(&room(file));
    for name in named(text) {
        let path = name.text();
        let inside = |banned: &&&str| path == **banned || path.starts_with(&format!("{banned}::"));
        if core
            && BANNED_PATHS.iter().any(|b| inside(&b))
            && !ALLOWED.contains(&(file, path.as_str()))
        {
            out.push(format!("{}: {path} has no place in the core", name.line));
        }
    }
    for (line, token) in tokens(text) {
        let Token::Word(word) = token else { continue };
        let word = word.as_str();
        if core && BANNED_WORDS.contains(&word) {
            out.push(format!("{line}: {word} has no place in the core"));
        }
        if WHOLE_NUMBERS_ONLY.contains(&room(file)) && matches!(word, "f64" | "f32") {
            out.push(format!(
                "{line}: {word} where only whole numbers may decide"
            ));
        }
        if UNFINISHED.contains(&word) {
            out.push(format!("{line}: {word} is unfinished work"));
        }
        if !core && file != CLOCK && matches!(word, "Instant" | "SystemTime") {
            out.push(format!("{line}: {word}: only src/{CLOCK} asks the time"));
        }
    }
    out
}

fn shape(file: &str, text: &str) -> Vec<String> {
    let mut out = Vec::new();
    let lines = text.lines().count();
    if lines > FILE_LINES_MAX {
        out.push(format!("{lines}: {lines} lines; at most {FILE_LINES_MAX}"));
    }
    if !text.starts_with("//!") {
        out.push("1: starts with no word (`//!`) on what it is and why".to_owned());
    }
    if file.ends_with("/mod.rs") {
        let plate: String = text
            .lines()
            .take_while(|line| line.starts_with("//!"))
            .collect();
        for heading in DOOR_PLATE {
            if !plate.contains(&format!("**{heading}**")) {
                out.push(format!("1: the door plate lacks **{heading}**"));
            }
        }
    }
    for (name, first, last) in functions(text) {
        if last - first + 1 > FUNCTION_LINES_MAX {
            out.push(format!(
                "{first}: {name} has {} lines; at most {FUNCTION_LINES_MAX}",
                last - first + 1
            ));
        }
    }
    out
}

#[test]
fn rooms_know_only_whom_they_may() {
    every_source(arrows);
}

#[test]
fn outside_crates_stay_in_their_rooms() {
    every_source(outside_crates);
}

#[test]
fn the_core_keeps_off_the_outside_world() {
    every_source(banned);
}

#[test]
fn files_are_short_and_say_what_they_are() {
    every_source(shape);
}

#[test]
fn every_dependency_has_an_owner() {
    let manifest = fs::read_to_string(root().join("Cargo.toml")).expect("Cargo.toml");
    let mut wanted: Vec<String> = dependencies(&manifest);
    let mut owned: Vec<String> = CRATES.iter().map(|(name, _)| (*name).to_owned()).collect();
    wanted.sort();
    owned.sort();
    assert_eq!(
        wanted, owned,
        "Cargo.toml on the left, the table of tests/tidy.rs on the right"
    );
}

/// Names under every `[…dependencies]` but the tests' own, as Rust spells them.
fn dependencies(manifest: &str) -> Vec<String> {
    let mut out = Vec::new();
    let mut inside = false;
    for line in manifest.lines() {
        if line.starts_with('[') {
            inside = line.ends_with("dependencies]") && line != "[dev-dependencies]";
        } else if let Some((name, _)) = line.split_once('=').filter(|_| inside) {
            out.push(name.trim().replace('-', "_"));
        }
    }
    out
}

#[test]
fn the_top_level_holds_the_fixed_list_and_nothing_more() {
    let ignored = fs::read_to_string(root().join(".gitignore")).expect(".gitignore");
    let mut strangers = Vec::new();
    for entry in fs::read_dir(root()).expect("the repository") {
        let name = entry
            .expect("an entry")
            .file_name()
            .to_string_lossy()
            .into_owned();
        let left_out = name == ".git" || ignored.lines().any(|line| line.trim_matches('/') == name);
        if !left_out && !TOP_LEVEL.contains(&name.as_str()) {
            strangers.push(name);
        }
    }
    assert!(strangers.is_empty(), "not of the fixed list: {strangers:?}");
}

#[test]
fn nothing_names_the_machine_it_was_written_on() {
    let mut breaches = Vec::new();
    for top in TOP_LEVEL {
        let path = root().join(top);
        let found = match (path.is_dir(), path.is_file()) {
            (true, _) => files(&path)
                .into_iter()
                .map(|file| path.join(file))
                .collect(),
            (_, true) => vec![path],
            _ => Vec::new(),
        };
        for file in found {
            let bytes = fs::read(&file).expect("a file of the repository");
            let text = String::from_utf8_lossy(&bytes);
            breaches.extend(machine_paths(&text).map(|path| format!("{}: {path}", file.display())));
        }
    }
    assert!(breaches.is_empty(), "\n{}\n", breaches.join("\n"));
}

fn machine_paths(text: &str) -> impl Iterator<Item = &'static str> {
    MACHINES
        .iter()
        .copied()
        .filter(move |path| text.contains(path))
}

#[test]
fn the_rules_catch_what_they_are_for() {
    let caught = |breaches: Vec<String>, words: &str| {
        assert!(
            breaches.iter().any(|b| b.contains(words)),
            "{words:?} not in {breaches:?}"
        );
    };
    caught(
        arrows("pitch/word.rs", "use crate::{limits, engine::Plan};"),
        "1: pitch may not know engine",
    );
    caught(
        arrows("ports/alsa.rs", "\nfn f() { crate::engine::Engine::new() }"),
        "2: ports may not know engine",
    );
    caught(
        arrows("tuning/key.rs", "use super::super::midi::Message;"),
        "tuning may not know midi",
    );
    caught(
        arrows("offline/mod.rs", "use super::ports::Port;"),
        "offline may not know ports",
    );
    caught(
        arrows("engine/a/b.rs", "use super::super::super::stage;"),
        "engine may not know stage",
    );
    caught(arrows("attic/mod.rs", ""), "attic is no room");
    assert!(
        arrows(
            "engine/a/b.rs",
            "use super::super::stage; use crate::midi::Message;"
        )
        .is_empty()
    );

    caught(
        outside_crates("engine/mod.rs", "use wmidi::MidiMessage;"),
        "wmidi lives in midi",
    );
    caught(
        outside_crates("stage/mod.rs", "fn f() { ::hound::WavWriter::new() }"),
        "hound lives in offline",
    );
    caught(
        outside_crates("stage/mod.rs", "use midly;"),
        "midly lives in offline",
    );
    assert!(outside_crates("ports/mod.rs", "use alsa::seq; mod hound {}").is_empty());

    for (source, words) in [
        ("use std::{fs, fmt};", "std::fs"),
        (
            "fn f() { std::net::TcpStream::connect(\"\"); }",
            "std::net::TcpStream",
        ),
        ("use std::io::Write;", "std::io"),
        ("use std::thread;", "std::thread"),
        ("use std::env::args;", "std::env"),
        ("use std::sync::Mutex;", "std::sync::Mutex"),
        ("use std::time::Duration;", "std::time"),
        ("type A = Instant;", "Instant"),
        ("type A = SystemTime;", "SystemTime"),
        ("fn f() { println!(\"\") }", "println"),
        ("fn f() { eprintln!(\"\") }", "eprintln"),
        ("use std::collections::HashMap;", "HashMap"),
        ("fn f() { unsafe {} }", "unsafe"),
        ("fn f() -> f64 { 0.0 }", "f64"),
        ("fn f() { todo!() }", "todo"),
    ] {
        caught(banned("engine/voices.rs", source), words);
    }
    caught(
        banned("engine/voices.rs", "use std::sync::Arc;"),
        "std::sync::Arc",
    );
    assert!(banned("engine/plan.rs", "use std::sync::Arc;").is_empty());
    caught(
        banned("daemon/mod.rs", "use std::time::Instant;"),
        "only src/ports/clock.rs",
    );
    assert!(banned("daemon/mod.rs", "use std::fs; // Instant").is_empty());

    caught(shape("a.rs", "fn f() {}"), "starts with no word");
    caught(
        shape("a.rs", &"//!\n".repeat(FILE_LINES_MAX + 1)),
        "lines; at most",
    );
    let body = "x();\n".repeat(FUNCTION_LINES_MAX);
    caught(
        shape("a.rs", &format!("//!\nfn long() {{\n{body}}}\n")),
        "2: long has",
    );
    caught(
        shape("a/mod.rs", "//! **What this room is**"),
        "lacks **Start reading at**",
    );

    assert_eq!(
        dependencies(
            "[dependencies]\na-b = 1\n[dev-dependencies]\nc = 1\n[target.x.dependencies]\nd = 1"
        ),
        ["a_b", "d"]
    );
    assert_eq!(machine_paths(&format!("see {}x", MACHINES[0])).count(), 1);
    assert_eq!(
        (
            depth("time.rs"),
            depth("engine/mod.rs"),
            depth("engine/a/b.rs")
        ),
        (1, 1, 3)
    );
}
