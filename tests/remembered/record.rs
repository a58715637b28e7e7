//! What stands in the file, and what is made of one that is damaged, foreign, of another evening or out of date.

use super::{TITLES, evening, only_file, stage_of, stage_with, state};
use crate::control::stand::Folder;
use std::path::Path;
use trued::daemon::remember::record::{Evening, Found, State, decode, encode};
use trued::daemon::remember::{Memory, Resumed};
use trued::engine::{Command, Engine, Input, Nudge};
use trued::pitch::Interval;
use trued::time::Time;

fn lament() -> State {
    State {
        place: 2,
        title: "Lament".to_string(),
        nudge: Interval::from_cents(13),
        ..State::default()
    }
}

/// A file with this between its first line and its checksum; FNV-1a is written out once more here.
fn file_with(version: &str, body: &str) -> Vec<u8> {
    let text = format!("trued remembers here how things stood: version {version}\n{body}\n");
    let mut hash = 14_695_981_039_346_656_037u64;
    for byte in text.bytes() {
        hash = (hash ^ u64::from(byte)).wrapping_mul(1_099_511_628_211);
    }
    format!("{text}check {hash:016x}\n").into_bytes()
}

#[test]
fn what_is_written_is_read_again() {
    for number in 0..200 {
        let bytes = encode(&evening(), &state(number));
        assert_eq!(decode(&bytes), Found::Good(evening(), state(number)));
    }
    let odd = State {
        title: "\"Höhe\"\\ \n{check 0}".to_string(),
        nudge: Interval::from_microcents(-1_200_000_000),
        transposed: Some(-128),
        ..state(3)
    };
    let of = Evening {
        file: "/evening/\n.yaml".to_string(),
        stage: "check 0".to_string(),
    };
    assert_eq!(decode(&encode(&of, &odd)), Found::Good(of, odd));
}

#[test]
fn no_cut_and_no_changed_byte_goes_unnoticed() {
    let good = encode(&evening(), &lament());
    for cut in 0..good.len() {
        assert_eq!(decode(&good[..cut]), Found::Damaged, "cut at {cut}");
    }
    for at in 0..good.len() {
        for change in [1, 2, 0x20, 0x80, 0xFF] {
            let mut bytes = good.clone();
            bytes[at] ^= change;
            // Figures of the checksum may be written in capitals; that is no damage.
            let harmless = bytes.eq_ignore_ascii_case(&good) && at > good.len() - 18;
            assert!(harmless || decode(&bytes) == Found::Damaged, "byte {at}");
        }
    }
    assert_eq!(decode(&[&good[..], b"\n"].concat()), Found::Damaged);
}

#[test]
fn unknown_fields_are_passed_over_and_missing_ones_are_as_a_song_begins() {
    let start = r#""file": "/evening/stage.yaml", "stage": "Evening""#;
    let read = |rest: &str| decode(&file_with("1", &format!("{{{start}, {rest}}}")));
    let bare = State {
        title: "Ballad".to_string(),
        ..State::default()
    };
    assert_eq!(read(r#""title": "Ballad""#), Found::Good(evening(), bare));
    assert_eq!(
        read(r#""song": 3, "title": "Lament", "pitch_microcents": 13000000, "weather": [1, {}]"#),
        Found::Good(evening(), lament())
    );
    for wrong in [
        r#""song": 3"#,
        r#""title": 3"#,
        r#""title": "Lament", "song": 0"#,
        r#""title": "Lament", "song": 70000"#,
        r#""title": "Lament", "song": 1.5"#,
        r#""title": "Lament", "pitch_microcents": "13""#,
        r#""title": "Lament", "transpose_keys": 128"#,
        r#""title": "Lament", "plain": 1"#,
        r#""title": "Lament", "by_hand": "plain""#,
        r#""title": "Lament", "by_hand": [1]"#,
        r#""title": "Lament", "tonic": 62"#,
        r#""title": "Lament", "tonic": {"key": 300, "anchor": 69, "anchor_microcents": 0}"#,
        r#""title": "Lament"} {"#,
    ] {
        assert_eq!(read(wrong), Found::Damaged, "{wrong}");
    }
    assert_eq!(decode(&file_with("1", "[]")), Found::Damaged);
    assert_eq!(decode(&file_with("2", "anything")), Found::Foreign);
}

#[test]
fn the_song_is_found_where_it_is_now() {
    let find = |place: u16, title: &str, set: &[&str]| {
        let state = State {
            place,
            title: title.to_string(),
            ..lament()
        };
        let found = state.found_in(set)?;
        assert_eq!(found.nudge, state.nudge);
        Some(found.place)
    };
    assert_eq!(find(2, "Lament", &TITLES), Some(2));
    assert_eq!(find(1, "Ballad", &TITLES), Some(1), "the first of two");
    assert_eq!(find(4, "Ballad", &TITLES), Some(4), "the second of two");
    assert_eq!(find(2, "Ballad", &TITLES), Some(1), "the nearest of two");
    assert_eq!(find(9, "Ballad", &TITLES), Some(4));
    assert_eq!(find(2, "Lament", &["Lament"]), Some(0));
    assert_eq!(find(2, "lament", &TITLES), None);
    assert_eq!(find(0, "", &[]), None);
}

#[test]
fn a_fresh_engine_is_brought_there() {
    let text = "stage: Evening
set:
  - {song: Lantern hymn, tuning: vallotti}
  - {song: Ballad, tuning: equal-12, transpose: 3}
  - {song: Lament, tuning: equal-12}
";
    let stage = stage_of(text);
    let titles: Vec<String> = stage.set.iter().map(|song| song.title.clone()).collect();
    for transposed in [None, Some(0), Some(3), Some(-2)] {
        for (place, title) in titles.iter().enumerate() {
            for (nudge, plain) in [(0, false), (13_250, true), (-1, false)] {
                let wanted = State {
                    place: place as u16,
                    title: title.clone(),
                    nudge: Interval::from_microcents(nudge),
                    transposed,
                    plain,
                    ..State::default()
                };
                let mut engine = Engine::new(stage.plan());
                for command in wanted.commands() {
                    engine.handle_input(Time::START, Input::Command(command));
                }
                let place = engine.report().song;
                assert_eq!(State::of(place, &engine.told(), &titles, &[]), wanted);
                engine.handle_input(Time::START, Input::Command(Command::Fresh));
                let fresh = State::of(0, &engine.told(), &titles, &[]);
                assert_eq!(engine.report().song, 0);
                assert!(fresh.is_fresh() && fresh.commands().is_empty());
                assert_eq!(engine.report().counters.ignored, 0);
            }
        }
    }
}

/// A daemon's memory for its whole life, without the daemon.
fn remember(folder: &Path, daemon: &str, of: &Evening, state: &State) {
    let mut memory = Memory::new(Path::new(&of.file), daemon, Some(folder));
    memory.resume(&stage_with(&of.stage, &TITLES));
    memory.look(Time::START, &of.stage, state.clone());
    memory.finish(Time::START);
}

fn resumed(folder: &Path, daemon: &str, of: &Evening, set: &[&str]) -> Resumed {
    let mut memory = Memory::new(Path::new(&of.file), daemon, Some(folder));
    memory.resume(&stage_with(&of.stage, set))
}

#[test]
fn it_is_announced_and_is_of_one_stage_file_one_stage_and_one_daemon_only() {
    let folder = Folder::new("remembered-of");
    let state = folder.at("deep/er/trued");
    remember(&state, "trued", &evening(), &lament());
    let again = resumed(&state, "trued", &evening(), &TITLES);
    let said = "resumed: song 3 \"Lament\", pitch +13 c, from before the restart";
    assert_eq!(again.said.as_deref(), Some(said));
    let nudge = Command::Pitch {
        to: Nudge::By(Interval::from_cents(13)),
        held_too: false,
    };
    assert_eq!(again.commands, [Command::Song(2), nudge]);

    let nothing = Resumed::default();
    assert_eq!(resumed(&state, "left", &evening(), &TITLES), nothing);
    let elsewhere = Evening {
        file: "/morning/stage.yaml".to_string(),
        ..evening()
    };
    assert_eq!(resumed(&state, "trued", &elsewhere, &TITLES), nothing);
    let refused = |stage: &str, set: &[&str], why: &str| {
        let of = Evening {
            stage: stage.to_string(),
            ..evening()
        };
        let resumed = resumed(&state, "trued", &of, set);
        let said = resumed.said.unwrap_or_default();
        assert!(
            said.starts_with("not resumed: what is remembered in "),
            "{said}"
        );
        assert!(said.ends_with(why), "{said}");
        assert_eq!(resumed.commands, []);
    };
    let other = "is of another stage, \"Evening\" from /evening/stage.yaml";
    refused("Matinee", &TITLES, other);
    let gone = "is of \"Lament\", which is not in the set now";
    refused("Evening", &["Ballad", "Harbour tag"], gone);
}

#[test]
fn damage_is_told_once_and_mended_by_the_next_writing() {
    let folder = Folder::new("remembered-damaged");
    let state = folder.at("state");
    let said = |said: &str| {
        resumed(&state, "trued", &evening(), &TITLES)
            .said
            .is_some_and(|text| text.ends_with(said))
    };
    remember(&state, "trued", &evening(), &lament());
    let file = only_file(&state, "remembered-").expect("written");
    for (bytes, words) in [
        (&b""[..], "is damaged"),
        (&[0; 4096], "is damaged"),
        (&vec![b'x'; 1 << 20], "is damaged"),
        (&file_with("2", "{}"), "was written by another version"),
    ] {
        std::fs::write(&file, bytes).expect("written");
        assert!(said(words), "{words}");
        remember(&state, "trued", &evening(), &lament());
        assert!(said("from before the restart"));
    }
    std::fs::remove_file(&file).expect("removed");
    std::fs::create_dir(&file).expect("a folder of that name");
    assert!(
        resumed(&state, "trued", &evening(), &TITLES)
            .said
            .is_some_and(|text| text.contains(" cannot be read ("))
    );
}

#[test]
fn a_folder_that_cannot_be_written_harms_nothing() {
    let folder = Folder::new("remembered-nowhere");
    let state = folder.at("state");
    // A file stands where the folder should be: nobody, not even root, can write there.
    std::fs::write(&state, "").expect("written");
    let mut memory = Memory::new(Path::new("/evening/stage.yaml"), "trued", Some(&state));
    memory.resume(&stage_with("Evening", &TITLES));
    for second in 0..100 {
        memory.look(
            Time::from_millis(second * 1_000),
            "Evening",
            super::state(second),
        );
    }
    memory.finish(Time::from_millis(100_000));
    memory.forget();
    assert_eq!(std::fs::read(&state).expect("still there"), b"");
    // Nor is a place for it needed.
    let mut memory = Memory::new(Path::new("/evening/stage.yaml"), "trued", None);
    assert_eq!(
        memory.resume(&stage_with("Evening", &TITLES)),
        Resumed::default()
    );
    assert!(!memory.look(Time::START, "Evening", lament()));
    assert!(memory.look(Time::START, "Evening", super::state(1)));
    memory.finish(Time::START);
    memory.forget();
}
