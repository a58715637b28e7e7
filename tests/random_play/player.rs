//! A random player: chords, pedals, keys struck again while held and while the pedal holds them; if asked, wheel,
//! pressure, controllers and programs, on two keyboards.

use crate::support::dice::Dice;
use std::time::Duration;

/// Keys held at once, at most.
const HELD_MAX: usize = 20;
/// Keys of these names may be struck again while still held, once: each then wants a second channel, and a synth has
/// three to spare beside the twelve.
const DOUBLED: [u8; 3] = [0, 4, 7];
const LOWEST: u64 = 28;
const HIGHEST: u64 = 100;
/// Every so many notes a rest, longer than any tail.
const PHRASE_NOTES: usize = 300;
const REST_MS: u64 = 2500;
/// Cents of a full push: `wheel: 1` in the stage file.
const WHEEL_CENTS: f64 = 100.0;

/// One message from a keyboard.
pub struct Action {
    pub after_ms: u64,
    pub keyboard: usize,
    pub bytes: Vec<u8>,
    /// Key and velocity of a new note.
    pub strikes: Option<(u8, u8)>,
    pub is_wheel: bool,
}

pub struct Player {
    dice: Dice,
    hands: bool,
    /// Keyboard and key of every note-on whose note-off is still to come.
    held: Vec<(usize, u8)>,
    damper: bool,
    sostenuto: bool,
    pub notes: usize,
    rests: usize,
    now_ms: u64,
    /// Every place of the wheel, 0-16383, with the time it was put there.
    wheel: Vec<(u64, u16)>,
}

impl Player {
    pub fn new(seed: u64, hands: bool) -> Player {
        Player {
            dice: Dice::new(seed),
            hands,
            held: Vec::new(),
            damper: false,
            sostenuto: false,
            notes: 0,
            rests: 0,
            now_ms: 0,
            wheel: vec![(0, 8192)],
        }
    }

    pub fn wheel_cents(&self) -> f64 {
        cents(self.wheel[self.wheel.len() - 1].1)
    }

    /// Where the wheel stood when a note began.
    pub fn wheel_at(&self, on: Duration) -> f64 {
        let place = self
            .wheel
            .partition_point(|(at, _)| Duration::from_millis(*at) <= on);
        cents(self.wheel[place - 1].1)
    }

    /// What the player does next: one gesture, or a chord.
    pub fn next(&mut self) -> Vec<Action> {
        if self.notes / PHRASE_NOTES > self.rests {
            self.rests += 1;
            let mut rest = self.let_go();
            rest.push(self.message(REST_MS, 0, &[0xF8]));
            return rest;
        }
        let after_ms = self.dice.between(1, 60);
        match self.dice.below(100) {
            0..=3 => {
                self.damper = !self.damper;
                let value = if self.damper {
                    self.dice.between(64, 127) as u8
                } else {
                    0
                };
                vec![self.message(after_ms, 0, &[0xB0, 64, value])]
            }
            4..=5 => {
                self.sostenuto = !self.sostenuto;
                vec![self.message(after_ms, 0, &[0xB0, 66, self.sostenuto as u8 * 127])]
            }
            6..=13 if self.hands => vec![self.gesture(after_ms)],
            14..=55 => self.chord(after_ms),
            _ => self.release(after_ms).into_iter().collect(),
        }
    }

    /// Everything up and the wheel home.
    pub fn let_go(&mut self) -> Vec<Action> {
        let mut out = Vec::new();
        while let Some(up) = self.release(3) {
            out.push(up);
        }
        self.damper = false;
        self.sostenuto = false;
        out.push(self.message(2, 0, &[0xB0, 64, 0]));
        out.push(self.message(2, 0, &[0xB0, 66, 0]));
        if self.hands {
            out.push(self.move_wheel(2, 8192));
        }
        out
    }

    fn chord(&mut self, after_ms: u64) -> Vec<Action> {
        let size = self.dice.pick(&[1, 1, 1, 2, 3, 4, 6]);
        let mut out = Vec::new();
        for place in 0..size {
            if let Some(strike) = self.strike(if place == 0 { after_ms } else { 0 }) {
                out.push(strike);
            }
        }
        out
    }

    fn strike(&mut self, after_ms: u64) -> Option<Action> {
        let again = !self.held.is_empty() && self.dice.percent(10);
        let key = if again {
            self.held[self.dice.below(self.held.len() as u64) as usize].1
        } else {
            self.dice.between(LOWEST, HIGHEST) as u8
        };
        let down = self.held.iter().filter(|(_, k)| *k == key).count();
        let most = if DOUBLED.contains(&(key % 12)) { 2 } else { 1 };
        if self.held.len() >= HELD_MAX || down >= most {
            return None;
        }
        let keyboard = self.any_keyboard();
        let velocity = self.dice.between(1, 127) as u8;
        self.held.push((keyboard, key));
        self.notes += 1;
        let mut action = self.message(after_ms, keyboard, &[0x90, key, velocity]);
        action.strikes = Some((key, velocity));
        Some(action)
    }

    fn release(&mut self, after_ms: u64) -> Option<Action> {
        if self.held.is_empty() {
            return None;
        }
        let place = self.dice.below(self.held.len() as u64) as usize;
        let (keyboard, key) = self.held.remove(place);
        let bytes = if self.dice.percent(50) {
            [0x80, key, self.dice.below(128) as u8]
        } else {
            [0x90, key, 0]
        };
        Some(self.message(after_ms, keyboard, &bytes))
    }

    fn gesture(&mut self, after_ms: u64) -> Action {
        match self.dice.below(10) {
            0..=2 => {
                let place = self.dice.below(16384) as u16;
                self.move_wheel(after_ms, place)
            }
            3..=4 => {
                let value = self.dice.pick(&[0, 10, 10, 100]);
                self.message(after_ms, 0, &[0xD0, value])
            }
            5 if !self.held.is_empty() => {
                let (keyboard, key) = self.held[0];
                let value = self.dice.below(128) as u8;
                self.message(after_ms, keyboard, &[0xA0, key, value])
            }
            6 if self.dice.percent(20) => {
                let program = self.dice.below(3) as u8;
                self.message(after_ms, 0, &[0xC0, program])
            }
            _ => {
                let number = self.dice.pick(&[1, 7, 11, 67, 74]);
                let value = self.dice.pick(&[0, 64, 64, 127]);
                self.message(after_ms, 0, &[0xB0, number, value])
            }
        }
    }

    fn move_wheel(&mut self, after_ms: u64, place: u16) -> Action {
        let bytes = [0xE0, (place & 0x7F) as u8, (place >> 7) as u8];
        let mut action = self.message(after_ms, 0, &bytes);
        action.is_wheel = true;
        self.wheel.push((self.now_ms, place));
        action
    }

    fn any_keyboard(&mut self) -> usize {
        if self.hands {
            self.dice.below(2) as usize
        } else {
            0
        }
    }

    fn message(&mut self, after_ms: u64, keyboard: usize, bytes: &[u8]) -> Action {
        self.now_ms += after_ms;
        Action {
            after_ms,
            keyboard,
            bytes: bytes.to_vec(),
            strikes: None,
            is_wheel: false,
        }
    }
}

fn cents(place: u16) -> f64 {
    (place as f64 - 8192.0) / 8192.0 * WHEEL_CENTS
}
