//! The chord as springs: every two sounding classes pull each other towards a just interval, what is held or remembered
//! pulls towards where it was, a leash pulls the whole towards rest, and the chord comes to stand where the strain is least.
//!
//! Strain is the sum of weight times squared error, so the place of least strain is the solution of linear equations, one
//! for each class. Where an interval has several just sizes (10/9 and 9/8), the combination with the least strain is taken.
//! A squared error spreads what does not fit over the whole chord: nothing is far off, and not everything is pure.

mod inverse;
mod springs;
mod targets;
mod trials;

pub use targets::{Targets, Weight};

use super::pitch_classes::CLASSES;
use crate::pitch::Interval;
use springs::Springs;

/// Unknowns of one chord.
pub const TONES_MAX: usize = CLASSES as usize;
const PAIRS_MAX: usize = pairs(TONES_MAX);
const fn pairs(tones: usize) -> usize {
    tones * (tones - 1) / 2
}

/// One unknown: a sounding class with all its keys.
#[derive(Clone, Copy, Debug)]
pub struct Tone {
    /// Any key number of the class.
    pub class: u8,
    /// How many of its keys sound; it pulls and is pulled so many times.
    pub keys: u8,
    /// Where it stands by the tuning at rest, from twelve-equal.
    pub rest: Interval,
    /// Where it is held, or was last heard, from twelve-equal, and how strongly that counts.
    pub anchor: Option<(Interval, Weight)>,
}

impl Tone {
    pub const SILENT: Tone = Tone {
        class: 0,
        keys: 0,
        rest: Interval::ZERO,
        anchor: None,
    };
}

/// Where the tones stand.
pub struct Solution<'a> {
    /// From twelve-equal, in the order of the tones asked about; zero beyond.
    pub offsets: [Interval; TONES_MAX],
    /// The size of each pair.
    chosen: [u8; PAIRS_MAX],
    tones: &'a [Tone],
    targets: &'a Targets,
    leash: Weight,
}

impl Solution<'_> {
    /// What strain is left, in millionths of a squared cent at weight 1.
    pub fn strain_millionths(&self) -> u64 {
        let mut springs = Springs::<TONES_MAX, PAIRS_MAX>::SLACK;
        springs.tie(self.tones, self.targets, self.leash);
        for (pair, chosen) in springs.pairs_mut().iter_mut().zip(self.chosen) {
            pair.chosen = chosen;
        }
        springs.strain_millionths(&self.offsets.map(Interval::microcents))
    }
}

/// Places the tones (at most [`TONES_MAX`]; further ones are not looked at). The leash pulls the mean distance from rest,
/// over all keys, to zero: against a shift of the whole chord it is as strong as an anchor of its weight on every key.
/// Without leash and anchors the mean stands at rest exactly.
///
/// At most [`crate::limits::TRIALS_MAX`] combinations of sizes are tried; `trials.rs` says which.
pub fn solve<'a>(tones: &'a [Tone], targets: &'a Targets, leash: Weight) -> Solution<'a> {
    let mut solution = Solution {
        offsets: [Interval::ZERO; TONES_MAX],
        chosen: [0; PAIRS_MAX],
        tones: &tones[..tones.len().min(TONES_MAX)],
        targets,
        leash,
    };
    // Arrays no larger than need be: setting them up is much of the work.
    match tones.len() {
        0..=4 => solution.find::<4, { pairs(4) }>(),
        5..=6 => solution.find::<6, { pairs(6) }>(),
        _ => solution.find::<TONES_MAX, PAIRS_MAX>(),
    }
    solution
}

impl Solution<'_> {
    /// Of at most `N` tones, with this many pairs.
    fn find<const N: usize, const PAIRS: usize>(&mut self) {
        let mut springs = Springs::<N, PAIRS>::SLACK;
        springs.tie(self.tones, self.targets, self.leash);
        let inverse = springs.inverse();
        trials::choose(&mut springs, &inverse);
        let places = springs.settle(&inverse);
        for (offset, place) in self.offsets.iter_mut().zip(places) {
            *offset = Interval::from_microcents(place);
        }
        for (chosen, pair) in self.chosen.iter_mut().zip(springs.pairs()) {
            *chosen = pair.chosen;
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn tone(class: u8, rest: i64, anchor: Option<(i64, Weight)>) -> Tone {
        Tone {
            class,
            keys: 1,
            rest: Interval::from_microcents(rest),
            anchor: anchor.map(|(at, weight)| (Interval::from_microcents(at), weight)),
        }
    }

    #[test]
    fn a_lone_tone_stands_at_rest_or_where_it_is_held() {
        let targets = Targets::five_limit(Weight::whole(1));
        let at = |tones: &[Tone], leash| solve(tones, &targets, leash).offsets[0].microcents();
        assert_eq!(at(&[tone(4, -13_686_286, None)], Weight::ZERO), -13_686_286);
        let held = [tone(4, 10, Some((4_000_000, Weight::whole(1))))];
        assert_eq!(at(&held, Weight::ZERO), 4_000_000);
        // Three parts of four on the way.
        assert_eq!(at(&held, Weight::millionths(333_333)), 3_000_003);
        assert_eq!(solve(&[], &targets, Weight::ZERO).strain_millionths(), 0);
    }

    #[test]
    fn what_is_held_with_all_might_hardly_moves() {
        let targets = Targets::with_sevens(Weight::millionths(50_000));
        let wanted = [5_000_000, 20_000_000, -15_000_000];
        let held = [0, 4, 10].into_iter().zip(wanted);
        let mut tones: Vec<Tone> = held
            .map(|(class, at)| tone(class, 0, Some((at, Weight::MAX))))
            .collect();
        tones.push(tone(7, 0, None));
        let places = solve(&tones, &targets, Weight::whole(1)).offsets;
        for (place, wanted) in places.iter().zip(wanted) {
            assert!((place.microcents() - wanted).abs() < 100_000, "{places:?}");
        }
    }

    #[test]
    fn the_most_and_the_least_of_everything_do_not_overflow() {
        let far = 1 << 40;
        for dissonance in [Weight::ZERO, Weight::MAX] {
            let targets = Targets::with_sevens(dissonance);
            for leash in [Weight::ZERO, Weight::millionths(1), Weight::MAX] {
                for hold in [Weight::ZERO, Weight::millionths(1), Weight::MAX] {
                    let tones: Vec<Tone> = (0..14_u8)
                        .map(|class| {
                            let side = if class % 3 == 0 { far } else { -far };
                            let anchor = (class % 2 == 0).then_some((side, hold));
                            Tone {
                                keys: if class < 6 { 255 } else { 0 },
                                ..tone(class, -side, anchor)
                            }
                        })
                        .collect();
                    for count in 0..=tones.len() {
                        let places = solve(&tones[..count], &targets, leash).offsets;
                        let most = places.iter().map(|place| place.abs()).max();
                        // A leash that fights held tones flings a free one far, but no sum overflows.
                        assert!(most < Some(Interval::from_cents(1_000_000)), "{places:?}");
                    }
                }
            }
        }
    }
}
