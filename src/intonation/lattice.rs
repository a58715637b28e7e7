//! Just pitches by their prime factors: how many fifths, major thirds and harmonic sevenths away.
//!
//! A chord is exact when its pitch classes stand on such points; octaves are left out, since every octave of a pitch
//! class stands alike.

use crate::pitch::Interval;

/// So many 3/2, 5/4 and 7/4 from some zero, octaves aside.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, PartialOrd, Ord)]
pub struct Point {
    pub fifths: i8,
    pub thirds: i8,
    pub sevenths: i8,
}

/// What 3/2, 5/4 and 7/4 stand away from 700, 400 and 1000 cents, in microcents. (`1200 log2`, rounded; adaptive tables
/// print 1.96, -13.69, -31.17.)
const FIFTH: i64 = 1_955_001;
const THIRD: i64 = -13_686_286;
const SEVENTH: i64 = -31_174_094;

impl Point {
    pub const fn new(fifths: i8, thirds: i8) -> Point {
        Point {
            fifths,
            thirds,
            sevenths: 0,
        }
    }

    pub const fn plus(self, other: Point) -> Point {
        Point {
            fifths: self.fifths + other.fifths,
            thirds: self.thirds + other.thirds,
            sevenths: self.sevenths + other.sevenths,
        }
    }

    pub const fn minus(self, other: Point) -> Point {
        Point {
            fifths: self.fifths - other.fifths,
            thirds: self.thirds - other.thirds,
            sevenths: self.sevenths - other.sevenths,
        }
    }

    /// How far it stands from its key in twelve-equal, where the zero stands on its own.
    pub const fn offset(self) -> Interval {
        Interval::from_microcents(
            self.fifths as i64 * FIFTH
                + self.thirds as i64 * THIRD
                + self.sevenths as i64 * SEVENTH,
        )
    }

    /// The ratio to the zero, brought into the octave above it: over and under, in lowest terms.
    pub fn ratio(self) -> (u64, u64) {
        let (mut over, mut under) = (1u64, 1u64);
        for (prime, times) in [(3, self.fifths), (5, self.thirds), (7, self.sevenths)] {
            let power = (0..times.unsigned_abs()).fold(1u64, |p, _| p.saturating_mul(prime));
            if times > 0 {
                over = over.saturating_mul(power);
            } else {
                under = under.saturating_mul(power);
            }
        }
        while over >= 2 * under {
            under *= 2;
        }
        while over < under {
            over *= 2;
        }
        (over, under)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::pitch::Log;

    #[test]
    fn offsets_are_those_of_the_ratios() {
        for (point, semitones) in [
            (Point::new(1, 0), 7),
            (Point::new(0, 1), 4),
            (
                Point {
                    sevenths: 1,
                    ..Point::default()
                },
                10,
            ),
            (Point::new(2, 1), 6),
            (Point::new(-2, 0), 10),
            (Point::new(1, -1), 3),
        ] {
            let (over, under) = point.ratio();
            let exact = Log::of_ratio(over, under).interval();
            let ours = Interval::SEMITONE * semitones + point.offset();
            assert!((exact - ours).abs().microcents() <= 2, "{over}/{under}");
        }
    }

    #[test]
    fn ratios_come_within_the_octave_in_lowest_terms() {
        assert_eq!(Point::new(2, 1).ratio(), (45, 32));
        assert_eq!(Point::new(1, -1).ratio(), (6, 5));
        assert_eq!(Point::new(-2, 0).ratio(), (16, 9));
        assert_eq!(Point::new(0, 0).ratio(), (1, 1));
        assert_eq!(Point::new(0, -2).ratio(), (32, 25));
    }
}
