//! Pitch as whole numbers.
//!
//! **What this room is**: points ([`Pitch`]) and differences ([`Interval`]) on the line of pitch, in microcents; exact
//! ratios turned into them ([`Log`]); the words that spell a pitch on the wire ([`word`]).
//! **Start reading at** [`Pitch`], then `ratio.rs`.
//! **May know** `limits`.
//! **Owns**: the same input gives the same integer on every machine. No floating point decides anything; `f64` appears
//! only to print hertz and cents for people.
//! **Not here**: keys and letters (`tuning/`), which bytes carry a word (`midi/`).

mod ratio;
pub mod word;

pub use ratio::{Hertz, Log};

use std::ops::{Add, AddAssign, Mul, Neg, Sub};

const MICROCENTS_PER_CENT: i64 = 1_000_000;

/// A point: microcents above MIDI key 0 of twelve-equal at A4 = 440 Hz. A4 is 6900 cents.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Pitch(i64);

/// A difference of two pitches, in microcents; may be negative.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Interval(i64);

impl Pitch {
    /// Where key number `key` stands in twelve-equal at A4 = 440 Hz.
    pub const fn of_key(key: u8) -> Pitch {
        Pitch(key as i64 * 100 * MICROCENTS_PER_CENT)
    }

    pub const fn from_microcents(microcents: i64) -> Pitch {
        Pitch(microcents)
    }

    pub const fn microcents(self) -> i64 {
        self.0
    }

    /// `100 x fractional MIDI key number`, for people and files.
    pub fn cents(self) -> f64 {
        self.0 as f64 / MICROCENTS_PER_CENT as f64
    }

    /// Frequency, for people and files only; the engine never uses it.
    pub fn hertz(self) -> f64 {
        440.0 * 2f64.powf((self.cents() - 6900.0) / 1200.0)
    }

    /// The MIDI key number nearest to this pitch (a tie goes up), or `None` outside 0-127.
    pub fn nearest_key(self) -> Option<u8> {
        let hundred = 100 * MICROCENTS_PER_CENT;
        u8::try_from((self.0 + hundred / 2).div_euclid(hundred))
            .ok()
            .filter(|key| *key < 128)
    }
}

impl Interval {
    pub const ZERO: Interval = Interval(0);
    pub const OCTAVE: Interval = Interval::from_cents(1200);
    pub const SEMITONE: Interval = Interval::from_cents(100);

    pub const fn from_cents(cents: i64) -> Interval {
        Interval(cents * MICROCENTS_PER_CENT)
    }

    pub const fn from_microcents(microcents: i64) -> Interval {
        Interval(microcents)
    }

    pub const fn microcents(self) -> i64 {
        self.0
    }

    /// For people and files.
    pub fn cents(self) -> f64 {
        self.0 as f64 / MICROCENTS_PER_CENT as f64
    }

    pub const fn abs(self) -> Interval {
        Interval(self.0.abs())
    }

    /// This interval less whole octaves: 0 up to, not including, an octave.
    pub const fn within_octave(self) -> Interval {
        Interval(self.0.rem_euclid(Interval::OCTAVE.0))
    }
}

impl Add<Interval> for Pitch {
    type Output = Pitch;
    fn add(self, by: Interval) -> Pitch {
        Pitch(self.0 + by.0)
    }
}

impl Sub<Interval> for Pitch {
    type Output = Pitch;
    fn sub(self, by: Interval) -> Pitch {
        Pitch(self.0 - by.0)
    }
}

impl Sub for Pitch {
    type Output = Interval;
    fn sub(self, from: Pitch) -> Interval {
        Interval(self.0 - from.0)
    }
}

impl Add for Interval {
    type Output = Interval;
    fn add(self, other: Interval) -> Interval {
        Interval(self.0 + other.0)
    }
}

impl AddAssign for Interval {
    fn add_assign(&mut self, other: Interval) {
        self.0 += other.0;
    }
}

impl Sub for Interval {
    type Output = Interval;
    fn sub(self, other: Interval) -> Interval {
        Interval(self.0 - other.0)
    }
}

impl Neg for Interval {
    type Output = Interval;
    fn neg(self) -> Interval {
        Interval(-self.0)
    }
}

impl Mul<i64> for Interval {
    type Output = Interval;
    fn mul(self, times: i64) -> Interval {
        Interval(self.0 * times)
    }
}
