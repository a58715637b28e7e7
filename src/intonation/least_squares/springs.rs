//! The springs of one chord and the equations they come to.
//!
//! All weights are multiplied by the number of keys, so that the leash's share of each key is a whole number too.

use super::factor::{Factor, MATRIX_BITS};
use super::targets::{HEAVIEST, Target, Targets, Weight};
use super::{Row, TONES_MAX, Tone};
use crate::pitch::Interval;

pub const PAIRS_MAX: usize = TONES_MAX * (TONES_MAX - 1) / 2;
/// More keys of one class weigh no more than these.
const KEYS_MAX: u8 = 8;
/// No offset is further out than this, well over three octaves; whole numbers stay in their bounds by it.
pub const PLACE_MAX: i64 = 1 << 32;
/// Rounds of improving a solution; each leaves less than a thousandth of the error.
const ROUNDS: usize = 3;

/// Every entry of the matrix: all keys times what can pull at one class.
const _: () = {
    let keys = KEYS_MAX as i64 * TONES_MAX as i64;
    let pairs = HEAVIEST.get() * KEYS_MAX as i64 * keys;
    let leash = Weight::MAX.get() * KEYS_MAX as i64 * KEYS_MAX as i64;
    assert!(keys * (Weight::MAX.get() + pairs) + leash < 1 << MATRIX_BITS);
};

/// Two tones and the sizes their interval may have.
#[derive(Clone, Copy)]
pub struct Pair<'a> {
    pub lower: u8,
    pub upper: u8,
    /// Which of the sizes it is pulled to.
    pub chosen: u8,
    pub weight: i64,
    target: &'a Target,
}

pub struct Springs<'a> {
    tones: &'a [Tone],
    /// What all weights are multiplied by.
    all_keys: i64,
    leash: i64,
    matrix: Row<Row<i64>>,
    /// What anchors and leash add to the right-hand side.
    home: Row<i128>,
    pairs: [Pair<'a>; PAIRS_MAX],
    pair_count: usize,
}

impl<'a> Springs<'a> {
    // Inlined, for it is larger than most of the work there is to do on it.
    #[inline]
    pub fn between(tones: &'a [Tone], targets: &'a Targets, leash: Weight) -> Springs<'a> {
        let anchored = tones.iter().any(|tone| anchor(tone).1 > 0);
        let mut springs = Springs {
            tones,
            all_keys: tones.iter().map(keys).sum(),
            // Something has to say where the chord stands.
            leash: leash.get().max(i64::from(!anchored)),
            matrix: Default::default(),
            home: Default::default(),
            pairs: [Pair::NONE; PAIRS_MAX],
            pair_count: 0,
        };
        springs.fasten();
        for lower in 0..tones.len() {
            for upper in lower + 1..tones.len() {
                springs.stretch(lower, upper, targets);
            }
        }
        springs
    }

    /// Anchors and leash.
    fn fasten(&mut self) {
        let all_keys = self.all_keys();
        let rest: i64 = self.tones.iter().map(|t| keys(t) * place(t.rest)).sum();
        for (i, tone) in self.tones.iter().enumerate() {
            let (value, weight) = anchor(tone);
            let pull = self.leash * keys(tone);
            self.matrix[i][i] += all_keys * weight;
            self.home[i] += i128::from(all_keys * weight) * i128::from(value);
            self.home[i] += i128::from(pull) * i128::from(rest);
            for (j, other) in self.tones.iter().enumerate() {
                self.matrix[i][j] += pull * keys(other);
            }
        }
    }

    fn stretch(&mut self, lower: usize, upper: usize, targets: &'a Targets) {
        let (low, high) = (&self.tones[lower], &self.tones[upper]);
        let target = targets.between(low.class, high.class);
        let all_keys = self.all_keys();
        let weight = all_keys * target.weight() * keys(low) * keys(high);
        self.matrix[lower][lower] += weight;
        self.matrix[upper][upper] += weight;
        self.matrix[lower][upper] -= weight;
        self.matrix[upper][lower] -= weight;
        self.pairs[self.pair_count] = Pair {
            lower: lower as u8,
            upper: upper as u8,
            chosen: 0,
            weight,
            target,
        };
        self.pair_count += 1;
    }

    pub fn all_keys(&self) -> i64 {
        self.all_keys
    }

    #[inline]
    pub fn factor(&self) -> Factor {
        Factor::of(&self.matrix, self.tones.len())
    }

    pub fn pairs(&self) -> &[Pair<'a>] {
        &self.pairs[..self.pair_count]
    }

    pub fn pairs_mut(&mut self) -> &mut [Pair<'a>] {
        &mut self.pairs[..self.pair_count]
    }

    /// Where the tones stand if each pair is pulled to this size, to within a small part of a cent.
    pub fn roughly(&self, factor: &Factor, size: impl Fn(&Pair<'a>) -> i64) -> Row<i64> {
        factor.solve(&self.pulls(size))
    }

    /// Where the tones stand by the sizes chosen, to within a few microcents: what the solution leaves over is solved for
    /// again.
    pub fn settle(&self, factor: &Factor) -> Row<i64> {
        let pulls = self.pulls(Pair::size);
        let mut places = factor.solve(&pulls);
        for _ in 0..ROUNDS {
            let mut left = pulls;
            let size = self.tones.len();
            for (left, row) in left.iter_mut().zip(&self.matrix).take(size) {
                let held = row.iter().zip(&places).take(size);
                *left -= held
                    .map(|(a, x)| i128::from(*a) * i128::from(*x))
                    .sum::<i128>();
            }
            let better = factor.solve(&left);
            for (place, better) in places.iter_mut().zip(better) {
                *place += better;
            }
            // What is left then is below one.
            if better.iter().all(|better| better.abs() < 1_000) {
                break;
            }
        }
        places
    }

    fn pulls(&self, size: impl Fn(&Pair<'a>) -> i64) -> Row<i128> {
        let mut pulls = self.home;
        for pair in self.pairs() {
            let pull = i128::from(pair.weight) * i128::from(size(pair));
            pulls[pair.lower as usize] -= pull;
            pulls[pair.upper as usize] += pull;
        }
        pulls
    }

    /// In millionths of a squared cent at weight 1.
    pub fn strain_millionths(&self, places: &Row<i64>) -> u64 {
        let square =
            |weight: i64, error: i64| i128::from(weight) * i128::from(error) * i128::from(error);
        let mut strain = 0;
        for pair in self.pairs() {
            strain += square(pair.weight, pair.interval(places) - pair.size());
        }
        let all_keys = self.all_keys();
        let mut from_rest = 0;
        for (tone, at) in self.tones.iter().zip(places) {
            from_rest += keys(tone) * (at - place(tone.rest));
            let (value, weight) = anchor(tone);
            strain += square(all_keys * weight, at - value);
        }
        strain += square(self.leash, from_rest);
        // Weights are in millionths, squares of microcents in millionths of millionths.
        let unit = i128::from(all_keys.max(1)) * 1_000_000_000_000;
        u64::try_from(strain / unit).unwrap_or(u64::MAX)
    }
}

impl<'a> Pair<'a> {
    pub const NONE: Pair<'static> = Pair {
        lower: 0,
        upper: 0,
        weight: 0,
        target: &Target::NONE,
        chosen: 0,
    };

    pub fn sizes(&self) -> &'a [i64] {
        self.target.sizes()
    }

    pub fn size(&self) -> i64 {
        self.sizes()[self.chosen as usize]
    }

    /// The interval of the two as they stand.
    pub fn interval(&self, places: &Row<i64>) -> i64 {
        places[self.upper as usize] - places[self.lower as usize]
    }
}

fn keys(tone: &Tone) -> i64 {
    i64::from(tone.keys.clamp(1, KEYS_MAX))
}

fn place(offset: Interval) -> i64 {
    offset.microcents().clamp(-PLACE_MAX, PLACE_MAX)
}

fn anchor(tone: &Tone) -> (i64, i64) {
    tone.anchor
        .map_or((0, 0), |(at, weight)| (place(at), weight.get()))
}
