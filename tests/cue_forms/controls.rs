//! What has cues, how a stage file writes them, and what may stand behind `do`.

use super::lasting::{BLACK_KEYS, TRANSPOSED, TUNINGS};
use crate::support::dice::Dice;

/// A thing that a player touches.
pub struct Control {
    pub when: &'static str,
    pub down: &'static [u8],
    /// Empty where it is over at once.
    pub up: &'static [u8],
    /// Another control that is let go by this one's going down: they are values of one controller.
    pub lets_go: Option<usize>,
}

const fn control(when: &'static str, down: &'static [u8], up: &'static [u8]) -> Control {
    Control {
        when,
        down,
        up,
        lets_go: None,
    }
}

pub const CONTROLS: [Control; 13] = [
    control("controller: 82", &[0xB0, 82, 127], &[0xB0, 82, 0]),
    control("controller: 83", &[0xB0, 83, 64], &[0xB0, 83, 63]),
    control("note: C1", &[0x90, 24, 80], &[0x80, 24, 64]),
    control("note: D1", &[0x90, 26, 80], &[0x90, 26, 0]),
    Control {
        lets_go: Some(5),
        ..control(
            "controller: 85, value: 40..80",
            &[0xB0, 85, 60],
            &[0xB0, 85, 10],
        )
    },
    Control {
        lets_go: Some(4),
        ..control(
            "controller: 85, value: 100..",
            &[0xB0, 85, 110],
            &[0xB0, 85, 30],
        )
    },
    control("pressure: 90..", &[0xD0, 95], &[0xD0, 20]),
    control("notes: E1..F1", &[0x90, 28, 80], &[0x80, 28, 64]),
    // The other key of the same cue.
    control("", &[0x90, 29, 80], &[0x80, 29, 64]),
    control(
        "program: 5, bank: 1/2",
        &[0xB0, 0, 1, 0xB0, 32, 2, 0xC0, 4],
        &[],
    ),
    control("program: 5, bank: 3", &[0xB0, 0, 3, 0xC0, 4], &[]),
    control("program: any, bank: 7", &[0xB0, 0, 7, 0xC0, 2], &[]),
    control("song_select: 3", &[0xF3, 2], &[]),
];
const RANGE: usize = 7;
const ANY_PROGRAM: usize = 11;

impl Control {
    /// The key that it is, which a cue with `pass: yes` plays as well.
    pub fn key(&self) -> Option<u8> {
        (self.down[0] == 0x90).then_some(self.down[1])
    }
}

/// Ways of pressing that one control can have together.
const FORMS: [&[&str]; 9] = [
    &["down"],
    &["up"],
    &["either"],
    &["long"],
    &["down", "long"],
    &["up", "long"],
    &["down", "up"],
    &["held"],
    &["held", "long"],
];
/// What is over at once has no press.
const ONCE: &[&str] = &["once"];
/// What can be held begins here.
const LASTING: usize = 12;
pub const ACTIONS: [&str; 40] = [
    "next",
    "back",
    "song 3",
    "song Fifth",
    "next from Third",
    "fresh",
    "panic",
    "reload",
    "stop",
    "resend",
    "resend synth",
    "home",
    "pitch +5 c",
    "pitch -30 c now",
    "pitch 441 Hz",
    "pitch home",
    "pitch home now",
    "transpose +2",
    "transpose home",
    "plain",
    "inflect C high",
    "inflect C4 high",
    "inflect C4 home",
    "inflect E low",
    "turn both",
    "inflect C home",
    "inflect C +7 c",
    "inflect home",
    "black-key Ab",
    "black-key G#",
    "tonic D",
    "tonic G pivot",
    "tonic A equal",
    "tonic home",
    "tonic next-key pivot",
    // The fifth song follows chords.
    "root hold",
    "root free",
    "root next-key",
    "sevenths harmonic",
    "sevenths plain",
];
/// A range of keys, as it is written, and what it says on its two keys.
const BY_KEY: [(&str, [&str; 2]); 3] = [
    ("tonic", ["tonic E", "tonic F"]),
    ("tonic pivot", ["tonic E pivot", "tonic F pivot"]),
    ("tonic equal", ["tonic E equal", "tonic F equal"]),
];
/// What lamps show.
pub const LAMPS: [&str; 18] = [
    "plain",
    "song Third",
    "transpose +2",
    "pitch home",
    "tonic next-key",
    "root next-key",
    "root hold",
    "root free",
    "sevenths harmonic",
    "tonic home",
    "tonic D",
    "inflect C high",
    "inflect C home",
    "inflect home",
    "turn both",
    "black-key Ab",
    "black-key G#",
    "home",
];
pub const TITLES: [&str; 5] = ["First", "Second", "Third", "Fourth", "Fifth"];

pub struct Cue {
    pub control: usize,
    pub form: &'static str,
    pub long_ms: u64,
    pub action: &'static str,
    pub quiet: bool,
    pub pass: bool,
    written: &'static str,
}

/// Each form that a control can have, by itself.
pub fn forms(control: usize) -> Vec<&'static str> {
    match CONTROLS[control].up.is_empty() {
        true => ONCE.to_vec(),
        false => vec!["down", "up", "either", "long", "held"],
    }
}

pub fn can_be_held(action: &str) -> bool {
    ACTIONS[LASTING..].contains(&action)
}

pub fn some_cues(dice: &mut Dice) -> Vec<Cue> {
    let mut cues = Vec::new();
    let written = |(_, control): &(usize, &Control)| !control.when.is_empty();
    for (control, its) in CONTROLS.iter().enumerate().filter(written) {
        let pass = dice.percent(25);
        let forms = match its.up.is_empty() {
            true => ONCE,
            false => dice.pick(&FORMS),
        };
        for form in forms {
            let action = match *form {
                "held" => dice.pick(&ACTIONS[LASTING..]),
                _ => dice.pick(&ACTIONS),
            };
            let cue = Cue {
                control,
                form,
                long_ms: dice.pick(&[300, 800]),
                action,
                quiet: *form != "held" && dice.percent(40),
                pass,
                written: action,
            };
            if control == ANY_PROGRAM && dice.percent(30) {
                // The third song has program 3.
                cues.push(Cue {
                    action: "song 3",
                    written: "song",
                    ..cue
                });
            } else if control == RANGE {
                let by_key = dice.percent(40).then(|| dice.pick(&BY_KEY));
                let (written, actions) = by_key.unwrap_or((action, [action; 2]));
                for (key, action) in actions.into_iter().enumerate() {
                    cues.push(Cue {
                        control: RANGE + key,
                        action,
                        written,
                        ..cue
                    });
                }
            } else {
                cues.push(cue);
            }
        }
    }
    cues
}

pub fn stage(cues: &[Cue], dialect: &str) -> String {
    let mut text = format!(
        "keyboards: {{keys: {{port: virtual}}, pads: {{port: virtual}}}}\n\
         synths: {{synth: {{port: virtual, dialect: {dialect}, bend_range: 12}}}}\ntunings:\n"
    );
    for (title, tuning) in TITLES.iter().zip(TUNINGS) {
        text += &format!("  of {title}: {tuning}\n");
    }
    text += "set:\n";
    for (title, keys) in TITLES.iter().zip(TRANSPOSED) {
        let more = match *title {
            "Third" => BLACK_KEYS,
            "Fifth" => ", intonation: chord-root",
            _ => "",
        };
        text += &format!("  - {{song: {title}, tuning: of {title}, transpose: {keys}{more}}}\n");
    }
    text += "lamps:\n";
    for (number, show) in LAMPS.iter().enumerate() {
        text += &format!("  - {{show: {show}, send: {{controller: {number}, to: pads}}}}\n");
    }
    text += "cues:\n";
    for cue in cues
        .iter()
        .filter(|cue| !CONTROLS[cue.control].when.is_empty())
    {
        let long = match cue.form {
            "long" => format!(", long_ms: {}", cue.long_ms),
            _ => String::new(),
        };
        let quiet = if cue.quiet { ", at: quiet" } else { "" };
        let pass = if cue.pass { ", pass: yes" } else { "" };
        let (press, held) = match cue.form {
            "held" => (String::new(), ", while: held"),
            "once" => (String::new(), ""),
            form => (format!(", press: {form}"), ""),
        };
        text += &format!(
            "  - {{when: {{{}{press}{long}}}, do: {}{held}{quiet}{pass}}}\n",
            CONTROLS[cue.control].when, cue.written
        );
    }
    text
}
