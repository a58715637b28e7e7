//! Scripts in, transcripts out: a small language so that a test reads like a score.
//!
//! A line is a time in milliseconds and what happens then:
//! `0 on C4 100` · `0 chord C4 E4 G4` (struck as one) · `500 off C4` · `0 pedal down` · `0 sostenuto up` · `0 wheel 16383` · `0 send F0 7D 01 F7` (raw bytes) ·
//! `0 cc 82 127` · `0 program 3` (as on the wire) · `0 tell pitch +1 c` (a rig of a stage file) ·
//! `0 song 2` · `0 next` · `0 back` · `0 panic` · `0 resend` · `0 end` · `0 stop` · `0 lost` (the keyboard) ·
//! `0 synth down` (`up`, `back`, `tight`, `easy`) · `0 wait`. `second` before a gesture: from the other keyboard.
//!
//! The transcript says what the first synth sounded: `0 60 sounds 6000.0` · `5 60 moves to 6100.0` ·
//! `9 60 let go, held by a pedal` · `12 60 ends` · `12 60 cut off`.

use super::hex;
use super::receiver::Receiver;
use super::rig::{Rig, keyboard_id};
use std::time::Duration;
use trued::engine::{Command, Input, Link};
use trued::time::Time;
use trued::tuning::Key;

impl Rig {
    /// Plays a script and tells what was heard of it.
    pub fn play(&mut self, script: &str) -> String {
        let began = Duration::from_nanos(self.now.nanos());
        for line in script.lines().map(str::trim).filter(|l| !l.is_empty()) {
            let mut words = line.split_whitespace();
            let at_ms = words.next().and_then(|word| word.parse().ok());
            let at_ms = at_ms.unwrap_or_else(|| panic!("a line begins with its time: {line}"));
            self.until(Time::from_millis(at_ms));
            let words: Vec<&str> = words.collect();
            match words[..] {
                ["second", ref rest @ ..] => self.gesture(1, rest),
                ref all => self.gesture(0, all),
            }
        }
        transcript(self.heard(), began)
    }

    fn gesture(&mut self, keyboard: usize, words: &[&str]) {
        let place = |down: &str| if down == "down" { 127 } else { 0 };
        match words {
            ["wait"] => {}
            ["on", name, velocity] => self.midi(keyboard, &[0x90, key(name), number(velocity)]),
            ["chord", names @ ..] => {
                let on = |name: &&str| [0x90, key(name), 100];
                self.midi(keyboard, &names.iter().flat_map(on).collect::<Vec<u8>>());
            }
            ["off", name] => self.midi(keyboard, &[0x80, key(name), 64]),
            ["pedal", to] => self.midi(keyboard, &[0xB0, 64, place(to)]),
            ["sostenuto", to] => self.midi(keyboard, &[0xB0, 66, place(to)]),
            ["wheel", to] => {
                let to: u16 = to.parse().expect("0-16383");
                self.midi(keyboard, &[0xE0, (to & 0x7F) as u8, (to >> 7) as u8]);
            }
            ["send", bytes @ ..] => self.midi(keyboard, &hex(&bytes.join(" "))),
            ["cc", which, value] => {
                self.midi(keyboard, &[0xB0, number(which), number(value)]);
            }
            ["program", which] => self.midi(keyboard, &[0xC0, number(which)]),
            ["tell", words @ ..] => self.tell(&words.join(" ")),
            ["lost"] => self.input(Input::KeyboardLost(keyboard_id(keyboard))),
            ["synth", state] => self.link(0, link(state)),
            ["song", place] => self.command(Command::Song(number(place) as u16 - 1)),
            [word] => self.command(command(word)),
            _ => panic!("no such gesture: {words:?}"),
        }
    }
}

fn key(name: &str) -> u8 {
    Key::parse(name).expect("a key such as C4").number()
}

fn number(word: &str) -> u8 {
    word.parse().expect("a number")
}

fn link(state: &str) -> Link {
    match state {
        "down" => Link::Down,
        "up" => Link::Up,
        "back" => Link::Back,
        "tight" => Link::Tight,
        "easy" => Link::Easy,
        _ => panic!("no such state: {state}"),
    }
}

fn command(word: &str) -> Command {
    match word {
        "next" => Command::Next,
        "back" => Command::Back,
        "panic" => Command::Panic,
        "resend" => Command::Resend(None),
        "end" => Command::End,
        "stop" => Command::Stop,
        _ => panic!("no such command: {word}"),
    }
}

/// What was heard from `began` on, in order of time, then of onset.
fn transcript(heard: &Receiver, began: Duration) -> String {
    let mut lines = Vec::new();
    for note in &heard.notes {
        let mut line = |at: Duration, what: String| {
            if at >= began {
                lines.push((at, format!("{} {} {what}\n", at.as_millis(), note.number)));
            }
        };
        line(note.on, format!("sounds {:.1}", note.onset_cents()));
        for (at, cents) in &note.pitch[1..] {
            line(*at, format!("moves to {cents:.1}"));
        }
        match (note.released, note.end) {
            (Some(at), Some(end)) if at < end => {
                line(at, "let go, held by a pedal".into());
            }
            (Some(at), None) => line(at, "let go, held by a pedal".into()),
            _ => {}
        }
        if let Some(end) = note.end {
            line(end, if note.cut { "cut off" } else { "ends" }.into());
        }
    }
    lines.sort_by_key(|(at, _)| *at);
    lines.into_iter().map(|(_, line)| line).collect()
}

/// Compares transcripts, whatever their indentation.
#[track_caller]
pub fn assert_heard(heard: &str, wanted: &str) {
    let wanted: String = wanted
        .lines()
        .map(str::trim)
        .filter(|line| !line.is_empty())
        .map(|line| format!("{line}\n"))
        .collect();
    assert!(heard == wanted, "heard:\n{heard}\nwanted:\n{wanted}");
}
