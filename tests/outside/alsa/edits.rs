//! Edits of the stage file that change devices while a chord is held: what alsa_edits.sh did in the guest, judged by the
//! independent receiver.

use super::guest::Guest;
use super::plugging::{CHORD, assert_in_tune, hear_lines, hear_raw};
use super::{assert_plain, wanted_cents};
use crate::support::receiver::Receiver;
use std::path::Path;

fn stage(keyboards: &str, synths: &[(&str, &str)]) -> String {
    let lines = |line: &dyn Fn(&str, &str) -> String| -> String {
        synths.iter().map(|(name, port)| line(name, port)).collect()
    };
    let devices = lines(&|name, port| format!("  {name}: {{port: {port}, tail_ms: 300}}\n"));
    let parts = lines(&|name, _| format!("  - {{to: {name}}}\n"));
    format!(
        "stage: Edited\nkeyboards: {keyboards}\nsynths:\n{devices}parts:\n{parts}set:\n\
         \x20 - {{song: Lantern hymn, tuning: quarter-comma-meantone}}\n\
         \x20 - {{song: Harbour tag, tuning: werckmeister-3}}\n"
    )
}

pub const FILES: [&str; 5] = [
    "edits_start.yaml",
    "edits_more.yaml",
    "edits_renamed.yaml",
    "edits_other_keys.yaml",
    "edits_turned.yaml",
];

pub fn write(folder: &Path) {
    let organ = ("organ", "\"VirMIDI ?-1\"");
    let flute = ("flute", "\"VirMIDI ?-2\"");
    let (bells, chimes) = (("bells", "virtual"), ("chimes", "virtual"));
    let one = "{keys: {port: \"VirMIDI ?-0\"}}";
    let two = "{keys: {port: \"VirMIDI ?-0\"}, pads: {port: \"VirMIDI ?-3\"}}";
    let other = "{keys: {port: \"VirMIDI ?-3\"}}";
    let texts = [
        stage(one, &[organ, bells]),
        stage(two, &[organ, bells, flute]),
        stage(two, &[organ, chimes, flute]),
        stage(other, &[organ, chimes, flute]),
        stage(other, &[chimes, organ]),
    ];
    for (name, text) in FILES.iter().zip(texts) {
        std::fs::write(folder.join(name), text).unwrap();
    }
}

/// The key that is struck beside the chord.
const ABOVE: u8 = 72;

/// Keys that are down, as the synth hears it; what only the pedal holds is not among them.
fn held_keys(receiver: &Receiver) -> Vec<u8> {
    let held = receiver.notes.iter().filter(|note| note.released.is_none());
    let nearest = |cents: f64| (cents / 100.0).round() as u8;
    held.map(|note| nearest(note.onset_cents())).collect()
}

fn assert_ended(receiver: &Receiver, what: &str) {
    let sounding = receiver.sounding();
    assert!(sounding.is_empty(), "{what}: {sounding:?}");
    assert_eq!(receiver.orphans, [], "{what}");
    assert!(
        receiver.stuck().is_empty(),
        "{what}: {:?}",
        receiver.stuck()
    );
}

pub fn judge(guest: &Guest) {
    let log = guest.text("edits.log");
    println!("{log}");
    let organ = |when: &str| hear_raw(&guest.bytes(&format!("edits.{when}.organ")));
    let lines = |file: &str| hear_lines(guest, &format!("edits.{file}.txt"));

    // More devices: the chord goes on where it was, and what is new plays.
    assert_eq!(held_keys(&organ("more")), CHORD, "{log}");
    assert_eq!(held_keys(&lines("more.bells")), CHORD, "{log}");
    let flute = hear_raw(&guest.bytes("edits.flute"));
    assert_in_tune(&flute, 0, &[ABOVE]);
    // The bells with another name: they alone are let go.
    assert_eq!(held_keys(&organ("renamed")), CHORD, "{log}");
    assert_ended(&lines("renamed.bells"), "bells");
    // Another keyboard: the chord is let go; and the old one is not heard.
    assert_ended(&organ("other_keys"), "organ, other keyboard");
    // Turned: let go, and played again.
    assert_ended(&organ("turned"), "organ, turned");
    assert_ended(&lines("turned.chimes"), "chimes, turned");

    let organ = hear_raw(&guest.bytes("edits.organ"));
    let keys = [&CHORD[..], &[ABOVE, ABOVE], &CHORD[..], &[ABOVE]].concat();
    assert_eq!(organ.notes.len(), keys.len() + 1, "{log}");
    assert_in_tune(&organ, 0, &keys);
    // After `tell next`, and a bad edit, in the second song's tuning.
    let last = organ.notes[keys.len()].onset_cents();
    assert!(
        (last - wanted_cents(ABOVE, 1)).abs() <= super::HALF_STEP_CENTS,
        "{last}"
    );
    assert_eq!(organ.orphans, []);
    assert_plain(&organ);
    assert_plain(&lines("chimes"));
    assert_ended(&flute, "flute");
    assert_eq!(guest.text("edits.exit").trim(), "0", "{log}");

    let told = guest.text("edits.tell.txt");
    let codes: Vec<&str> = told.lines().filter(|line| *line == "0").collect();
    assert_eq!(codes.len(), 2, "{told}");
    let status: serde_json::Value = serde_json::from_str(&guest.text("edits.json")).expect("JSON");
    assert_eq!(status["song"]["title"], "Harbour tag");
    let names = |devices: &serde_json::Value| -> Vec<(String, bool)> {
        let devices = devices.as_array().expect("a list").iter();
        let one = |d: &serde_json::Value| (d["name"].to_string(), d["connected"] == true);
        devices.map(one).collect()
    };
    let connected = |name: &str| (format!("\"{name}\""), true);
    assert_eq!(
        names(&status["synths"]),
        [connected("chimes"), connected("organ")]
    );
    assert_eq!(names(&status["keyboards"]), [connected("keys")]);
    let status = guest.text("edits.status.txt");
    assert!(status.contains("edited.yaml:2:"), "{status}");
}
