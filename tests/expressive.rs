//! Random play on a keyboard that sends MPE: bends before and after each onset, pressure, brightness, the manager's wheel
//! and pedal, zones and ranges that it tells. Heard by the independent receiver: after every message each note stands
//! where tuning, its own finger and the wheel put it, to half a step; nothing moves but what is meant; nothing sticks.
//! `cargo test --test all expressive:: -- --nocapture` prints the table.

use crate::support::dice::Dice;
use crate::support::published::{FIVE_TUNINGS, Published};
use crate::support::receiver::Hold;
use crate::support::rig::Rig;
use std::fmt::Write;
use trued::time::Span;

const NOTES: usize = 4_000;
const HELD_MAX: usize = 12;
/// Published cents and trued's pitches are both rounded to the millionth.
const ROUNDING_CENTS: f64 = 2e-6;
/// Of a manager's wheel of two semitones, where the synth adds it by itself.
const WHEEL_STEP_CENTS: f64 = 200.0 / 8192.0 / 2.0;
/// Every so many notes all is let go, for longer than the tail, and zone and range are told anew.
const PHRASE_NOTES: usize = 200;

/// Where it goes out.
#[derive(Clone, Copy)]
struct Out {
    dialect: &'static str,
    range: u8,
    channels: &'static str,
    pedal: bool,
    /// Fewer channels than fingers: what has to give way does.
    dry: bool,
}

/// A key that is down.
struct Down {
    member: u8,
    key: u8,
    /// Place in the receiver's notes.
    note: usize,
}

struct Performance {
    rig: Rig,
    out: Out,
    tuning: &'static Published,
    seed: u64,
    dice: Dice,
    down: Vec<Down>,
    /// Members of the zone now, and semitones of their full bend.
    members: u8,
    range: u8,
    /// What each channel was last told: bend from the middle, pressure, brightness. The manager is 0.
    bend: [i32; 16],
    pressure: [u8; 16],
    brightness: [Option<u8>; 16],
    pedal: bool,
    /// When each member was last let go, to take the one that is longest so (MPE 1.1, A.3).
    let_go: [u64; 16],
    count: u64,
    bends: usize,
    moves_seen: usize,
    worst_onset_cents: f64,
    worst_move_cents: f64,
}

impl Performance {
    fn new(out: Out, tuning: &'static Published, seed: u64) -> Performance {
        let rig = Rig::of(&format!(
            "keyboards: {{keys: {{port: virtual, sends: mpe}}}}\n\
             synths: {{synth: {{port: virtual, dialect: {}, bend_range: {}, channels: {}, tail_ms: 200}}}}\n\
             set: [{{song: Dice, tuning: {}}}]\n",
            out.dialect, out.range, out.channels, tuning.name
        ));
        Performance {
            rig,
            out,
            tuning,
            seed,
            dice: Dice::new(seed),
            down: Vec::new(),
            members: 15,
            range: 48,
            bend: [0; 16],
            pressure: [0; 16],
            brightness: [None; 16],
            pedal: false,
            let_go: [0; 16],
            count: 0,
            bends: 0,
            moves_seen: 0,
            worst_onset_cents: 0.0,
            worst_move_cents: 0.0,
        }
    }

    fn half_step_cents(&self) -> f64 {
        let step = self.out.range as f64 * 100.0 / 8192.0;
        let wheel = if self.out.dialect == "mpe" {
            WHEEL_STEP_CENTS
        } else {
            0.0
        };
        step / 2.0 + wheel + ROUNDING_CENTS
    }

    fn finger_cents(&self, member: u8) -> f64 {
        f64::from(self.bend[member as usize]) / 8192.0 * f64::from(self.range) * 100.0
    }

    fn wheel_cents(&self) -> f64 {
        f64::from(self.bend[0]) / 8192.0 * 200.0
    }

    /// Where a key that a member holds is to sound.
    fn wanted(&self, member: u8, key: u8) -> f64 {
        self.tuning.key_cents(key) + self.finger_cents(member) + self.wheel_cents()
    }

    fn play(&mut self) {
        let mut phrases = 0;
        while self.rig.heard().notes.len() < NOTES {
            let pause_ms = self.dice.between(1, 30);
            self.rig.until(self.rig.now + Span::from_millis(pause_ms));
            if self.rig.heard().notes.len() / PHRASE_NOTES > phrases {
                phrases += 1;
                self.rest();
                continue;
            }
            match self.dice.below(100) {
                0..=24 => self.strike(),
                25..=46 => self.release(),
                47..=74 => self.bend_finger(),
                75..=81 => self.press(),
                82..=88 => self.brighten(),
                89..=93 => self.turn_wheel(),
                94..=96 => self.bend_a_free_finger(),
                _ if self.out.pedal => self.step_on_pedal(),
                _ => {}
            }
            self.check_faults();
        }
        self.rest();
    }

    fn strike(&mut self) {
        let used = |member: &u8| self.down.iter().any(|down| down.member == *member);
        let free = (1..=self.members).filter(|member| !used(member));
        let Some(member) = free.min_by_key(|member| self.let_go[*member as usize]) else {
            return;
        };
        if self.down.len() == HELD_MAX {
            return;
        }
        let key = self.dice.between(36, 96) as u8;
        // A finger comes to rest somewhere before its key goes down.
        let bend = self.any_bend();
        let (pressure, brightness) = (self.dice.below(30) as u8, self.dice.below(128) as u8);
        self.say_bend(member, bend);
        self.say(&[0xD0 | member, pressure]);
        self.say(&[0xB0 | member, 74, brightness]);
        self.pressure[member as usize] = pressure;
        self.brightness[member as usize] = Some(brightness);
        self.check_moves(|_| false);
        let place = self.rig.heard().notes.len();
        self.say(&[0x90 | member, key, 90]);
        if self.rig.heard().notes.len() != place + 1 {
            self.fail("no note began");
        }
        if self.out.dry {
            let sounds = |down: &Down| self.rig.receivers[0].notes[down.note].off.is_none();
            self.down.retain(sounds); // what was stolen
        }
        self.down.push(Down {
            member,
            key,
            note: place,
        });
        let error = (self.rig.heard().notes[place].onset_cents() - self.wanted(member, key)).abs();
        self.worst_onset_cents = self.worst_onset_cents.max(error);
        if error > self.half_step_cents() {
            self.fail(&format!(
                "onset {error} cents off: {:?}",
                self.rig.heard().notes[place]
            ));
        }
        self.check_moves(|_| false);
        self.check_touch(member);
    }

    fn release(&mut self) {
        if self.down.is_empty() {
            return;
        }
        let place = self.dice.below(self.down.len() as u64) as usize;
        let down = self.down.remove(place);
        self.count += 1;
        self.let_go[down.member as usize] = self.count;
        self.say(&[0x80 | down.member, down.key, 64]);
        self.check_moves(|_| false);
    }

    fn bend_finger(&mut self) {
        let Some(member) = self.any_down() else {
            return;
        };
        let bend = self.any_bend();
        self.say_bend(member, bend);
        self.bends += 1;
        let notes: Vec<usize> = self.notes_of(member);
        self.check_moves(|note| notes.contains(&note));
        self.check_places();
    }

    /// Between two notes a finger may wander as it likes: nobody hears it.
    fn bend_a_free_finger(&mut self) {
        let member = self.dice.between(1, u64::from(self.members)) as u8;
        if self.down.iter().any(|down| down.member == member) {
            return;
        }
        let sent = self.rig.sent.len();
        let bend = self.any_bend();
        self.say_bend(member, bend);
        if self.rig.sent.len() != sent {
            self.fail("a finger without a key was heard");
        }
    }

    fn press(&mut self) {
        if let Some(member) = self.any_down() {
            let value = self.dice.below(128) as u8;
            self.pressure[member as usize] = value;
            self.say(&[0xD0 | member, value]);
            self.check_touch(member);
        }
    }

    fn brighten(&mut self) {
        if let Some(member) = self.any_down() {
            let value = self.dice.below(128) as u8;
            self.brightness[member as usize] = Some(value);
            self.say(&[0xB0 | member, 74, value]);
            self.check_touch(member);
        }
    }

    fn turn_wheel(&mut self) {
        let bend = self.dice.between(0, 8191) as i32 - 4096;
        self.say_bend(0, bend);
        self.moves_seen = self.rig.heard().moves.len(); // it moves everything
        self.check_places();
    }

    fn step_on_pedal(&mut self) {
        self.pedal = !self.pedal;
        self.say(&[0xB0, 64, u8::from(self.pedal) * 127]);
        self.check_moves(|_| false);
    }

    /// All up, the tail over; then sometimes another zone and another range (RPN 6 and RPN 0, MPE 1.1, 2.2.1, 2.2.5).
    fn rest(&mut self) {
        while !self.down.is_empty() {
            self.release();
        }
        self.pedal = false;
        self.say(&[0xB0, 64, 0]);
        self.say_bend(0, 0);
        self.moves_seen = self.rig.heard().moves.len();
        self.rig.until(self.rig.now + Span::from_millis(1_000));
        if !self.rig.heard().sounding().is_empty() {
            self.fail("something is held in a rest");
        }
        if self.dice.percent(50) {
            self.members = self.dice.pick(&[15, 15, 7, 9]);
            self.say(&[0xB0, 101, 0, 0xB0, 100, 6, 0xB0, 6, self.members]);
            self.range = 48;
            if self.dice.percent(60) {
                self.range = self.dice.pick(&[24, 12, 96]);
                let member = self.dice.between(1, u64::from(self.members)) as u8;
                self.say(&[
                    0xB0 | member,
                    101,
                    0,
                    100,
                    0,
                    6,
                    self.range,
                    38,
                    0,
                    101,
                    127,
                    100,
                    127,
                ]);
            }
            // What left the zone and came back begins anew.
            self.bend = [0; 16];
            self.pressure = [0; 16];
            for member in 1..=self.members {
                self.say(&[0xE0 | member, 0, 64, 0xD0 | member, 0]);
            }
        }
    }

    /// Within what the synth can bend, with the wheel and a key's own distance.
    fn any_bend(&mut self) -> i32 {
        let reach =
            (f64::from(self.out.range) - 3.0).min(f64::from(self.range)) / f64::from(self.range);
        let cents_of_full = if self.dice.percent(70) {
            reach.min(2.0 / f64::from(self.range))
        } else {
            reach
        };
        let full = (cents_of_full * 8191.0) as u64;
        self.dice.between(0, 2 * full) as i32 - full as i32
    }

    fn any_down(&mut self) -> Option<u8> {
        let place = self.dice.below(self.down.len().max(1) as u64) as usize;
        self.down.get(place).map(|down| down.member)
    }

    fn notes_of(&self, member: u8) -> Vec<usize> {
        let of_it = self.down.iter().filter(|down| down.member == member);
        of_it.map(|down| down.note).collect()
    }

    fn say_bend(&mut self, channel: u8, bend: i32) {
        self.bend[channel as usize] = bend;
        let word = (bend + 8192) as u16;
        self.say(&[0xE0 | channel, (word & 0x7F) as u8, (word >> 7) as u8]);
    }

    fn say(&mut self, bytes: &[u8]) {
        self.rig.midi(0, bytes);
    }

    /// Of what is held nothing has moved but this; tails of a plain synth may, where no other channel was left.
    fn check_moves(&mut self, meant: impl Fn(usize) -> bool) {
        let moves = &self.rig.heard().moves[self.moves_seen..];
        let some_go_along = self.rig.engine.report().counters.moved_along > 0;
        let stray = moves
            .iter()
            .find(|m| m.hold == Hold::Held && !meant(m.note) && !some_go_along);
        if let Some(stray) = stray {
            self.fail(&format!(
                "{stray:?} of {:?}",
                self.rig.heard().notes[stray.note]
            ));
        }
        self.moves_seen = self.rig.heard().moves.len();
    }

    /// Every key that is down sounds where it should.
    fn check_places(&mut self) {
        if self.out.dry {
            return; // some have to go along with others
        }
        for down in &self.down {
            let error = (self.rig.heard().notes[down.note].cents()
                - self.wanted(down.member, down.key))
            .abs();
            self.worst_move_cents = self.worst_move_cents.max(error);
            if error > self.half_step_cents() {
                self.fail(&format!(
                    "{error} cents off: {:?}",
                    self.rig.heard().notes[down.note]
                ));
            }
        }
    }

    /// Pressure and brightness of a finger are those of its note's channel.
    fn check_touch(&mut self, member: u8) {
        for note in self.notes_of(member) {
            let heard = self.rig.heard();
            let channel = heard.notes[note].channel;
            let touch = (heard.pressure(channel), heard.controller(channel, 74));
            let wanted = (
                self.pressure[member as usize],
                self.brightness[member as usize],
            );
            if touch != wanted && !self.out.dry {
                self.fail(&format!("touch {touch:?}, not {wanted:?}"));
            }
        }
    }

    fn check_faults(&self) {
        let heard = self.rig.heard();
        let faults = [&heard.orphans, &heard.repeats, &heard.prohibited];
        if let Some(faults) = faults.iter().find(|faults| !faults.is_empty()) {
            self.fail(&format!("{faults:02X?}"));
        }
        if heard.zones_while_sounding > 0 {
            self.fail("a zone was told while notes sound");
        }
    }

    fn fail(&self, why: &str) -> ! {
        panic!(
            "seed {}, {} {} on {}, {}: {why}\nat {:?}; {:?}",
            self.seed,
            self.out.dialect,
            self.out.range,
            self.out.channels,
            self.tuning.name,
            self.rig.now,
            self.rig.engine.report().counters
        )
    }
}

fn table(out: Out, seeds: std::ops::RangeInclusive<u64>) {
    let mut text = String::from(
        "tuning                  seed  out           channels  range  notes  stuck  orphans  repeats  finger bends  worst onset  \
         worst after a bend  half step  stolen  along\n",
    );
    for (tuning, seed) in FIVE_TUNINGS.into_iter().zip(seeds) {
        let mut play = Performance::new(out, tuning, seed);
        play.play();
        let heard = play.rig.heard();
        let counters = play.rig.engine.report().counters;
        let _ = writeln!(
            text,
            "{:<24}{seed:>4}  {:<14}{:<10}{:>5}{:>7}{:>7}{:>9}{:>9}{:>14}{:>13.4}{:>20}{:>11.4}{:>8}{:>7}",
            tuning.name,
            out.dialect,
            out.channels,
            out.range,
            heard.notes.len(),
            heard.stuck().len(),
            heard.orphans.len(),
            heard.repeats.len(),
            play.bends,
            play.worst_onset_cents,
            match out.dry {
                true => String::from("-"),
                false => format!("{:.4}", play.worst_move_cents),
            },
            play.half_step_cents(),
            counters.stolen,
            counters.moved_along,
        );
        assert!(
            heard.stuck().is_empty() && heard.sounding().is_empty(),
            "seed {seed}"
        );
        assert!(play.bends > NOTES / 4, "seed {seed}: fingers moved");
        assert_eq!(counters.clipped, 0, "seed {seed}");
        if !out.dry {
            assert_eq!(
                (counters.stolen, counters.moved_along),
                (0, 0),
                "seed {seed}"
            );
        }
    }
    println!("{text}");
}

const MPE: Out = Out {
    dialect: "mpe",
    range: 48,
    channels: "1-16",
    pedal: true,
    dry: false,
};
const PLAIN: Out = Out {
    dialect: "channel-bend",
    pedal: false,
    ..MPE
};

#[test]
fn mpe_in_to_mpe_out() {
    table(MPE, 1..=5);
    table(Out { range: 24, ..MPE }, 6..=10);
}

#[test]
fn mpe_in_to_a_plain_synth() {
    table(PLAIN, 11..=15);
    table(Out { range: 12, ..PLAIN }, 16..=20);
}

/// A plain synth keeps pedalled notes on their channels, and a small one has few: what gives way is counted.
#[test]
fn mpe_in_where_channels_run_out() {
    let dry = |out, channels| Out {
        pedal: true,
        dry: true,
        channels,
        ..out
    };
    table(dry(PLAIN, "1-16"), 21..=25);
    table(dry(PLAIN, "1-4"), 26..=30);
    table(dry(MPE, "1-5"), 31..=35);
}
