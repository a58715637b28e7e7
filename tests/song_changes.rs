//! A thousand song changes under held and pedalled notes: what sounds does not move, what begins is in the new tuning by
//! published figures, and only what differs is sent. `cargo test song_changes -- --nocapture` prints the bytes.

use crate::support::dice::Dice;
use crate::support::published::FIVE_TUNINGS;
use crate::support::receiver::Hold;
use crate::support::rig::Rig;
use trued::engine::Report;
use trued::time::Span;

const CHANGES: usize = 1_000;
const HZ: [f64; 5] = [440.0, 415.0, 466.0, 430.5, 442.0];
const KEYS_HELD_MAX: usize = 5;
/// Published cents and trued's pitches are both rounded to the millionth.
const ROUNDING_CENTS: f64 = 2e-6;

fn evening(dialect: &str, range: u8) -> Rig {
    let songs = FIVE_TUNINGS.iter().zip(HZ).map(|(tuning, hz)| {
        format!(
            "  - {{song: In {name}, tuning: {name}, pitch: A4 = {hz} Hz}}\n",
            name = tuning.name
        )
    });
    Rig::of(&format!(
        "keyboards: {{keys: {{port: virtual}}, pads: {{port: virtual}}}}\n\
         synths: {{synth: {{port: virtual, dialect: {dialect}, bend_range: {range}}}}}\n\
         cues:\n  - {{when: {{program: any, channel: 16}}, do: song}}\n  - {{when: {{controller: 82}}, do: next}}\n\
         set:\n{}",
        songs.collect::<String>()
    ))
}

struct Performance {
    rig: Rig,
    dice: Dice,
    held: Vec<u8>,
    /// Damper, then sostenuto.
    pedals: [bool; 2],
    half_step_cents: f64,
    /// Sent in the very moment of a change.
    bytes_at_changes: usize,
    worst_cents: f64,
    pedalled: usize,
}

impl Performance {
    fn song(&self) -> usize {
        self.rig.engine.report().song as usize
    }

    fn strike(&mut self) {
        let key = self.dice.between(40, 90) as u8;
        if self.held.len() == KEYS_HELD_MAX || self.held.contains(&key) {
            return;
        }
        self.held.push(key);
        let before = self.rig.heard().notes.len();
        self.rig.midi(0, &[0x90, key, 90]);
        let song = self.song();
        let wanted = FIVE_TUNINGS[song].key_cents(key) + 1200.0 * (HZ[song] / 440.0).log2();
        let note = &self.rig.heard().notes[before];
        let error = (note.onset_cents() - wanted).abs();
        assert!(
            error <= self.half_step_cents,
            "key {key} in song {song} should sound {wanted}: {note:?}"
        );
        self.worst_cents = self.worst_cents.max(error);
    }

    fn release(&mut self) {
        if !self.held.is_empty() {
            let place = self.dice.below(self.held.len() as u64) as usize;
            let key = self.held.remove(place);
            self.rig.midi(0, &[0x80, key, 64]);
        }
    }

    fn pedal(&mut self, which: usize, down: bool) {
        self.pedals[which] = down;
        self.rig
            .midi(0, &[0xB0, [64, 66][which], u8::from(down) * 127]);
    }

    fn play_a_little(&mut self) {
        for _ in 0..self.dice.between(3, 9) {
            let pause_ms = self.dice.between(1, 120);
            self.rig.until(self.rig.now + Span::from_millis(pause_ms));
            match self.dice.below(10) {
                0..=3 => self.strike(),
                4..=7 => self.release(),
                8 => self.pedal(0, !self.pedals[0]),
                _ => self.pedal(1, !self.pedals[1]),
            }
        }
    }

    /// By program change, by switch or by `tell`: always to another song, always while something is held.
    fn change(&mut self) {
        if self.rig.heard().sounding().is_empty()
            || self.held.is_empty() && self.pedals == [false; 2]
        {
            self.strike();
        }
        self.pedalled += usize::from(self.held.is_empty());
        let (before, mark) = (self.song(), self.rig.sent.len());
        let other = (before + self.dice.between(1, 4) as usize) % 5;
        match self.dice.below(3) {
            0 if before < 4 => {
                self.rig.until(self.rig.now + Span::from_millis(401));
                let mark = self.rig.sent.len();
                self.rig.midi(0, &[0xB0, 82, 127]);
                self.count(mark);
                self.rig.midi(0, &[0xB0, 82, 0]);
            }
            1 => self.rig.tell(&format!("song {}", other + 1)),
            _ => self.rig.midi(0, &[0xCF, other as u8]),
        }
        self.count(mark);
        assert_ne!(self.song(), before);
    }

    fn count(&mut self, mark: usize) {
        let sent = self.rig.sent[mark..].iter().map(|sent| sent.bytes.len());
        self.bytes_at_changes += sent.sum::<usize>();
    }

    fn rest(&mut self) {
        while !self.held.is_empty() {
            self.release();
        }
        for which in 0..2 {
            self.pedal(which, false);
        }
        self.rig.until(self.rig.now + Span::from_millis(2_000));
    }
}

/// Notes that a key or pedal held, bent all the same.
fn held_moved(rig: &Rig) -> usize {
    let moves = rig.heard().moves.iter();
    moves.filter(|moved| moved.hold == Hold::Held).count()
}

fn check(dialect: &str, range: u8, seed: u64) -> (Performance, Report) {
    let mut play = Performance {
        rig: evening(dialect, range),
        dice: Dice::new(seed),
        held: Vec::new(),
        pedals: [false; 2],
        half_step_cents: f64::from(range) * 100.0 / 8192.0 / 2.0 + ROUNDING_CENTS,
        bytes_at_changes: 0,
        worst_cents: 0.0,
        pedalled: 0,
    };
    for change in 0..CHANGES {
        play.play_a_little();
        play.change();
        if change % 50 == 49 {
            play.rest();
        }
    }
    play.rest();
    let heard = play.rig.heard();
    assert_eq!(
        held_moved(&play.rig),
        0,
        "{dialect}, seed {seed}: held notes moved"
    );
    assert!(
        heard.stuck().is_empty() && heard.orphans.is_empty(),
        "{dialect}, seed {seed}"
    );
    assert!(
        heard.repeats.is_empty(),
        "{dialect}, seed {seed}: {:02X?}",
        heard.repeats[0]
    );
    assert_eq!(heard.zones_while_sounding, 0);
    assert_eq!(play.bytes_at_changes, 0, "{dialect}, seed {seed}");
    let report = play.rig.engine.report();
    (play, report)
}

#[test]
fn sounding_notes_stay_new_ones_are_right_and_only_what_differs_is_sent() {
    println!(
        "dialect       range  changes  by pedal alone  notes  held moved  repeats  bytes at changes  bends  bytes  worst cents  stolen"
    );
    for (dialect, range, seed) in [
        ("channel-bend", 2, 1),
        ("channel-bend", 12, 2),
        ("mpe", 48, 3),
    ] {
        let (play, report) = check(dialect, range, seed);
        let bytes: usize = play.rig.sent.iter().map(|sent| sent.bytes.len()).sum();
        println!(
            "{dialect:<14}{range:>5}{CHANGES:>9}{:>16}{:>7}{:>12}{:>9}{:>18}{:>7}{bytes:>7}{:>13.4}{:>8}",
            play.pedalled,
            play.rig.heard().notes.len(),
            held_moved(&play.rig),
            play.rig.heard().repeats.len(),
            play.bytes_at_changes,
            report.counters.bends,
            play.worst_cents,
            report.counters.stolen,
        );
        assert!(play.rig.heard().notes.len() > CHANGES && play.pedalled > CHANGES / 50);
    }
}
