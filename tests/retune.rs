//! MIDI files through the engine: times, tracks and lines that come out.

use super::support::plans;
use std::sync::Arc;
use trued::engine::Plan;
use trued::engine::plan::{Act, ChannelSet, CuePlan, Dialect, Gesture, Press};
use trued::intonation::{Method, Settings};
use trued::offline::retune::{self, Recording};
use trued::offline::score_file::Score;
use trued::offline::{notes_file, picture};
use trued::time::Span;

/// A file of format 1 with these tracks; each event is its delta and its bytes.
fn file(division: [u8; 2], tracks: &[&[(u8, &[u8])]]) -> Vec<u8> {
    let mut bytes = b"MThd\0\0\0\x06\0\x01\0".to_vec();
    bytes.push(tracks.len() as u8);
    bytes.extend(division);
    for track in tracks {
        let mut data = Vec::new();
        for (delta, event) in track.iter().chain([&(0, &[0xFF, 0x2F, 0][..])]) {
            data.push(*delta);
            data.extend(*event);
        }
        bytes.extend(b"MTrk");
        bytes.extend((data.len() as u32).to_be_bytes());
        bytes.extend(data);
    }
    bytes
}

const TICKS_96: [u8; 2] = [0, 96];

fn narrow() -> Arc<trued::tuning::Tuning> {
    plans::offsets([
        0.0, -20.0, 5.0, 10.0, -14.0, 3.0, -17.0, 2.0, -8.0, -4.0, 8.0, -12.0,
    ])
}

fn plan(dialect: Dialect) -> Plan {
    let set = vec![
        plans::song("One", narrow()),
        plans::song("Two", plans::equal()),
    ];
    plans::plan(plans::synth("organ", dialect, 12), set)
}

fn play(plan: Plan, bytes: &[u8], song: u16) -> (Recording, Vec<u8>) {
    let score = Score::read(bytes).expect("a good file");
    let recording = retune::play(Box::new(plan), &score, song, 0);
    let written = recording.midi_file(&score).expect("it fits");
    (recording, written)
}

#[test]
fn notes_keep_their_ticks_and_set_up_stands_before_the_first() {
    for dialect in [Dialect::ChannelBend, Dialect::Mpe { manager: 0 }] {
        let bytes = file(
            TICKS_96,
            &[
                &[(0, &[0xFF, 0x51, 3, 7, 0, 0])],
                &[
                    (0, &[0x90, 60, 90]),
                    (13, &[0x90, 64, 91]),
                    (48, &[0x80, 60, 0]),
                ],
                &[(7, &[0x91, 67, 92]), (96, &[0x81, 67, 0])],
            ],
        );
        let (recording, written) = play(plan(dialect), &bytes, 0);
        let read = Score::read(&written).expect("our own file is good");
        assert_eq!(written[12..14], TICKS_96);
        assert_eq!(written[10..12], [0, 2], "a conductor and one synth");
        let notes: Vec<(u64, usize, u8)> = read
            .events
            .iter()
            .filter(|e| e.bytes[0] & 0xE0 == 0x80)
            .map(|e| (e.tick, e.track, e.bytes[0] & 0x90))
            .collect();
        assert_eq!(
            notes,
            [
                (0, 1, 0x90),
                (7, 1, 0x90),
                (13, 1, 0x90),
                (61, 1, 0x80),
                (103, 1, 0x80),
                // Left open by the file, ended with it.
                (103, 1, 0x80),
            ]
        );
        let first_note = read.events.iter().position(|e| e.bytes[0] & 0xF0 == 0x90);
        let ranges = read
            .events
            .iter()
            .filter(|e| e.bytes[..] == [e.bytes[0], 6, 12]);
        let last_range = read.events.iter().rposition(|e| e.bytes[1..] == [6, 12]);
        assert!(ranges.count() >= 15);
        assert!(last_range < first_note, "{dialect:?}");
        assert_eq!(recording.notes.len(), 3);
        assert_eq!(read.end_tick, 103);
    }
}

#[test]
fn a_deadline_goes_to_the_first_tick_that_is_not_before_it() {
    // A GM reset passes through, and 100 ms later the synth is set up again: at 96 ticks a quarter of 0.5 s that is
    // 19.2 ticks. With ticks of 1 ms it is exactly 100.
    for (division, wanted) in [(TICKS_96, 20), ([0xE7, 40], 100)] {
        let reset: &[u8] = &[0xF0, 5, 0x7E, 0x7F, 9, 1, 0xF7];
        let bytes = file(
            division,
            &[&[(0, reset), (120, &[0x90, 60, 90]), (10, &[0x80, 60, 0])]],
        );
        let (recording, _) = play(plan(Dialect::ChannelBend), &bytes, 0);
        let late: Vec<u64> = recording
            .sent
            .iter()
            .map(|sent| sent.tick)
            .filter(|tick| *tick > 0 && *tick < 120)
            .collect();
        assert!(!late.is_empty());
        assert!(late.iter().all(|tick| *tick == wanted), "{late:?}");
    }
}

#[test]
fn the_starting_song_is_the_one_asked_for() {
    let bytes = file(TICKS_96, &[&[(0, &[0x90, 64, 90]), (9, &[0x80, 64, 0])]]);
    for (song, cents) in [(0, 6386.0), (1, 6400.0)] {
        let (recording, _) = play(plan(Dialect::ChannelBend), &bytes, song);
        assert_eq!(recording.notes[0].onset.target.cents(), cents);
        assert_eq!(recording.notes[0].song, song);
    }
}

#[test]
fn a_song_change_between_two_notes_of_one_tick_divides_them() {
    let mut plan = plan(Dialect::ChannelBend);
    plan.cues.push(CuePlan {
        from: None,
        channels: ChannelSet::NONE.with(15),
        gesture: Gesture::ANY_PROGRAM,
        press: Press::Down,
        at_quiet: false,
        act: Act::SongByNumber,
        held: false,
        pass: false,
    });
    let bytes = file(
        TICKS_96,
        &[&[
            (0, &[0x90, 64, 90]),
            (0, &[0xCF, 1]),
            (0, &[0x90, 69, 90]),
            (9, &[0x80, 64, 0]),
        ]],
    );
    let (recording, _) = play(plan, &bytes, 0);
    let seen: Vec<_> = recording
        .notes
        .iter()
        .map(|note| (note.song, note.onset.target.cents()))
        .collect();
    assert_eq!(seen, [(0, 6386.0), (1, 6900.0)]);
}

#[test]
fn every_synth_has_a_track_of_its_own() {
    let mut plan = plan(Dialect::ChannelBend);
    plan.synths
        .push(plans::synth("strings", Dialect::ChannelBend, 2));
    let mut part = plans::part(&plan.synths);
    part.to = trued::engine::SynthId::new(1).expect("a synth");
    plan.parts.push(part);
    let bytes = file(TICKS_96, &[&[(0, &[0x90, 64, 90]), (9, &[0x80, 64, 0])]]);
    let (_, written) = play(plan, &bytes, 0);
    let read = Score::read(&written).expect("our own file is good");
    for track in [1, 2] {
        let ons = read
            .events
            .iter()
            .filter(|e| e.track == track && e.bytes[0] & 0xF0 == 0x90);
        assert_eq!(ons.count(), 1, "track {track}");
    }
    assert!(
        read.events.iter().all(|e| e.track > 0),
        "the conductor plays nothing"
    );
}

#[test]
fn a_bend_stands_before_its_note_within_a_tick() {
    let bytes = file(TICKS_96, &[&[(0, &[0x90, 64, 90]), (9, &[0x80, 64, 0])]]);
    let (_, written) = play(plan(Dialect::ChannelBend), &bytes, 0);
    let read = Score::read(&written).expect("our own file is good");
    let on = read
        .events
        .iter()
        .position(|e| e.bytes[0] & 0xF0 == 0x90)
        .expect("a note");
    let channel = read.events[on].bytes[0] & 0x0F;
    let bend = read
        .events
        .iter()
        .position(|e| e.bytes[0] == 0xE0 | channel && e.bytes[1..] != [0, 64]);
    assert!(bend.expect("it is bent") < on);
}

#[test]
fn the_same_score_gives_the_same_bytes() {
    let bytes = file(
        TICKS_96,
        &[&[
            (0, &[0x90, 64, 90]),
            (9, &[0x91, 67, 9]),
            (3, &[0xB0, 64, 127]),
        ]],
    );
    let once = play(plan(Dialect::Mpe { manager: 0 }), &bytes, 0);
    let twice = play(plan(Dialect::Mpe { manager: 0 }), &bytes, 0);
    assert_eq!(once, twice);
}

#[test]
fn note_lines_have_the_fields_others_read() {
    let mut plan = plan(Dialect::ChannelBend);
    plan.synths[0].tail = Span::ZERO;
    let bytes = file([0xE7, 40], &[&[(7, &[0x95, 64, 90]), (9, &[0x85, 64, 0])]]);
    let (recording, _) = play(plan, &bytes, 0);
    let lines = notes_file::write(&recording);
    let line: serde_json::Value = serde_json::from_str(lines.trim()).expect("one line of JSON");
    assert_eq!(line["t_ms"], 7.0);
    assert_eq!(line["key"], 64);
    assert_eq!(line["velocity"], 90);
    assert_eq!(line["port"], "organ");
    assert_eq!(line["note"], 64);
    assert_eq!(line["target_cents"], 6386.0);
    let sent = line["sent_cents"].as_f64().expect("a number");
    assert!((sent - 6386.0).abs() <= 1200.0 / 8192.0 / 2.0, "{sent}");
    assert!((1..=16).contains(&line["channel"].as_u64().expect("a number")));
    assert!(line["root"].is_null() && line["shape"].is_null());
    assert_eq!(line["drift_cents"], 0.0);
}

/// E, G and C as hands spread them, then A minor under the held C and E, long enough to go home. Every line is held to
/// the others: intervals to ratios, drift to the mean of what the lines themselves say.
#[test]
fn lines_of_a_chord_that_is_followed_have_root_shape_drift_and_what_moved() {
    let mut plan = plan(Dialect::ChannelBend);
    let mut song = plans::song("Followed", plans::equal());
    song.method = Method::ChordRoot(Settings::DEFAULT);
    plan.set = vec![song];
    // Ticks of 20 ms.
    let score: &[(u8, &[u8])] = &[
        (0, &[0x90, 64, 90]),
        (1, &[0x90, 67, 90]),
        (1, &[0x90, 60, 90]),
        (48, &[0x80, 67, 0]),
        (0, &[0x90, 69, 90]),
        (0, &[0x90, 45, 90]),
        (125, &[0x80, 45, 0]),
    ];
    let (recording, _) = play(plan, &file([0, 25], &[score]), 0);
    let written = notes_file::write(&recording);
    let parsed = written
        .lines()
        .map(|line| serde_json::from_str(line).expect("JSON"));
    let lines: Vec<serde_json::Value> = parsed.collect();
    let number = |line: &serde_json::Value, name: &str| line[name].as_f64().expect(name);
    let keys_of = |retune: bool| -> Vec<u64> {
        let some = lines
            .iter()
            .filter(|line| line["retune"].as_bool().unwrap_or(false) == retune);
        some.map(|line| line["key"].as_u64().expect("a key"))
            .collect()
    };
    assert_eq!(keys_of(false), [64, 67, 60, 69, 45]);
    assert!(
        lines
            .iter()
            .all(|line| line.get("retune").is_none_or(|r| r == true))
    );

    let mut stands = std::collections::BTreeMap::new();
    let mut late = 0;
    for together in lines.chunk_by(|a, b| a["t_ms"] == b["t_ms"]) {
        let at_ms = number(&together[0], "t_ms");
        if at_ms >= 1000.0 {
            stands.remove(&67);
        }
        for line in together {
            let (key, target) = (
                line["key"].as_u64().expect("a key"),
                number(line, "target_cents"),
            );
            assert!((number(line, "sent_cents") - target).abs() <= 1200.0 / 8192.0 / 2.0);
            let before = stands.insert(key, target);
            if line["retune"] == true && at_ms > 100.0 {
                late += 1;
                let step = (target - before.expect("it sounded")).abs();
                assert!(step <= 1.000_001, "no step is larger than a cent: {step}");
            }
        }
        let drift: f64 = stands
            .iter()
            .map(|(key, target)| target - *key as f64 * 100.0)
            .sum();
        let drift = drift / stands.len() as f64;
        let (root, shape) = match at_ms {
            0.0 => (4, serde_json::Value::Null),
            20.0 => (4, "5:6".into()),
            at_ms if at_ms < 1000.0 => (0, "4:5:6".into()),
            _ => (9, "10:12:15".into()),
        };
        for line in together {
            assert!(
                (number(line, "drift_cents") - drift).abs() < 1e-4,
                "{line} but {drift}"
            );
            assert_eq!(
                (&line["root"], &line["shape"]),
                (&root.into(), &shape),
                "{line}"
            );
        }
        if at_ms == 40.0 {
            // 5/4 and 3/2.
            assert!(
                (stands[&64] - stands[&60] - 386.313_714).abs() < 1e-5,
                "{stands:?}"
            );
            assert!(
                (stands[&67] - stands[&60] - 701.955_001).abs() < 1e-5,
                "{stands:?}"
            );
        }
    }
    let jumps = keys_of(true).len() - late;
    assert!(jumps >= 3, "E for G, and both for C: {written}");
    assert!(late > 0, "the second chord goes home: {written}");
}

#[test]
fn the_picture_has_a_strip_for_every_note_and_no_loose_ends() {
    let bytes = file(
        TICKS_96,
        &[&[
            (0, &[0x90, 64, 90]),
            (120, &[0x90, 67, 90]),
            (120, &[0x80, 64, 0]),
        ]],
    );
    let (recording, _) = play(plan(Dialect::ChannelBend), &bytes, 0);
    let svg = picture::draw(&recording, &["Bread & <butter>".into()]);
    assert_eq!(svg.matches("<rect x=").count(), 2);
    // E is 14 cents low, and the nearest bend of range 12 is 14.06.
    assert!(svg.contains("-14.1") && svg.contains("Bread &amp; &lt;butter&gt;"));
    assert!(svg.starts_with("<svg") && svg.ends_with("</svg>\n"));
}
