//! Ports that come and go under held notes, a keyboard made of several, loops, lost input, SIGKILL: what alsa_ports.sh
//! did in the guest, judged by the independent receiver.

use super::guest::Guest;
use super::{HALF_STEP_CENTS, HELD, assert_plain, bytes_of, wanted_cents};
use crate::support::receiver::{Kind, Receiver};
use std::path::Path;
use std::time::Duration;

const PORTS: &str = r#"
stage: In and out
keyboards:
  keys: {port: "VirMIDI ?-0"}
  pads: {port: virtual}
synths:
  organ: {port: "VirMIDI ?-1", tail_ms: 300}
  bells: {port: virtual, tail_ms: 300}
parts:
  - {to: organ}
  - {to: bells}
set:
  - {song: Lantern hymn, tuning: quarter-comma-meantone}
"#;

const MANY: &str = r#"
stage: Many as one
keyboards: {all: }
synths:
  organ: {port: virtual, tail_ms: 300}
set:
  - {song: Lantern hymn, tuning: quarter-comma-meantone}
"#;

/// How often the card is pulled out; by the variable UNPLUGS, for a longer run.
const UNPLUGS: usize = 5;
/// The bound that a player is promised, and what a virtual machine on a busy computer may take for the same work.
const PROMISED_S: f64 = 1.0;
const BUSY_S: f64 = 5.0;

/// The chord of the script: C E G, all at velocity 100.
pub const CHORD: [u8; 3] = [60, 64, 67];

/// How often, and whether the promise is to be held to.
pub fn unplugs() -> (usize, bool) {
    match std::env::var("UNPLUGS") {
        Ok(text) => (text.parse().expect("UNPLUGS is a number"), true),
        Err(_) => (UNPLUGS, false),
    }
}

pub fn write(folder: &Path) {
    std::fs::write(folder.join("ports.yaml"), PORTS).unwrap();
    std::fs::write(folder.join("many.yaml"), MANY).unwrap();
}

pub fn judge(guest: &Guest) {
    in_and_out_under_a_held_chord(guest, "midir");
    stopped_under_a_held_chord_through_midir(guest);
    in_and_out_under_a_held_chord(guest, "alsa");
    news_lost_in_a_flood_then_killed_then_stopped(guest);
    several_keyboards_as_one(guest);
    loops_are_cut(guest);
}

/// A range at power-on that is none of ours, so that one never told is heard.
const STRANGE: u8 = 7;

fn hear(range: u8, messages: impl Iterator<Item = Vec<u8>>) -> Receiver {
    let mut receiver = Receiver::new(Kind::Plain, Duration::ZERO, range);
    for message in messages {
        receiver.hear(Duration::ZERO, &message);
    }
    receiver
}

pub fn hear_lines(guest: &Guest, file: &str) -> Receiver {
    hear(STRANGE, guest.text(file).lines().filter_map(bytes_of))
}

/// Whether an ear was there from the first thing said to a synth that has come: the pedal of channel 1 up.
fn from_the_start(bytes: &[u8]) -> bool {
    bytes.starts_with(&[0xB0, 64, 0])
}

/// What a synth heard through its raw port. An ear that came too late for part of the set-up is told the range.
pub fn hear_raw(bytes: &[u8]) -> Receiver {
    let range = if from_the_start(bytes) { STRANGE } else { 2 };
    hear(range, std::iter::once(bytes.to_vec()))
}

pub fn assert_in_tune(receiver: &Receiver, first: usize, keys: &[u8]) {
    for (note, key) in receiver.notes[first..].iter().zip(keys) {
        let (heard, wanted) = (note.onset_cents(), wanted_cents(*key, 0));
        let off = (heard - wanted).abs();
        assert!(off <= HALF_STEP_CENTS, "key {key}: {heard}, not {wanted}");
    }
}

fn in_and_out_under_a_held_chord(guest: &Guest, backend: &str) {
    let (unplugs, strict) = unplugs();
    let log = guest.text(&format!("{backend}.log"));
    let waits = log.lines().find(|line| line.contains("ready:"));
    let waits = waits.expect("a line that says ready");
    assert!(
        waits.contains("keyboard keys waits for VirMIDI ?-0"),
        "{log}"
    );
    assert!(waits.contains("organ waits for VirMIDI ?-1"), "{log}");
    // Each time the organ is as new: it hears its set-up, then the chord in tune, and no note-off of an earlier time.
    let mut whole = 0;
    for n in 1..=unplugs {
        let bytes = guest.bytes(&format!("{backend}.ear.{n}"));
        whole += usize::from(from_the_start(&bytes));
        let organ = hear_raw(&bytes);
        assert_eq!(organ.notes.len(), CHORD.len(), "time {n}");
        assert_in_tune(&organ, 0, &CHORD);
        assert_eq!(organ.orphans, [], "time {n}");
    }
    let bells = hear_lines(guest, &format!("{backend}.bells_in_and_out.txt"));
    assert_all_ended(&bells, CHORD.len() * unplugs);
    let times = guest.text(&format!("{backend}.cycles.txt"));
    let column = |place: usize| -> Vec<f64> {
        let field = |line: &str| line.split_whitespace().nth(place)?.parse::<f64>().ok();
        times.lines().filter_map(field).map(|n| n / 100.0).collect()
    };
    let (set_up, let_go) = (column(0), column(1));
    assert_eq!((set_up.len(), let_go.len()), (unplugs, unplugs));
    let worst = |times: &[f64]| times.iter().copied().fold(0.0, f64::max);
    println!(
        "{unplugs} times out and in under a held chord and pedal, {backend}: set up again after {:.2} s at worst, \
         let go after {:.2} s at worst (guest's clock, with the script's own slowness); \
         {whole} set-ups heard from their first byte",
        worst(&set_up),
        worst(&let_go)
    );
    let bound = if strict { PROMISED_S } else { BUSY_S };
    assert!(
        worst(&set_up) <= bound && worst(&let_go) <= bound,
        "{times}"
    );
}

fn assert_all_ended(receiver: &Receiver, notes: usize) {
    assert_eq!(receiver.notes.len(), notes);
    assert_eq!(receiver.orphans, []);
    assert!(receiver.stuck().is_empty(), "{:?}", receiver.stuck());
    assert!(receiver.sounding().is_empty(), "{:?}", receiver.sounding());
}

fn stopped_under_a_held_chord_through_midir(guest: &Guest) {
    let log = guest.text("midir.log");
    println!("{log}");
    assert_eq!(guest.text("midir.exit").trim(), "0", "{log}");
    let organ = hear_raw(&guest.bytes("midir.ear.last"));
    assert_eq!(organ.notes.len(), CHORD.len());
    assert_in_tune(&organ, 0, &CHORD);
    assert_plain(&organ);
    let bells = hear_lines(guest, "midir.bells.txt");
    assert_eq!(bells.notes.len(), CHORD.len() * (unplugs().0 + 1));
    assert_plain(&bells);
    let status: serde_json::Value = serde_json::from_str(&guest.text("midir.json")).expect("JSON");
    assert_eq!(status["backend"], "midir");
}

fn news_lost_in_a_flood_then_killed_then_stopped(guest: &Guest) {
    let (log, again) = (guest.text("alsa.log"), guest.text("again.log"));
    println!("{log}{again}");
    // The bells heard a note before and one after the flood.
    let bells = hear_lines(guest, "alsa.bells_before_kill.txt");
    assert_all_ended(&bells, CHORD.len() * unplugs().0 + 2);
    let bytes = guest.bytes("alsa.ear.flood");
    // One note after the flood, the chord before the kill, the chord after it.
    let onsets: Vec<usize> = (0..bytes.len() - 2)
        .filter(|at| bytes[*at] & 0xF0 == 0x90 && bytes[at + 2] == 100)
        .collect();
    assert_eq!(onsets.len(), 1 + 2 * CHORD.len(), "{bytes:02x?}");
    let at_kill = hear_raw(&bytes[..onsets[1 + CHORD.len()]]);
    assert!(at_kill.sounding().is_empty(), "{:?}", at_kill.sounding());
    assert_in_tune(&at_kill, 0, &[64]);
    assert_in_tune(&at_kill, 1, &CHORD);
    assert_eq!(at_kill.orphans, []);
    // The second run, judged by an ear that knows nothing of the first, which owes note-offs for ever.
    let before_chord = bytes[..onsets[1 + CHORD.len()]].windows(3);
    let mut start = before_chord.enumerate().filter(|(_, w)| from_the_start(w));
    let (start, _) = start.next_back().expect("the second run's first words");
    let second = hear_raw(&bytes[start..]);
    assert_eq!(second.notes.len(), CHORD.len());
    assert_in_tune(&second, 0, &CHORD);
    assert_eq!(second.orphans, []);
    assert_eq!(guest.text("again.exit").trim(), "0", "{again}");
    assert_plain(&second);
}

fn several_keyboards_as_one(guest: &Guest) {
    let log = guest.text("many.log");
    println!("{log}");
    // One player was killed under a held chord and pedal: only what it held has ended.
    let gone = hear_lines(guest, "many_gone.txt");
    assert_eq!(gone.notes.len(), 1 + HELD.len());
    let held: Vec<f64> = gone
        .sounding()
        .iter()
        .map(|note| note.onset_cents())
        .collect();
    assert_eq!(
        held,
        [gone.notes[0].onset_cents()],
        "the other's note goes on"
    );
    assert_in_tune(&gone, 0, &[64]);
    // The system exclusive message came in two halves with that note between them.
    let sysex: Vec<u8> = guest
        .text("many.txt")
        .lines()
        .filter_map(|line| line.split_once("System exclusive"))
        .flat_map(|(_, bytes)| {
            bytes
                .split_whitespace()
                .map(str::to_string)
                .collect::<Vec<_>>()
        })
        .map(|byte| u8::from_str_radix(&byte, 16).expect("hexadecimal"))
        .collect();
    let mut wanted = vec![0; 343];
    (wanted[0], wanted[1], wanted[342]) = (0xF0, 0x7D, 0xF7);
    assert_eq!(sysex, wanted);
}

fn loops_are_cut(guest: &Guest) {
    let log = guest.text("many.log");
    // Three notes more, each heard once; had one come back, it would have been heard without end.
    let organ = hear_lines(guest, "many.txt");
    assert_eq!(organ.notes.len(), 1 + HELD.len() + 3);
    assert_eq!(log.matches("round and round").count(), 2, "{log}");
    assert!(
        log.contains("Midi Through Port-0 was connected to keyboard all"),
        "{log}"
    );
    let connections = guest.text("connections.txt");
    let into = connections
        .lines()
        .skip_while(|line| !line.contains("'all"))
        .find(|line| line.contains("Connected From"))
        .unwrap_or_default();
    assert!(
        into.contains(":0") && !into.contains(" 14:0"),
        "{connections}"
    );
    assert_eq!(guest.text("many.exit").trim(), "0", "{log}");
    assert_plain(&organ);
}
