//! Which sizes of an interval count as just, and how much each interval matters.

use super::TONES_MAX;
use crate::pitch::{Interval, Log};

/// Just sizes of one interval: the tritone of five and seven has four.
pub(super) const SIZES_MAX: usize = 4;
/// No just size is further from its key than an octave; whole numbers stay in their bounds by it.
pub(super) const SIZE_MAX: i64 = Interval::OCTAVE.microcents();
/// The octave's.
pub(super) const HEAVIEST: Weight = Weight::whole(2);
/// Sizes so near each other, in microcents, differ by rounding alone.
const SAME: i64 = 4;

/// How strongly a spring pulls, in millionths.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, PartialOrd, Ord)]
pub struct Weight(u64);

impl Weight {
    pub const ZERO: Weight = Weight(0);
    /// About a thousand: what it holds is moved by a thousandth of what pulls at it.
    pub const MAX: Weight = Weight(1 << 30);

    pub const fn millionths(millionths: u64) -> Weight {
        if millionths > Weight::MAX.0 {
            Weight::MAX
        } else {
            Weight(millionths)
        }
    }

    pub const fn whole(whole: u32) -> Weight {
        Weight::millionths(whole as u64 * 1_000_000)
    }

    pub(super) const fn get(self) -> i64 {
        self.0 as i64
    }
}

/// Just sizes and weights by the semitones between two classes.
#[derive(Clone, Copy, Debug)]
pub struct Targets([Target; TONES_MAX]);

#[derive(Clone, Copy, Debug)]
pub(super) struct Target {
    /// Microcents from the equal size, upwards.
    sizes: [i64; SIZES_MAX],
    count: usize,
    weight: Weight,
}

/// Whole tones, sevenths, semitones and the tritone: what a chord sounds rough in anyway.
const DISSONANT: [usize; 5] = [1, 2, 6, 10, 11];

impl Targets {
    /// From twelve just notes above a root, the root first. Two classes may stand either way round, so an interval may
    /// have the size it has there or the one that fills its inversion up to an octave. The dissonant ones weigh
    /// `dissonance` (at most 2), octaves 2, the others 1.
    pub fn of(notes: &[Interval; TONES_MAX], dissonance: Weight) -> Targets {
        let mut targets = Targets([Target::NONE; TONES_MAX]);
        targets.0[0].weight = HEAVIEST;
        for semitones in DISSONANT {
            targets.0[semitones].weight = dissonance.min(HEAVIEST);
        }
        for (semitones, note) in notes.iter().enumerate() {
            targets.allow(semitones, *note);
        }
        targets
    }

    /// The five-limit: 16/15, 10/9 and 9/8, 6/5, 5/4, 4/3, 45/32, and their inversions.
    pub fn five_limit(dissonance: Weight) -> Targets {
        let ratios = [
            (1, 1),
            (16, 15),
            (9, 8),
            (6, 5),
            (5, 4),
            (4, 3),
            (45, 32),
            (3, 2),
            (8, 5),
            (5, 3),
            (9, 5),
            (15, 8),
        ];
        let notes = ratios.map(|(over, under)| Log::of_ratio(over, under).interval());
        Targets::of(&notes, dissonance)
    }

    /// The same with 8/7, 7/6, 7/5 and their inversions.
    pub fn with_sevens(dissonance: Weight) -> Targets {
        let mut targets = Targets::five_limit(dissonance);
        for (semitones, over, under) in [(2, 8, 7), (3, 7, 6), (6, 7, 5)] {
            targets.allow(semitones, Log::of_ratio(over, under).interval());
        }
        targets
    }

    /// One more just size for classes so many semitones apart, and so for their inversion. More than four are too many:
    /// the fifth and further ones are dropped.
    pub fn allow(&mut self, semitones: usize, size: Interval) {
        let semitones = semitones % TONES_MAX;
        let from_equal = (size - Interval::SEMITONE * semitones as i64).microcents();
        self.0[semitones].add(from_equal);
        self.0[(TONES_MAX - semitones) % TONES_MAX].add(-from_equal);
    }

    pub(super) fn between(&self, lower: u8, upper: u8) -> &Target {
        let width = TONES_MAX as u8;
        &self.0[usize::from((width + upper % width - lower % width) % width)]
    }
}

impl Target {
    pub const NONE: Target = Target {
        sizes: [0; SIZES_MAX],
        count: 0,
        weight: Weight::whole(1),
    };

    /// Never empty: an interval without a just size is well as it stands in twelve-equal.
    pub fn sizes(&self) -> &[i64] {
        &self.sizes[..self.count.max(1)]
    }

    /// At least the least there is, so that no two tones are ever without a spring.
    pub fn weight(&self) -> i64 {
        self.weight.get().max(1)
    }

    fn add(&mut self, from_equal: i64) {
        let from_equal = from_equal.clamp(-SIZE_MAX, SIZE_MAX);
        let known = &self.sizes[..self.count];
        let new = known.iter().all(|size| (size - from_equal).abs() > SAME);
        if new && self.count < SIZES_MAX {
            self.sizes[self.count] = from_equal;
            self.count += 1;
        }
    }
}
