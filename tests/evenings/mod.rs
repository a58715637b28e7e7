//! The example stages of `config/`, played: what sounds is what the chart of each song says, and every cue that an example
//! teaches does what its comment says.

mod stories;

use crate::support::charts::Chart;
use crate::support::midi_file::midi_file;
use crate::support::rig::Rig;
use std::fs;
use std::path::{Path, PathBuf};
use std::process::Command;
use trued::engine::Command as Told;
use trued::engine::Plan;
use trued::engine::plan::{Gesture, PartPlan};
use trued::intonation::Method;
use trued::stage::Stage;
use trued::time::Span;

/// The chart is printed to six decimals, pitches are whole microcents.
const ROUNDING_CENTS: f64 = 2e-6;

/// So long that no key is struck from below or above.
const REST_MS: u64 = 600;

fn config(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("config")
        .join(name)
}

/// All of them, by name.
fn examples() -> Vec<String> {
    let entries = fs::read_dir(config("")).expect("the folder is there");
    let names = entries.map(|entry| entry.expect("an entry").file_name());
    let mut names: Vec<String> = names
        .map(|name| name.to_string_lossy().into_owned())
        .filter(|name| name.ends_with(".yaml"))
        .collect();
    names.sort();
    names
}

/// Half a step of the part's synth.
fn half_step_cents(plan: &Plan, part: &PartPlan) -> f64 {
    let range = f64::from(plan.synths[part.to.index()].bend_range.semitones());
    range * 100.0 / 8192.0 / 2.0 + ROUNDING_CENTS
}

/// Where a key struck in a part sounds by the song's chart; `None` for a silent key.
fn by_the_chart(chart: &Chart, plan: &Plan, song: usize, part: &PartPlan, key: u8) -> Option<f64> {
    let moved = i16::from(plan.set[song].transpose_keys) + i16::from(part.transpose_keys);
    let key = u8::try_from(i16::from(key) + moved).ok()?;
    match part.tune {
        true => Some(chart.get(key)? + part.offset.cents()),
        false => Some(f64::from(key) * 100.0),
    }
}

/// Every key of every part, one after the other.
fn play_through(rig: &mut Rig, plan: &Plan, song: usize, chart: &Chart) -> (usize, f64) {
    let (mut notes, mut worst): (usize, f64) = (0, 0.0);
    let own = plan.set[song].parts.as_deref();
    for part in own.unwrap_or(&plan.parts) {
        let keyboard = part.from.map_or(0, |from| from.index());
        let channels = plan.keyboards[keyboard].channels.iter();
        let hears = part.hears;
        let channel = channels.into_iter().find(|channel| hears.has(*channel));
        let channel = channel.expect("a part that can be heard");
        let cue = |key: u8| {
            plan.cues.iter().any(|cue| {
                let mine = cue.from.is_none_or(|from| from.index() == keyboard);
                mine && matches!(cue.gesture, Gesture::Note(note) if note.number() == key)
            })
        };
        let keys = part.keys.0.number().max(24)..=part.keys.1.number().min(103);
        for key in keys.filter(|key| !cue(*key)) {
            let wanted = by_the_chart(chart, plan, song, part, key);
            let before = rig.receivers[part.to.index()].notes.len();
            rig.midi(keyboard, &[0x90 | channel, key, 90]);
            let heard = &rig.receivers[part.to.index()].notes[before..];
            match (heard, wanted) {
                ([note], Some(wanted)) => {
                    let off = (note.onset_cents() - wanted).abs();
                    let limit = half_step_cents(plan, part);
                    assert!(off <= limit, "key {key}: {note:?} instead of {wanted}");
                    (notes, worst) = (notes + 1, worst.max(off));
                }
                ([], None) => {}
                // What the chart puts beyond the notes of MIDI stays silent.
                ([], Some(wanted)) => assert!(!(0.0..=12_750.0).contains(&wanted), "key {key}"),
                _ => panic!("key {key}: {heard:?} instead of {wanted:?}"),
            }
            rig.until(rig.now + Span::from_millis(5));
            rig.midi(keyboard, &[0x80 | channel, key, 64]);
            rig.until(rig.now + Span::from_millis(REST_MS));
        }
    }
    (notes, worst)
}

#[test]
fn every_song_of_every_example_sounds_its_chart() {
    let mut all = 0;
    for name in examples() {
        let stage = Stage::read(&config(&name)).expect("loads clean");
        let plan = stage.plan_offline();
        for (place, song) in stage.set.iter().enumerate() {
            if plan.set[place].method != Method::Fixed {
                continue; // chords decide there, and stories tell it
            }
            let chart = Chart::of(&config(&name), &song.title);
            let mut rig = Rig::ready(&plan);
            rig.command(Told::Song(place as u16));
            let (notes, worst) = play_through(&mut rig, &plan, place, &chart);
            println!("{name:<22}{:<28}{notes:>5}{worst:>10.4}", song.title);
            assert!(notes > 20, "{name}");
            for receiver in &rig.receivers {
                assert!(receiver.stuck().is_empty() && receiver.orphans.is_empty());
            }
            all += notes;
        }
    }
    println!("{all} notes");
}

/// A score of four chords, such as any song can be tried with.
fn four_chords() -> (Vec<u8>, usize) {
    let chords: [[u8; 4]; 4] = [
        [48, 64, 67, 72],
        [53, 65, 69, 72],
        [55, 62, 67, 71],
        [48, 60, 64, 67],
    ];
    let mut sent = Vec::new();
    for (n, keys) in (0..).zip(chords) {
        let on = keys.iter().flat_map(|key| [0x90, *key, 80]).collect();
        let off = keys.iter().flat_map(|key| [0x80, *key, 64]).collect();
        sent.push((n * 400, on));
        sent.push((n * 400 + 350, off));
    }
    (midi_file(&sent, 1_700), 16)
}

#[test]
fn every_example_can_be_rehearsed() {
    let folder = std::env::temp_dir().join(format!("trued-evenings-{}", std::process::id()));
    fs::create_dir_all(&folder).expect("a folder");
    let score = folder.join("score.mid");
    let (bytes, notes) = four_chords();
    fs::write(&score, bytes).expect("a file");
    for name in examples() {
        let out = Command::new(env!("CARGO_BIN_EXE_trued"))
            .arg("rehearse")
            .args([&config(&name), &score])
            .arg("--out")
            .arg(&folder)
            .output()
            .expect("trued");
        let said = String::from_utf8_lossy(&out.stdout);
        let err = String::from_utf8_lossy(&out.stderr);
        assert!(out.status.success() && err.is_empty(), "{name}: {err}");
        let stage = Stage::read(&config(&name)).expect("loads clean");
        let (plan, first) = (stage.plan_offline(), &stage.set[0]);
        let chart = Chart::of(&config(&name), &first.title);
        let lines = fs::read_to_string(folder.join("rehearsal.jsonl")).expect("written");
        let mut heard = 0;
        for line in lines.lines() {
            let line: serde_json::Value = serde_json::from_str(line).expect("JSON");
            if line["retune"] == true {
                continue;
            }
            heard += 1;
            let key = line["key"].as_u64().expect("a key") as u8;
            let part = plan.parts.iter().find(|part| {
                let (low, high) = part.keys;
                (low.number()..=high.number()).contains(&key)
                    && part.from.is_none_or(|from| from.index() == 0)
            });
            let part = part.expect("a part that plays it");
            let sent = line["sent_cents"].as_f64().expect("cents");
            let wanted = by_the_chart(&chart, &plan, 0, part, key);
            let off = wanted.map(|wanted| (sent - wanted).abs());
            let follows = plan.set[0].method != Method::Fixed;
            assert!(
                follows || off.is_some_and(|off| off <= half_step_cents(&plan, part)),
                "{name}: {line} instead of {wanted:?}"
            );
        }
        assert_eq!(heard, notes, "{name}");
        assert!(
            said.contains("rehearsal.wav to listen to"),
            "{name}: {said}"
        );
    }
    let _ = fs::remove_dir_all(folder);
}
