//! The words that spell a pitch on the wire, and what a receiver hears when it reads them.

use super::{Interval, Pitch};

/// A 14-bit pitch bend, 0-16383; 8192 is the centre. (MIDI 1.0 detailed specification, p. 19)
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Bend(u16);

/// How far a full bend reaches, in whole semitones, 1-96.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct BendRange(u8);

/// Twice the keyboard.
const WIDEST: i64 = 256 * Interval::SEMITONE.microcents();

impl BendRange {
    /// What General MIDI receivers start with (GM1 p. 3) and an MPE manager too (MPE 1.1, 2.2.5).
    pub const TWO: BendRange = BendRange(2);
    /// What MPE members start with (MPE 1.1, 2.2.5).
    pub const FORTY_EIGHT: BendRange = BendRange(48);

    /// `None` outside 1-96 (96 is the limit of MPE 1.1, 2.1).
    pub const fn new(semitones: u8) -> Option<BendRange> {
        if semitones >= 1 && semitones <= crate::limits::BEND_RANGE_MAX {
            Some(BendRange(semitones))
        } else {
            None
        }
    }

    pub const fn semitones(self) -> u8 {
        self.0
    }
}

impl Bend {
    pub const CENTRE: Bend = Bend(8192);

    pub const fn new(value: u16) -> Option<Bend> {
        if value < 16384 {
            Some(Bend(value))
        } else {
            None
        }
    }

    pub const fn value(self) -> u16 {
        self.0
    }

    /// `round(interval x 8192 / range) + 8192`, held inside 0-16383 (MPE 1.1, C.3). The flag tells whether it had to be
    /// held by more than the missing last step of the upward range.
    pub fn encode(interval: Interval, range: BendRange) -> (Bend, bool) {
        // Nothing that could be meant is as wide as this; and so no product leaves 64 bits.
        let microcents = interval.microcents().clamp(-WIDEST, WIDEST);
        let full = Interval::SEMITONE.microcents() * range.0 as i64;
        let steps = (microcents * 16384 + full).div_euclid(2 * full);
        let value = (steps + 8192).clamp(0, 16383);
        (Bend(value as u16), !(-8192..=8192).contains(&steps))
    }

    /// What a receiver makes of it: `(value - 8192) x range / 8192`, to the nearest microcent.
    pub fn decode(self, range: BendRange) -> Interval {
        let full = Interval::SEMITONE.microcents() * range.0 as i64;
        Interval::from_microcents(((self.0 as i64 - 8192) * full + 4096).div_euclid(8192))
    }
}

/// Three bytes of MIDI Tuning frequency data: semitone, then a 14-bit fraction of one, high byte first.
/// `7F 7F 7F` means "no change" and is never made here. (MIDI Tuning Standard, "Frequency data format")
pub fn tuning_bytes(pitch: Pitch) -> Option<[u8; 3]> {
    let semitone = Interval::SEMITONE.microcents();
    let word = (pitch.microcents() as i128 * 16384 * 2 + semitone as i128)
        .div_euclid(2 * semitone as i128);
    let limit = 128 * 16384;
    if word < 0 || word > limit {
        return None;
    }
    let word = word.min(limit - 2) as u32; // the last word is reserved
    Some([
        (word >> 14) as u8,
        (word >> 7 & 0x7F) as u8,
        (word & 0x7F) as u8,
    ])
}

/// The pitch of three tuning bytes, or `None` for "no change".
pub fn from_tuning_bytes(bytes: [u8; 3]) -> Option<Pitch> {
    if bytes == [0x7F; 3] {
        return None;
    }
    let word = (bytes[0] as i64) << 14 | (bytes[1] as i64) << 7 | bytes[2] as i64;
    Some(Pitch::from_microcents(
        (word * Interval::SEMITONE.microcents() + 8192).div_euclid(16384),
    ))
}
