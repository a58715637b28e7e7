//! The springs of one chord and the equations they come to.
//!
//! All weights are multiplied by the number of keys, so that the leash's share of each key is a whole number too.

use super::inverse::{Inverse, MATRIX_BITS, times};
use super::targets::{HEAVIEST, Target, Targets, Weight};
use super::{TONES_MAX, Tone};
use crate::pitch::Interval;

/// More keys of one class weigh no more than these.
const KEYS_MAX: u8 = 8;
/// No offset is further out than this, well over three octaves; whole numbers stay in their bounds by it.
pub const PLACE_MAX: i64 = 1 << 32;

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

/// Of at most `N` tones and as many pairs as these have.
pub struct Springs<'a, const N: usize, const PAIRS: usize> {
    tones: &'a [Tone],
    keys: [i64; N],
    /// What all weights are multiplied by.
    all_keys: i64,
    leash: i64,
    matrix: [[i64; N]; N],
    /// What anchors and leash add to the right-hand side.
    home: [i128; N],
    pairs: [Pair<'a>; PAIRS],
    pair_count: usize,
}

impl<'a, const N: usize, const PAIRS: usize> Springs<'a, N, PAIRS> {
    pub const SLACK: Springs<'a, N, PAIRS> = Springs {
        tones: &[],
        keys: [0; N],
        all_keys: 0,
        leash: 0,
        matrix: [[0; N]; N],
        home: [0; N],
        pairs: [Pair::NONE; PAIRS],
        pair_count: 0,
    };

    /// Done in place, for to move them is half as much work as to make them.
    #[inline]
    pub fn tie(&mut self, tones: &'a [Tone], targets: &'a Targets, leash: Weight) {
        self.tones = tones;
        // Something has to say where the chord stands.
        let anchored = tones.iter().any(|tone| anchor(tone).1 > 0);
        self.leash = leash.get().max(i64::from(!anchored));
        for (keys, tone) in self.keys.iter_mut().zip(tones) {
            *keys = i64::from(tone.keys.clamp(1, KEYS_MAX));
            self.all_keys += *keys;
        }
        self.fasten();
        self.stretch(targets);
    }

    /// Anchors and leash.
    #[inline]
    fn fasten(&mut self) {
        let tones = self.tones.iter().zip(&self.keys);
        let rest: i64 = tones.map(|(tone, keys)| keys * place(tone.rest)).sum();
        for (i, tone) in self.tones.iter().enumerate() {
            let (value, weight) = anchor(tone);
            let hold = self.all_keys * weight;
            let pull = self.leash * self.keys[i];
            self.home[i] = times(hold, value) + times(pull, rest);
            self.matrix[i] = self.keys.map(|keys| pull * keys);
            self.matrix[i][i] += hold;
        }
    }

    /// Every two tones.
    #[inline]
    fn stretch(&mut self, targets: &'a Targets) {
        for (lower, low) in self.tones.iter().enumerate() {
            let one = self.all_keys * self.keys[lower];
            for (upper, high) in self.tones.iter().enumerate().skip(lower + 1) {
                let target = targets.between(low.class, high.class);
                let weight = one * self.keys[upper] * target.weight();
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
        }
    }

    pub fn all_keys(&self) -> i64 {
        self.all_keys
    }

    pub fn inverse(&self) -> Inverse<N> {
        Inverse::of(&self.matrix, self.tones.len())
    }

    pub fn pairs(&self) -> &[Pair<'a>] {
        &self.pairs[..self.pair_count]
    }

    pub fn pairs_mut(&mut self) -> &mut [Pair<'a>] {
        &mut self.pairs[..self.pair_count]
    }

    /// Where the tones stand if each pair is pulled to this size, to within a small part of a cent.
    pub fn roughly(&self, inverse: &Inverse<N>, size: impl Fn(&Pair<'a>) -> i64) -> [i64; N] {
        inverse.solve(&self.pulls(size))
    }

    /// Where the tones stand by the sizes chosen, to within a few microcents. If the inverse is not fine, what its solution
    /// leaves over is solved for again; it is a few thousandths of a cent at most.
    pub fn settle(&self, inverse: &Inverse<N>) -> [i64; N] {
        let mut left = self.pulls(Pair::size);
        let mut places = inverse.solve(&left);
        if !inverse.is_fine {
            for (left, row) in left.iter_mut().zip(&self.matrix) {
                for (entry, place) in row.iter().zip(&places) {
                    *left -= times(*entry, *place);
                }
            }
            for (place, better) in places.iter_mut().zip(inverse.solve(&left)) {
                *place += better;
            }
        }
        places
    }

    fn pulls(&self, size: impl Fn(&Pair<'a>) -> i64) -> [i128; N] {
        let mut pulls = self.home;
        for pair in self.pairs() {
            let pull = times(pair.weight, size(pair));
            pulls[pair.lower as usize] -= pull;
            pulls[pair.upper as usize] += pull;
        }
        pulls
    }

    /// In millionths of a squared cent at weight 1.
    pub fn strain_millionths(&self, places: &[i64; N]) -> u64 {
        let square =
            |weight: i64, error: i64| i128::from(weight) * i128::from(error) * i128::from(error);
        let mut strain = 0;
        for pair in self.pairs() {
            strain += square(pair.weight, pair.interval(places) - pair.size());
        }
        let all_keys = self.all_keys();
        let mut from_rest = 0;
        for ((tone, at), keys) in self.tones.iter().zip(places).zip(self.keys) {
            from_rest += keys * (at - place(tone.rest));
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

    pub fn tones(&self) -> (u8, u8) {
        (self.lower, self.upper)
    }

    pub fn sizes(&self) -> &'a [i64] {
        self.target.sizes()
    }

    pub fn size(&self) -> i64 {
        self.sizes()[self.chosen as usize]
    }

    /// The interval of the two as they stand.
    pub fn interval(&self, places: &[i64]) -> i64 {
        places[self.upper as usize] - places[self.lower as usize]
    }
}

fn place(offset: Interval) -> i64 {
    offset.microcents().clamp(-PLACE_MAX, PLACE_MAX)
}

fn anchor(tone: &Tone) -> (i64, i64) {
    tone.anchor
        .map_or((0, 0), |(at, weight)| (place(at), weight.get()))
}
