//! The built-in rehearsal, rendered to a WAV file and measured from its samples, against the tunings it names.

use std::path::PathBuf;
use std::sync::OnceLock;
use trued::intonation::Method;
use trued::offline::demo::{self, Check, Finding};
use trued::offline::measure::Sound;
use trued::offline::moments::Pair;
use trued::offline::retune::{self, Recording};
use trued::offline::score_file::Score;
use trued::offline::{listen, moments};
use trued::stage::Stage;
use trued::tuning::Key;

/// What a musician would call exact.
const LIMIT_CENTS: f64 = 0.1;
/// Beats slower than one in this time are none.
const STILL_S: f64 = 10.0;

struct Rehearsal {
    stage: Stage,
    recording: Recording,
    sound: Sound,
}

/// Made once: it takes seconds.
fn rehearsal() -> &'static Rehearsal {
    static MADE: OnceLock<Rehearsal> = OnceLock::new();
    MADE.get_or_init(|| {
        let path = PathBuf::from("rehearsal.yaml");
        let stage = Stage::parse(&path, demo::STAGE)
            .unwrap_or_else(|complaints| panic!("{}", complaints[0]));
        let file = demo::score();
        let score = Score::read(&file).expect("our own score is good");
        let recording = retune::play(stage.plan_offline(), &score, 0, 0);
        let wav = std::env::temp_dir().join(format!("trued-rehearse-{}.wav", std::process::id()));
        let writer = std::fs::File::create(&wav).expect("a place for a file");
        listen::write_wav(&listen::render(&recording), std::io::BufWriter::new(writer))
            .expect("room for a file");
        let sound = Sound::read(&wav).expect("the file just written");
        let _ = std::fs::remove_file(&wav);
        Rehearsal {
            stage,
            recording,
            sound,
        }
    })
}

impl Rehearsal {
    /// The pitches of a pair, in hertz: not what was sent, not what was measured, but what the tuning says of the song
    /// in which each was struck, and of two notes that follow the chord, the ratio.
    fn wanted_hz(&self, pair: &Pair) -> (f64, f64) {
        let set = self.stage.plan().set;
        let song = |key| &set[self.song_at(key, pair.span_s.0)];
        let hz = |key| {
            song(key)
                .tuning
                .pitch(key)
                .expect("no key of it is silent")
                .hertz()
        };
        let lower_hz = hz(pair.lower);
        match (song(pair.upper).method, pair.partials) {
            (Method::ChordRoot(_), Some((over, under))) => {
                (lower_hz, lower_hz * over as f64 / under as f64)
            }
            _ => (lower_hz, hz(pair.upper)),
        }
    }

    fn song_at(&self, key: Key, at_s: f64) -> usize {
        let struck = |note: &&retune::Sounded| {
            note.onset.key == key
                && moments::seconds(note.time) <= at_s
                && moments::seconds(note.until) >= at_s
        };
        let note = self.recording.notes.iter().find(struck).expect("it sounds");
        note.song as usize
    }
}

#[test]
fn every_interval_and_beat_of_the_rehearsal_is_what_its_tuning_says() {
    let rehearsal = rehearsal();
    let mut pairs = 0;
    for check in demo::scenes().iter().flat_map(|scene| &scene.checks) {
        let finding = check
            .measure(&rehearsal.recording, &rehearsal.sound)
            .expect("every key of the rehearsal sounds");
        let (Check::Pair(pair), Finding::Pair(found)) = (check, finding) else {
            continue;
        };
        pairs += 1;
        let (lower_hz, upper_hz) = rehearsal.wanted_hz(pair);
        let wanted = 1200.0 * (upper_hz / lower_hz).log2();
        println!("{found}; the tuning says {wanted:.3}");
        assert!(
            (found.cents - wanted).abs() < LIMIT_CENTS,
            "{found} instead of {wanted:.3} cents"
        );
        let Some((of_lower, of_upper)) = pair.partials else {
            continue;
        };
        let meet_hz = lower_hz * of_lower as f64;
        let beats = (meet_hz - upper_hz * of_upper as f64).abs();
        let limit = meet_hz * (LIMIT_CENTS / 1200.0).exp2() - meet_hz;
        match found.swell.expect("it sounds").beats_hz {
            Some(measured) => assert!(
                (measured - beats).abs() < limit,
                "{found} instead of {beats:.3} beats"
            ),
            None => assert!(beats * STILL_S < 1.0, "{found} instead of {beats:.3} beats"),
        }
    }
    assert_eq!(pairs, 20);
}

// The same against what is published, so that a wrong tuning cannot agree with itself: the syntonic comma is 21.506
// cents, a pure third 386.314, the quarter-comma fifth 696.578 and its wolf 737.637 (Ratte 1991, p. 153, has the
// wolf as 35.68 cents over a pure fifth; the rest is arithmetic from 3/2, 5/4 and 81/80); 27/22 is 354.547, 7/4 is 968.826.
#[test]
fn the_intervals_are_those_of_the_books() {
    let rehearsal = rehearsal();
    let published = [
        400.0, 386.314, 386.314, 701.955, 696.578, 1600.0, 1586.314, 737.637, 696.578, 400.0,
        884.359, 386.314, 884.359, 354.547, 701.955, 1586.314, 1586.314, 386.314, 701.955, 968.826,
    ];
    let found: Vec<f64> = demo::scenes()
        .iter()
        .flat_map(|scene| &scene.checks)
        .filter_map(|check| check.measure(&rehearsal.recording, &rehearsal.sound))
        .filter_map(|finding| match finding {
            Finding::Pair(found) => Some(found.cents),
            Finding::Moved { .. } | Finding::Again { .. } => None,
        })
        .collect();
    assert_eq!(found.len(), published.len());
    for (found, published) in found.iter().zip(published) {
        assert!(
            (found - published).abs() < LIMIT_CENTS,
            "{found:.3} instead of {published}"
        );
    }
}

#[test]
fn a_ringing_chord_does_not_move_when_the_song_changes() {
    let rehearsal = rehearsal();
    let moved: Vec<f64> = demo::scenes()
        .iter()
        .flat_map(|scene| &scene.checks)
        .filter_map(|check| check.measure(&rehearsal.recording, &rehearsal.sound))
        .filter_map(|finding| match finding {
            Finding::Moved { cents, .. } => Some(cents),
            Finding::Pair(_) | Finding::Again { .. } => None,
        })
        .collect();
    assert_eq!(moved.len(), 1);
    assert!(moved[0] < 0.01, "{moved:?}");
}

// Pure chords of which each shares notes with the next sink by 81/80 each time round: 21.506 cents, five times.
#[test]
fn pure_rounds_sink_by_a_semitone_unless_they_are_held() {
    let rehearsal = rehearsal();
    let again: Vec<f64> = demo::scenes()
        .iter()
        .flat_map(|scene| &scene.checks)
        .filter_map(|check| check.measure(&rehearsal.recording, &rehearsal.sound))
        .filter_map(|finding| match finding {
            Finding::Again { cents, .. } => Some(cents),
            _ => None,
        })
        .collect();
    println!("{again:?}");
    let [sinking, staying] = again[..] else {
        panic!("{again:?}");
    };
    let wanted = 5.0 * 1200.0 * (80f64 / 81.0).log2();
    assert!(
        (sinking - wanted).abs() < LIMIT_CENTS,
        "{sinking} instead of {wanted}"
    );
    assert!(staying.abs() < 12.0, "{staying}");
}

#[test]
fn nothing_gives_way_in_the_rehearsal_and_it_lasts_under_two_minutes() {
    let rehearsal = rehearsal();
    assert_eq!(rehearsal.recording.notices(), Vec::<String>::new());
    assert_eq!(rehearsal.stage.advice, Vec::<String>::new());
    assert!((105.0..115.0).contains(&rehearsal.sound.length_s()));
}
