//! trued on a real ALSA sequencer: `aplaymidi` plays into it, `aseqdump` hears it (both of alsa-utils), a Debian kernel
//! carries the MIDI. What was heard is judged by the independent receiver of `tests/support`.

use crate::support::dice::Dice;
use crate::support::receiver::{Kind, Receiver};
use midly::num::{u4, u7, u15, u24, u28};
use midly::{Format, Header, MetaMessage, MidiMessage, Smf, Timing, TrackEvent, TrackEventKind};
use std::path::{Path, PathBuf};
use std::process::Command;
use std::time::Duration;
use trued::stage::Stage;

const NOTES: usize = 2000;
/// The song changes after so many notes: six changes in all, three times each song.
const NOTES_A_SONG: usize = NOTES / 6;
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
const RUN: usize = 600;
/// Notes after it reads again.
const FEW: usize = 20;

/// Keys that are down when the stop comes.
const HELD: [u8; 4] = [48, 52, 55, 61];

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

struct Played {
    key: u8,
    velocity: u8,
    song: usize,
}

/// A track under way: events with their ticks since the one before.
#[derive(Default)]
struct Track(Vec<TrackEvent<'static>>);

impl Track {
    fn add(&mut self, delta: u32, channel: u8, message: MidiMessage) {
        self.0.push(TrackEvent {
            delta: u28::new(delta),
            kind: TrackEventKind::Midi {
                channel: u4::new(channel),
                message,
            },
        });
    }

    /// One tick is a millisecond: 1000 ticks to a beat of one second.
    fn save(mut self, path: &Path) {
        let meta = |delta, message| TrackEvent {
            delta: u28::new(delta),
            kind: TrackEventKind::Meta(message),
        };
        let tempo = MetaMessage::Tempo(u24::new(1_000_000));
        self.0.insert(0, meta(0, tempo));
        self.0.push(meta(0, MetaMessage::EndOfTrack));
        let timing = Timing::Metrical(u15::new(1000));
        let mut smf = Smf::new(Header::new(Format::SingleTrack, timing));
        smf.tracks.push(self.0);
        smf.save(path).expect("a writable file");
    }
}

fn on(key: u8, velocity: u8) -> MidiMessage {
    MidiMessage::NoteOn {
        key: u7::new(key),
        vel: u7::new(velocity),
    }
}

fn off(key: u8) -> MidiMessage {
    MidiMessage::NoteOff {
        key: u7::new(key),
        vel: u7::new(64),
    }
}

fn pedal(value: u8) -> MidiMessage {
    MidiMessage::Controller {
        controller: u7::new(64),
        value: u7::new(value),
    }
}

/// Chords of one to four keys, some under the pedal, with song changes between them, mostly while keys are down.
fn write_evening(path: &Path) -> Vec<Played> {
    let mut dice = Dice::new(20);
    let mut track = Track::default();
    let mut played: Vec<Played> = Vec::new();
    let mut down: Vec<u8> = Vec::new();
    let mut song = 0;
    while played.len() < NOTES {
        let due = played.len() / NOTES_A_SONG % 2;
        if due != song {
            song = due;
            let program = u7::new(song as u8);
            track.add(5, 15, MidiMessage::ProgramChange { program });
        }
        track.add(15, 0, pedal(if dice.percent(20) { 127 } else { 0 }));
        let chord = (1 + dice.below(4) as usize).min(NOTES - played.len());
        let mut keys: Vec<u8> = Vec::new();
        while keys.len() < chord {
            let key = 36 + dice.below(49) as u8;
            if !keys.contains(&key) && !down.contains(&key) {
                keys.push(key);
            }
        }
        for (n, key) in keys.iter().enumerate() {
            let velocity = 1 + dice.below(127) as u8;
            track.add(if n == 0 { 5 } else { 0 }, 0, on(*key, velocity));
            played.push(Played {
                key: *key,
                velocity,
                song,
            });
        }
        for (n, key) in down.drain(..).enumerate() {
            track.add(if n == 0 { 10 } else { 0 }, 0, off(key));
        }
        down = keys;
    }
    for key in down {
        track.add(10, 0, off(key));
    }
    track.add(10, 0, pedal(0));
    track.save(path);
    played
}

/// A chord and a pedal that are still down when the stop comes, and the wheel pushed.
fn write_held(path: &Path) {
    let mut track = Track::default();
    track.add(0, 0, pedal(127));
    for key in HELD {
        track.add(0, 0, on(key, 90));
    }
    let bend = midly::PitchBend(midly::num::u14::new(12_000));
    track.add(200, 0, MidiMessage::PitchBend { bend });
    track.add(60_000, 0, pedal(0));
    track.save(path);
}

/// Notes one after another.
fn write_run(path: &Path, notes: usize) {
    let mut track = Track::default();
    for n in 0..notes {
        let key = 48 + (n * 7 % 36) as u8;
        track.add(2, 0, on(key, 1 + (n % 127) as u8));
        track.add(2, 0, off(key));
    }
    track.save(path);
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

/// What the guest left.
struct Guest {
    out: PathBuf,
    folder: PathBuf,
}

impl Guest {
    fn run(folder: PathBuf) -> Guest {
        for tool in ["qemu-system-x86_64", "busybox", "cpio", "aseqdump"] {
            let found = Command::new("sh")
                .args(["-c", &format!("command -v {tool}")])
                .output()
                .is_ok_and(|output| output.status.success());
            assert!(found, "{tool} is missing; run tests/setup");
        }
        let here = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/outside");
        let out = folder.join("out");
        let files = [
            "stage.yaml",
            "plugged.yaml",
            "layer.yaml",
            "evening.mid",
            "held.mid",
            "run.mid",
            "few.mid",
        ];
        let done = Command::new(here.join("alsa_vm.sh"))
            .arg(here.join("alsa_guest.sh"))
            .arg(&out)
            .arg(env!("CARGO_BIN_EXE_trued"))
            .args(files.map(|file| folder.join(file)))
            .env("VM_TIMEOUT_S", "240")
            .output()
            .expect("bash runs");
        let guest = Guest { out, folder };
        assert!(
            done.status.success(),
            "the guest ended with {}\n{}\n{}\n{}",
            done.status,
            String::from_utf8_lossy(&done.stdout),
            String::from_utf8_lossy(&done.stderr),
            guest.text("trued.log"),
        );
        guest
    }

    fn bytes(&self, file: &str) -> Vec<u8> {
        std::fs::read(self.out.join(file)).unwrap_or_default()
    }

    fn text(&self, file: &str) -> String {
        String::from_utf8_lossy(&self.bytes(file)).into_owned()
    }
}

impl Drop for Guest {
    fn drop(&mut self) {
        // Left for a look when a test has failed.
        if !std::thread::panicking() {
            let _ = std::fs::remove_dir_all(&self.folder);
        }
    }
}

#[test]
fn on_a_real_sequencer() {
    let folder = std::env::temp_dir().join(format!("trued-alsa-{}", std::process::id()));
    std::fs::create_dir_all(&folder).unwrap();
    std::fs::write(folder.join("stage.yaml"), STAGE).unwrap();
    std::fs::write(folder.join("plugged.yaml"), PLUGGED).unwrap();
    std::fs::write(folder.join("layer.yaml"), LAYER).unwrap();
    write_run(&folder.join("run.mid"), RUN);
    write_run(&folder.join("few.mid"), FEW);
    let played = write_evening(&folder.join("evening.mid"));
    write_held(&folder.join("held.mid"));
    let guest = Guest::run(folder);
    assert_eq!(
        guest.text("missing.txt"),
        "",
        "{}",
        guest.text("plugged.log")
    );
    two_thousand_notes_in_two_tunings_and_a_clean_stop(&guest, &played);
    ports_by_name_pulled_out_and_put_in_again(&guest);
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

fn ports_by_name_pulled_out_and_put_in_again(guest: &Guest) {
    let log = guest.text("plugged.log");
    println!("{log}");
    let wanted = wanted_cents(64, 0);
    let hear = |bytes: &[u8]| {
        let mut receiver = Receiver::new(Kind::Plain, Duration::ZERO, 7);
        receiver.hear(Duration::ZERO, bytes);
        receiver
    };
    // The ear begins to listen after the set-up: it does not know the range, so only the bend itself is compared.
    let first = guest.bytes("first.bin");
    let onset = first
        .windows(3)
        .position(|w| w[0] & 0xF0 == 0x90 && w[1..] == [64, 100]);
    assert!(onset.is_some(), "the first note came through: {first:02x?}");
    // The second time the set-up is heard, at the latest when it is said once more after 2 s.
    let second = hear(&guest.bytes("second.bin"));
    assert_eq!(second.notes.len(), 1, "{:02x?}", guest.bytes("second.bin"));
    let note = &second.notes[0];
    let bend = second.notes[0].onset_cents() - f64::from(note.number) * 100.0;
    assert!(bend.abs() > 1.0, "the note is bent");
    assert!(
        (note.onset_cents() - wanted).abs() <= HALF_STEP_CENTS,
        "{} instead of {wanted}",
        note.onset_cents()
    );
    assert_eq!(guest.text("plugged.exit").trim(), "0", "{log}");
    assert_plain(&second);
}

fn a_synth_that_does_not_read_holds_nobody_up(guest: &Guest) {
    let log = guest.text("layer.log");
    let hear = |file: &str| {
        let mut receiver = Receiver::new(Kind::Plain, Duration::ZERO, 7);
        for message in guest.text(file).lines().filter_map(bytes_of) {
            receiver.hear(Duration::ZERO, &message);
        }
        receiver
    };
    let free = hear("free.txt");
    assert_eq!(
        free.notes.len(),
        RUN + FEW,
        "the other synth hears every note"
    );
    assert_plain(&free);
    // The kernel throws a full queue away, so what was lost is lost; but nothing hangs, and all that comes after is in
    // tune again.
    let stuck = hear("stuck.txt");
    println!(
        "{} of {} notes at the synth that did not read\n{log}",
        stuck.notes.len(),
        RUN + FEW
    );
    assert!(stuck.notes.len() >= FEW && stuck.notes.len() < RUN + FEW);
    let last = &stuck.notes[stuck.notes.len() - FEW..];
    let wanted = &free.notes[RUN..];
    for (note, wanted) in last.iter().zip(wanted) {
        assert_eq!(note.velocity, wanted.velocity);
        assert!((note.onset_cents() - wanted.onset_cents()).abs() < 1e-6);
    }
    assert_left_plain(&stuck);
    assert!(log.contains("organ did not read for a while"), "{log}");
    assert_eq!(guest.text("layer.exit").trim(), "0", "{log}");
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
