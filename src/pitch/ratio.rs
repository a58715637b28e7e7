//! Exact ratios, their parts and their sums, turned into intervals with one rounding at the end.
//!
//! The logarithm is taken in integers, one bit at a time by squaring, so that every machine gets the same microcent.

use super::{Interval, Pitch};
use std::ops::{Add, Neg, Sub};

/// Fraction bits of a [`Log`].
const BITS: u32 = 60;
/// Microcents in an octave.
const OCTAVE_MICROCENTS: i128 = 1_200_000_000;

/// A binary logarithm in units of 2^-60 octave: an interval before it is rounded to a microcent.
///
/// Sums and parts of ratios are taken here, so that eleven quarter-comma fifths carry one rounding, not eleven.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, PartialOrd, Ord)]
pub struct Log(i128);

/// A frequency in millionths of a hertz, above zero.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct Hertz(u64);

impl Log {
    pub const ZERO: Log = Log(0);
    pub const OCTAVE: Log = Log(1 << BITS);

    /// The size of `over`/`under`.
    ///
    /// # Panics
    /// If either is zero: a ratio is checked where it is read.
    pub fn of_ratio(over: u64, under: u64) -> Log {
        assert!(over > 0 && under > 0, "a ratio has no zero in it");
        Log(log2(over) - log2(under))
    }

    /// From cents written with decimals: `microcents` is an exact number of millionths of a cent.
    pub const fn of_microcents(microcents: i64) -> Log {
        // Rounded to nearest; 2^-60 octave is a thousand-millionth of a microcent.
        let scaled = (microcents as i128) << BITS;
        Log((scaled + OCTAVE_MICROCENTS / 2).div_euclid(OCTAVE_MICROCENTS))
    }

    /// `over`/`under` of this logarithm: a part of a comma, or an exponent.
    ///
    /// # Panics
    /// If `under` is zero.
    pub fn part(self, over: i64, under: i64) -> Log {
        assert!(under != 0, "a part has no zero below");
        let (over, under) = if under < 0 {
            (-(over as i128), -(under as i128))
        } else {
            (over as i128, under as i128)
        };
        Log((self.0 * over + under / 2).div_euclid(under))
    }

    /// `count` of these, one after another.
    pub fn times(self, count: i64) -> Log {
        Log(self.0 * count as i128)
    }

    /// The interval, to the nearest microcent.
    pub fn interval(self) -> Interval {
        let half = 1i128 << (BITS - 1);
        Interval::from_microcents(((self.0 * OCTAVE_MICROCENTS + half) >> BITS) as i64)
    }
}

impl Add for Log {
    type Output = Log;
    fn add(self, other: Log) -> Log {
        Log(self.0 + other.0)
    }
}

impl Sub for Log {
    type Output = Log;
    fn sub(self, other: Log) -> Log {
        Log(self.0 - other.0)
    }
}

impl Neg for Log {
    type Output = Log;
    fn neg(self) -> Log {
        Log(-self.0)
    }
}

impl Hertz {
    pub const A440: Hertz = Hertz(440_000_000);

    /// From millionths of a hertz; `None` for zero.
    pub const fn from_micro(micro: u64) -> Option<Hertz> {
        if micro == 0 { None } else { Some(Hertz(micro)) }
    }

    pub const fn micro(self) -> u64 {
        self.0
    }

    /// For people and files.
    pub fn hertz(self) -> f64 {
        self.0 as f64 / 1e6
    }

    /// The pitch of this frequency.
    pub fn pitch(self) -> Pitch {
        Pitch::of_key(69) + Log::of_ratio(self.0, Hertz::A440.0).interval()
    }
}

/// Binary logarithm of `n` in 2^-60ths, by repeated squaring of the mantissa: each square that reaches 2 is a one bit.
/// The 62-bit mantissa loses under 2^-61 per square, halved at each further bit, so the result is right to about 2^-59:
/// far below the 2^-30 of a microcent.
fn log2(n: u64) -> i128 {
    let whole = n.ilog2();
    let mut mantissa = (n as u128) << (62 - whole.min(62)) >> (whole.saturating_sub(62)); // 1.0 is 2^62
    let mut log = (whole as i128) << BITS;
    for bit in (0..BITS).rev() {
        mantissa = (mantissa * mantissa) >> 62;
        if mantissa >= 1 << 63 {
            mantissa >>= 1;
            log |= 1 << bit;
        }
    }
    log
}

#[cfg(test)]
mod tests {
    use super::*;

    // Cents of well-known intervals: exact formula, printed in facts tables of the trade (Ellis 1885 defines the cent).
    #[test]
    fn known_intervals_come_out_to_the_microcent() {
        for (over, under, microcents) in [
            (3u64, 2u64, 701_955_001i64),
            (5, 4, 386_313_714),
            (81, 80, 21_506_290),
            (531_441, 524_288, 23_460_010),
            (32_805, 32_768, 1_953_721),
            (7, 4, 968_825_906),
            (2, 1, 1_200_000_000),
            (1, 1, 0),
        ] {
            assert_eq!(
                Log::of_ratio(over, under).interval().microcents(),
                microcents,
                "{over}/{under}"
            );
            assert_eq!(
                Log::of_ratio(under, over).interval().microcents(),
                -microcents,
                "{under}/{over}"
            );
        }
    }

    #[test]
    fn integers_agree_with_floating_point_everywhere() {
        for n in (1..4000u64).chain([u64::MAX, 1 << 63, (1 << 63) - 1, 123_456_789_012_345]) {
            let exact = (n as f64).log2() * 1.2e9;
            let ours = Log::of_ratio(n, 1).interval().microcents() as f64;
            assert!((ours - exact).abs() <= 0.51, "{n}: {ours} against {exact}");
        }
    }

    #[test]
    fn a_sum_is_rounded_once() {
        let fifth = Log::of_ratio(3, 2) - Log::of_ratio(81, 80).part(1, 4);
        let third = fifth.times(4) - Log::OCTAVE.times(2);
        assert_eq!(third.interval(), Log::of_ratio(5, 4).interval());
    }
}
