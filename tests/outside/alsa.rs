//! trued on a real ALSA sequencer: `aplaymidi` plays into it, `aseqdump` hears it (both of alsa-utils), a Debian kernel
//! carries the MIDI. What was heard is judged by the independent receiver of `tests/support`.

/// Edits of the stage file that change devices.
mod edits;
/// What is played into the guest, as MIDI files.
mod files;
/// The virtual machine and what it leaves.
mod guest;
/// A controller with lights.
mod lamps;
/// Ports that come and go, and stops of all kinds.
mod plugging;

use crate::support::receiver::{Kind, Receiver};
use files::{HELD, NOTES, Played};
use guest::Guest;
use std::path::Path;
use std::time::Duration;
use trued::stage::Stage;

/// Half a bend step at range 2: 400 cents over 16384 steps, halved.
const HALF_STEP_CENTS: f64 = 400.0 / 16384.0 / 2.0 + 1e-6;

const STAGE: &str = r#"
stage: Sequencer check
keyboards:
  keys: {port: virtual}
synths:
  organ: {port: virtual, dialect: channel-bend, bend_range: 2, tail_ms: 800}
cues:
  - {when: {program: any, channel: 16}, do: song}
set:
  - {song: Lantern hymn, tuning: quarter-comma-meantone}
  - {song: Harbour tag, tuning: werckmeister-3}
"#;

const PLUGGED: &str = r#"
stage: Plugged in
keyboards:
  keys: {port: "VirMIDI ?-0"}
synths:
  organ: {port: "VirMIDI ?-1", tail_ms: 300}
set:
  - {song: Lantern hymn, tuning: quarter-comma-meantone}
"#;

const LAYER: &str = r#"
stage: One synth too slow
keyboards:
  keys: {port: virtual}
synths:
  organ: {port: virtual, tail_ms: 300}
  bells: {port: virtual, tail_ms: 300}
parts:
  - {to: organ}
  - {to: bells}
set:
  - {song: Lantern hymn, tuning: quarter-comma-meantone}
"#;

/// Notes while one synth does not read: more messages than its queue in the kernel holds (200 events by default).
const RUN: usize = 240;
/// Notes after it reads again.
const FEW: usize = 20;

/// Quarter-comma meantone, Eb to G#, in cents above C, from its definition: four fifths make 5/1 (common practice).
fn meantone_cents(pitch_class: u8) -> f64 {
    let fifth = 1200.0 * 5f64.log2() / 4.0;
    // Fifths up from C for each of the twelve keys; Eb and Bb lie below.
    let fifths = [0, 7, 2, -3, 4, -1, 6, 1, 8, 3, -2, 5][pitch_class as usize];
    (f64::from(fifths) * fifth).rem_euclid(1200.0)
}

/// Werckmeister III from its definition (Werckmeister 1691): C-G, G-D, D-A and B-F# narrow by a quarter of the
/// Pythagorean comma, the other fifths pure.
fn werckmeister_cents(pitch_class: u8) -> f64 {
    let pure = 1200.0 * 1.5f64.log2();
    let comma = 12.0 * pure - 8400.0;
    // Keys in order of fifths from C, and how many narrow fifths have been passed on the way there.
    let order = [0, 7, 2, 9, 4, 11, 6, 1, 8, 3, 10, 5];
    let narrow = [0, 1, 2, 3, 3, 3, 4, 4, 4, 4, 4, 4];
    let place = order.iter().position(|p| *p == pitch_class).unwrap();
    (place as f64 * pure - f64::from(narrow[place]) * comma / 4.0).rem_euclid(1200.0)
}

/// Cents (100 x MIDI key) that a key should sound with A4 at 440 Hz.
fn wanted_cents(key: u8, song: usize) -> f64 {
    let above_c = [meantone_cents, werckmeister_cents][song];
    let octave = f64::from(key / 12) - 5.0;
    6900.0 + octave * 1200.0 + above_c(key % 12) - above_c(9)
}

/// One line of aseqdump as bytes.
fn bytes_of(line: &str) -> Option<Vec<u8>> {
    let numbers = |text: &str| -> Vec<i32> {
        text.split(|c: char| !c.is_ascii_digit() && c != '-')
            .filter_map(|word| word.parse().ok())
            .collect()
    };
    let kinds: [(&str, u8); 7] = [
        ("Note on", 0x90),
        ("Note off", 0x80),
        ("Polyphonic aftertouch", 0xA0),
        ("Control change", 0xB0),
        ("Program change", 0xC0),
        ("Channel aftertouch", 0xD0),
        ("Pitch bend", 0xE0),
    ];
    let (status, rest) = kinds.iter().find_map(|(name, status)| {
        let (_, rest) = line.split_once(name)?;
        Some((*status, numbers(rest)))
    })?;
    let status = status | rest[0] as u8;
    Some(match status & 0xF0 {
        0xE0 => {
            let bend = (rest[1] + 8192) as u16;
            vec![status, (bend & 0x7F) as u8, (bend >> 7) as u8]
        }
        _ => std::iter::once(status)
            .chain(rest[1..].iter().map(|n| *n as u8))
            .collect(),
    })
}

#[test]
fn on_a_real_sequencer() {
    let folder = std::env::temp_dir().join(format!("trued-alsa-{}", std::process::id()));
    std::fs::create_dir_all(&folder).unwrap();
    std::fs::write(folder.join("stage.yaml"), STAGE).unwrap();
    std::fs::write(folder.join("plugged.yaml"), PLUGGED).unwrap();
    std::fs::write(folder.join("layer.yaml"), LAYER).unwrap();
    plugging::write(&folder);
    let counts = format!("{} {NOTES} {FEW}\n", plugging::unplugs().0);
    std::fs::write(folder.join("counts"), counts).unwrap();
    edits::write(&folder);
    lamps::write(&folder);
    files::write_run(&folder.join("run.mid"), RUN);
    files::write_run(&folder.join("few.mid"), FEW);
    files::write_flood(&folder.join("flood.mid"));
    let played = files::write_evening(&folder.join("evening.mid"));
    files::write_held(&folder.join("held.mid"));
    let guest = Guest::run(folder, 400 + 10 * plugging::unplugs().0);
    assert_eq!(guest.text("missing.txt"), "", "{}", guest.text("ports.log"));
    two_thousand_notes_in_two_tunings_and_a_clean_stop(&guest, &played);
    plugging::judge(&guest);
    edits::judge(&guest);
    lamps::judge(&guest);
    a_synth_that_does_not_read_holds_nobody_up(&guest);
    what_ports_says(&guest);
}

fn two_thousand_notes_in_two_tunings_and_a_clean_stop(guest: &Guest, played: &[Played]) {
    let log = guest.text("trued.log");
    // A power-on range that is no range of ours, so that one never told is heard.
    let mut receiver = Receiver::new(Kind::Plain, Duration::ZERO, 7);
    let heard = guest.text("heard.txt");
    for (n, message) in heard.lines().filter_map(bytes_of).enumerate() {
        receiver.hear(Duration::from_millis(n as u64), &message);
    }
    let heard = receiver.notes.len();
    assert_eq!(heard, NOTES + HELD.len(), "the evening and the held chord");
    let mut worst: f64 = 0.0;
    for (n, (note, played)) in receiver.notes.iter().zip(played).enumerate() {
        assert_eq!(note.velocity, played.velocity, "note {n} is another one");
        let wanted = wanted_cents(played.key, played.song);
        worst = worst.max((note.onset_cents() - wanted).abs());
    }
    println!(
        "{NOTES} notes heard in order, worst onset {worst:.6} cents off (half a step is {HALF_STEP_CENTS:.6}), \
         {} bends, {} messages\n{log}",
        receiver.bends, receiver.messages
    );
    assert!(worst <= HALF_STEP_CENTS, "worst onset {worst} cents off");
    assert_eq!(receiver.orphans, [], "note-offs without a note");
    assert!(log.contains("ready: keyboard keys is a port"), "{log}");
    assert_eq!(guest.text("trued.exit").trim(), "0", "{log}");
    assert_plain(&receiver);
}

/// Every note has had its note-off, and the synth is left plain.
fn assert_plain(receiver: &Receiver) {
    assert!(receiver.stuck().is_empty(), "{:?}", receiver.stuck());
    assert_left_plain(receiver);
}

/// Nothing sounds, pedals are up, bends centred, ranges 2.
fn assert_left_plain(receiver: &Receiver) {
    assert!(receiver.sounding().is_empty(), "{:?}", receiver.sounding());
    for channel in 0..16u8 {
        let pedal = receiver.controller(channel, 64).unwrap_or(0);
        assert_eq!(pedal, 0, "the pedal of channel {}", channel + 1);
        assert_eq!(receiver.bend_cents(channel), 0.0, "channel {}", channel + 1);
        // Channel 10 is for drums and is never told anything.
        if channel != 9 {
            let range = receiver.range_cents(channel);
            assert_eq!(range, 200.0, "range of channel {}", channel + 1);
        }
    }
}

fn a_synth_that_does_not_read_holds_nobody_up(guest: &Guest) {
    let log = guest.text("layer.log");
    one_reads_and_one_does_not(guest, "free.txt", "stuck.txt");
    assert!(log.contains("organ did not read for a while"), "{log}");
    assert_eq!(guest.text("layer.exit").trim(), "0", "{log}");
    // Likewise where both hear the same port.
    one_reads_and_one_does_not(guest, "quick.txt", "slow.txt");
    let log = guest.text("pair.log");
    assert_eq!(guest.text("pair.exit").trim(), "0", "{log}");
}

fn one_reads_and_one_does_not(guest: &Guest, free: &str, stuck: &str) {
    let hear = |file: &str| {
        let mut receiver = Receiver::new(Kind::Plain, Duration::ZERO, 7);
        for message in guest.text(file).lines().filter_map(bytes_of) {
            receiver.hear(Duration::ZERO, &message);
        }
        receiver
    };
    let free = hear(free);
    let notes = free.notes.len();
    assert_eq!(notes, RUN + FEW, "the other hears every note");
    assert_plain(&free);
    // The kernel throws a full queue away, so what was lost is lost; but nothing hangs, and all that comes after is in
    // tune again.
    let stuck = hear(stuck);
    let heard = stuck.notes.len();
    println!("{heard} of {} notes at one that did not read", RUN + FEW);
    assert!((FEW..RUN + FEW).contains(&heard));
    let last = &stuck.notes[heard - FEW..];
    for (note, wanted) in last.iter().zip(&free.notes[RUN..]) {
        assert_eq!(note.velocity, wanted.velocity);
        assert!((note.onset_cents() - wanted.onset_cents()).abs() < 1e-6);
    }
    assert_left_plain(&stuck);
}

fn what_ports_says(guest: &Guest) {
    let ports = guest.text("ports.txt");
    println!("{ports}");
    assert!(ports.contains("Midi Through"), "{ports}");
    assert!(
        ports.contains("keyboard keys would be connected to"),
        "{ports}"
    );
    let starter = guest.text("starter.yaml");
    let stage = Stage::parse(Path::new("starter.yaml"), &starter);
    let stage = stage.unwrap_or_else(|complaints| panic!("{starter}\n{}", complaints[0]));
    assert_eq!(stage.keyboards.len(), 4, "four raw ports\n{starter}");
    let json: serde_json::Value = serde_json::from_str(&guest.text("ports.json")).expect("JSON");
    for keyboard in json["keyboards"].as_array().expect("a list") {
        let taken = keyboard["would_take"].as_array().expect("a list");
        assert_eq!(taken.len(), 1, "{keyboard}");
    }
    assert_eq!(
        guest.text("watch.txt"),
        "- {when: {controller: 82, from: keys}, do: next}\n\
         - {when: {program: 5, channel: 16, from: keys}, do: next}\n"
    );
    let without = guest.text("without.txt");
    let codes: Vec<&str> = without.lines().filter(|line| *line == "69").collect();
    assert_eq!(codes.len(), 2, "{without}");
    assert!(without.contains("sudo modprobe snd-seq"), "{without}");
}

#[test]
fn lines_of_aseqdump() {
    for (line, bytes) in [
        (
            "129:1   Note on                 0, note 60, velocity 100",
            vec![0x90, 60, 100],
        ),
        (
            "129:1   Note off                3, note 60, velocity 64",
            vec![0x83, 60, 64],
        ),
        (
            "129:1   Pitch bend              1, value -8192",
            vec![0xE1, 0, 0],
        ),
        (
            "129:1   Pitch bend              1, value 0",
            vec![0xE1, 0, 0x40],
        ),
        (
            "129:1   Control change         15, controller 101, value 0",
            vec![0xBF, 101, 0],
        ),
        (
            "129:1   Program change          2, program 5",
            vec![0xC2, 5],
        ),
    ] {
        assert_eq!(bytes_of(line), Some(bytes), "{line}");
    }
    assert_eq!(bytes_of("0:1   Port start              129:1"), None);
}
