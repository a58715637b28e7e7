//! `trued` as typed at a shell: what it writes, what it says, how it ends.

use std::fs;
use std::path::{Path, PathBuf};
use std::process::Command;

/// A folder of its own for one test, gone afterwards.
struct Folder(PathBuf);

impl Folder {
    fn new(name: &str) -> Folder {
        let path = std::env::temp_dir().join(format!("trued-{name}-{}", std::process::id()));
        let _ = fs::remove_dir_all(&path);
        fs::create_dir_all(&path).expect("a place for files");
        Folder(path)
    }

    fn at(&self, name: &str) -> PathBuf {
        self.0.join(name)
    }
}

impl Drop for Folder {
    fn drop(&mut self) {
        let _ = fs::remove_dir_all(&self.0);
    }
}

/// Exit code, standard output, standard error.
fn trued(folder: &Path, arguments: &[&str]) -> (i32, String, String) {
    let output = Command::new(env!("CARGO_BIN_EXE_trued"))
        .args(arguments)
        .current_dir(folder)
        .output()
        .expect("the binary under test");
    let text = |bytes: Vec<u8>| String::from_utf8(bytes).expect("UTF-8");
    let code = output.status.code().expect("it ended by itself");
    (code, text(output.stdout), text(output.stderr))
}

const STAGE: &str = "\
stage: Test
synths: {organ: {port: virtual}}
set:
  - {song: Lantern hymn, tuning: quarter-comma-meantone}
  - {song: Harbour tag, tuning: equal-12}
";

/// Middle C for a second.
const SCORE: &[u8] =
    b"MThd\0\0\0\x06\0\0\0\x01\x01\xE0MTrk\0\0\0\x0D\0\x90\x3C\x40\x87\x40\x80\x3C\0\0\xFF\x2F\0";

#[test]
fn every_command_helps_with_an_example() {
    let here = Folder::new("help");
    for command in [
        "rehearse", "run", "check", "chart", "retune", "ports", "tell", "status",
    ] {
        let (code, out, err) = trued(&here.0, &[command, "--help"]);
        assert_eq!((code, err.as_str()), (0, ""), "{command}");
        assert!(
            out.contains(&format!("\n  trued {command}")),
            "{command}: {out}"
        );
    }
    let (code, out, _) = trued(&here.0, &["--help"]);
    assert_eq!(code, 0);
    assert!(out.contains("Examples:") && out.contains("trued rehearse"));
    let (code, out, err) = trued(&here.0, &["dance"]);
    assert_eq!((code, out.as_str()), (64, ""));
    assert!(err.contains("dance"));
}

#[test]
fn retune_writes_by_the_ending_and_says_what_is_wrong() {
    let here = Folder::new("retune");
    fs::write(here.at("stage.yaml"), STAGE).unwrap();
    fs::write(here.at("bad.yaml"), "stage: Test\nset: 12\n").unwrap();
    fs::write(here.at("in.mid"), SCORE).unwrap();
    fs::write(here.at("bad.mid"), &SCORE[..30]).unwrap();
    let (code, out, err) = trued(
        &here.0,
        &[
            "retune",
            "stage.yaml",
            "in.mid",
            "a.mid",
            "a.WAV",
            "a.svg",
            "a.jsonl",
        ],
    );
    assert_eq!((code, out.as_str(), err.as_str()), (0, "", ""));
    assert_eq!(fs::read(here.at("a.mid")).unwrap()[..4], *b"MThd");
    assert_eq!(fs::read(here.at("a.WAV")).unwrap()[..4], *b"RIFF");
    assert!(
        fs::read_to_string(here.at("a.svg"))
            .unwrap()
            .starts_with("<svg")
    );
    assert_eq!(
        fs::read_to_string(here.at("a.jsonl"))
            .unwrap()
            .lines()
            .count(),
        1
    );
    for (arguments, code, words) in [
        (
            ["stage.yaml", "in.mid", "a.mp3", ""],
            64,
            ".mid, .wav, .svg or .jsonl",
        ),
        (
            ["stage.yaml", "in.mid", "a", ""],
            64,
            ".mid, .wav, .svg or .jsonl",
        ),
        (
            ["stage.yaml", "in.mid", "b.mid", "--song=Other"],
            64,
            "Lantern hymn, Harbour tag",
        ),
        (
            ["stage.yaml", "in.mid", "b.mid", "--from=pads"],
            64,
            "no keyboard 'pads'",
        ),
        (["bad.yaml", "in.mid", "b.mid", ""], 65, "bad.yaml:2:"),
        (
            ["stage.yaml", "bad.mid", "b.mid", ""],
            65,
            "bad.mid: track 1",
        ),
        (
            ["none.yaml", "in.mid", "b.mid", ""],
            66,
            "none.yaml: there is no such file",
        ),
        (
            ["stage.yaml", "none.mid", "b.mid", ""],
            66,
            "none.mid: there is no such file",
        ),
        (
            ["stage.yaml", "in.mid", "nowhere/b.mid", ""],
            74,
            "cannot be written",
        ),
    ] {
        let given: Vec<&str> = ["retune"]
            .into_iter()
            .chain(arguments)
            .filter(|a| !a.is_empty())
            .collect();
        let (got, out, err) = trued(&here.0, &given);
        assert_eq!((got, out.as_str()), (code, ""), "{given:?}: {err}");
        assert!(err.contains(words), "{given:?}: {err}");
        assert!(!here.at("b.mid").exists(), "{given:?}");
    }
}

#[test]
fn retune_begins_with_the_song_asked_for() {
    let here = Folder::new("song");
    fs::write(here.at("stage.yaml"), STAGE).unwrap();
    fs::write(here.at("in.mid"), SCORE).unwrap();
    let mut heard = Vec::new();
    for song in ["Lantern hymn", "harbour tag"] {
        let (code, _, err) = trued(
            &here.0,
            &["retune", "stage.yaml", "in.mid", "a.jsonl", "--song", song],
        );
        assert_eq!(code, 0, "{err}");
        let line: serde_json::Value =
            serde_json::from_str(fs::read_to_string(here.at("a.jsonl")).unwrap().trim()).unwrap();
        heard.push(line["target_cents"].as_f64().unwrap());
    }
    // In meantone A is 889.735 cents above C, so with A4 = 440 Hz C4 stands at 6010.265. (Aron 1523 by construction: a fifth is the fourth root of 5.)
    assert!((heard[0] - 6010.265).abs() < 0.001, "{heard:?}");
    assert_eq!(heard[1], 6000.0);
}

#[test]
fn rehearse_writes_its_demo_and_never_over_an_edited_one() {
    let here = Folder::new("rehearse");
    let (code, out, err) = trued(&here.0, &["rehearse"]);
    assert_eq!((code, err.as_str()), (0, ""), "{out}");
    for name in [
        "stage.yaml",
        "score.mid",
        "rehearsal.mid",
        "rehearsal.wav",
        "rehearsal.svg",
        "rehearsal.jsonl",
    ] {
        assert!(here.at("rehearsal").join(name).exists(), "{name}");
    }
    assert!(
        out.contains("C4-E4 400.0") && out.contains("no beats"),
        "{out}"
    );
    assert!(out.contains("Volume down") && out.contains("trued ports --stage > evening.yaml"));
    let stage = here.at("rehearsal/stage.yaml");
    let edited = fs::read_to_string(&stage)
        .unwrap()
        .replace("five-limit-scale", "werckmeister-3");
    fs::write(&stage, &edited).unwrap();
    let (code, out, err) = trued(&here.0, &["rehearse"]);
    assert_eq!((code, out.as_str()), (64, ""));
    assert!(err.contains("trued rehearse rehearsal/stage.yaml"), "{err}");
    assert_eq!(fs::read_to_string(&stage).unwrap(), edited);
    let (code, out, err) = trued(&here.0, &["rehearse", "rehearsal/stage.yaml"]);
    assert_eq!(code, 0, "{err}");
    // Werckmeister's C-E is 390.225 cents. (Dupont 1935, p. 79, has 390; the demo said 386.31)
    assert!(
        out.contains("werckmeister-3") && out.contains("C4-E4 390.2"),
        "{out}"
    );
    assert!(
        !out.contains("has stopped"),
        "what we wrote about our own tuning: {out}"
    );
}

#[test]
fn rehearse_measures_a_players_own_stage_and_score() {
    let here = Folder::new("own");
    fs::write(here.at("stage.yaml"), STAGE).unwrap();
    // C and E for two seconds.
    let score = b"MThd\0\0\0\x06\0\0\0\x01\x01\xE0MTrk\0\0\0\x15\
        \0\x90\x3C\x40\0\x90\x40\x40\x8F\0\x80\x3C\0\0\x80\x40\0\0\xFF\x2F\0";
    fs::write(here.at("two.mid"), score).unwrap();
    let (code, out, err) = trued(
        &here.0,
        &["rehearse", "stage.yaml", "two.mid", "--out", "heard"],
    );
    assert_eq!((code, err.as_str()), (0, ""), "{out}");
    assert!(
        out.contains("C4 E4 (Lantern hymn, quarter-comma-meantone). Measured: C4-E4 386.3"),
        "{out}"
    );
    assert!(here.at("heard/rehearsal.wav").exists());
    assert!(!here.at("heard/stage.yaml").exists());
    let (code, _, err) = trued(&here.0, &["rehearse", "--live"]);
    assert_eq!(code, 64);
    assert!(err.contains("--live"));
}
