//! Which just size each interval takes.
//!
//! Up to a fixed number of combinations all are tried; few chords under the hands have more. Of more, half that number
//! are tried for the intervals that weigh most, half for those that then are most in doubt; the others take the size
//! nearest to where they stand. Between combinations that are equally good the sizes named first win, for the lowest pair
//! first: a diminished triad is 5:6:7 from its first tone up.

use super::Row;
use super::factor::Factor;
use super::springs::{PAIRS_MAX, PLACE_MAX, Pair, Springs};
use super::targets::SIZE_MAX;
use crate::limits::TRIALS_MAX;

/// Pairs in doubt: each at least doubles the trials.
const DOUBTS_MAX: usize = TRIALS_MAX.ilog2() as usize;
/// How the chord gives way to a pull is told in parts of that pull, 2^-27ths.
const PART: u32 = 27;
/// Slopes of the strain are told in 2^-10ths of a microcent.
const FINE: u32 = 10;
/// Less than this between the strains of two trials is no difference: a thousandth of a squared cent at weight 1, a few
/// times what the rounding of places to microcents can make.
const SAME: i128 = 1_000_000_000_000_000 << FINE;
/// Rounds of taking the nearest sizes anew.
const SETTLING_ROUNDS: usize = 4;

/// An interval in parts, twice, and the way from one size to another times a part are no too large whole numbers.
const _: () = assert!(2 * SIZE_MAX < 1 << (62 - PART) && 4 * PLACE_MAX < 1 << (62 - PART));

/// Chooses a size for each pair.
pub fn choose(springs: &mut Springs, factor: &Factor) {
    let combinations = springs.pairs().iter().try_fold(1, |product: usize, pair| {
        Some(product * pair.sizes().len()).filter(|product| *product <= TRIALS_MAX)
    });
    if combinations == Some(1) {
        return;
    }
    if combinations.is_some() {
        let doubts = Doubts::of(springs, TRIALS_MAX, |_| 0);
        try_all(springs, factor, &doubts);
        return;
    }
    // With each pair pulled to the middle of its sizes, nothing is decided yet.
    let undecided = springs.roughly(factor, middle);
    take_nearest(springs, &undecided);
    settle_on_nearest(springs, factor);
    for heaviest_first in [true, false] {
        let places = springs.roughly(factor, Pair::size);
        let doubts = Doubts::of(springs, TRIALS_MAX / 2, |pair| {
            let weight = if heaviest_first { pair.weight } else { 0 };
            (-weight, margin(pair, pair.interval(&places)))
        });
        try_all(springs, factor, &doubts);
        settle_on_nearest(springs, factor);
    }
}

/// Leaves the best combination in the springs.
fn try_all(springs: &mut Springs, factor: &Factor, doubts: &Doubts) {
    for number in doubts.numbers() {
        springs.pairs_mut()[number].chosen = 0;
    }
    let same = SAME * i128::from(springs.all_keys());
    let trials = Trials::of(springs, factor, doubts);
    let wheels = trials.wheels;
    let mut rank = trials.run(same);
    for (wheel, number) in wheels.iter().zip(doubts.numbers()) {
        springs.pairs_mut()[number].chosen = (rank / wheel.place) as u8;
        rank %= wheel.place;
    }
}

fn middle(pair: &Pair) -> i64 {
    pair.sizes().iter().sum::<i64>() / pair.sizes().len() as i64
}

fn settle_on_nearest(springs: &mut Springs, factor: &Factor) {
    for _ in 0..SETTLING_ROUNDS {
        let places = springs.roughly(factor, Pair::size);
        if !take_nearest(springs, &places) {
            break;
        }
    }
}

/// True if that changed something.
fn take_nearest(springs: &mut Springs, places: &Row<i64>) -> bool {
    let mut changed = false;
    for pair in springs.pairs_mut() {
        let stands = pair.interval(places);
        let error = |choice: u8| (pair.sizes()[choice as usize] - stands).abs();
        let mut nearest = pair.chosen;
        for choice in 0..pair.sizes().len() as u8 {
            if error(choice) < error(nearest) {
                nearest = choice;
            }
        }
        changed |= nearest != pair.chosen;
        pair.chosen = nearest;
    }
    changed
}

/// The pairs to try, by their numbers, and how many trials that makes.
struct Doubts {
    pairs: [usize; DOUBTS_MAX],
    count: usize,
    trials: usize,
}

impl Doubts {
    /// As many of those with several sizes as make no more trials than this, in this order.
    fn of<T: Ord + Copy + Default>(
        springs: &Springs,
        trials_max: usize,
        order: impl Fn(&Pair) -> T,
    ) -> Doubts {
        let mut open = [(T::default(), 0); PAIRS_MAX];
        let mut open_count = 0;
        for (number, pair) in springs.pairs().iter().enumerate() {
            if pair.sizes().len() > 1 {
                open[open_count] = (order(pair), number);
                open_count += 1;
            }
        }
        let open = &mut open[..open_count];
        open.sort_unstable();
        let mut doubts = Doubts {
            pairs: [0; DOUBTS_MAX],
            count: 0,
            trials: 1,
        };
        for (_, number) in open.iter() {
            let trials = doubts.trials * springs.pairs()[*number].sizes().len();
            if trials > trials_max {
                break;
            }
            doubts.trials = trials;
            doubts.pairs[doubts.count] = *number;
            doubts.count += 1;
        }
        doubts.pairs[..doubts.count].sort_unstable();
        doubts
    }

    fn numbers(&self) -> impl Iterator<Item = usize> {
        self.pairs[..self.count].iter().copied()
    }
}

/// Most in doubt is the pair whose second nearest size is hardly further than its nearest.
fn margin(pair: &Pair, stands: i64) -> i64 {
    let (mut nearest, mut second) = (i64::MAX, i64::MAX);
    for size in pair.sizes() {
        let error = (size - stands).abs();
        second = second.min(error.max(nearest));
        nearest = nearest.min(error);
    }
    second - nearest
}

/// The doubtful pairs as wheels, turned one notch at a time through all their combinations. The chord is not solved anew
/// for each: it answers a pull in proportion.
struct Trials<'a> {
    wheels: [Wheel<'a>; DOUBTS_MAX],
    /// Where their intervals stand, in 2^-27ths of a microcent.
    stands: [i64; DOUBTS_MAX],
    count: usize,
    trials: usize,
    /// Which combination this is, in the order of the sizes' names.
    rank: usize,
    /// Against the first combination.
    strain: i128,
}

#[derive(Clone, Copy)]
struct Wheel<'a> {
    pair: Pair<'a>,
    /// How far the interval of each wheel gives when this one is pulled.
    answers: [i64; DOUBTS_MAX],
    /// How far the rank moves with each size.
    place: usize,
    down: bool,
}

impl Wheel<'_> {
    const NONE: Wheel<'static> = Wheel {
        pair: Pair::NONE,
        answers: [0; DOUBTS_MAX],
        place: 0,
        down: false,
    };
}

impl<'a> Trials<'a> {
    /// The doubtful pairs begin with their first sizes.
    fn of(springs: &Springs<'a>, factor: &Factor, doubts: &Doubts) -> Trials<'a> {
        let places = springs.settle(factor);
        let mut trials = Trials {
            wheels: [Wheel::NONE; DOUBTS_MAX],
            stands: [0; DOUBTS_MAX],
            count: doubts.count,
            trials: doubts.trials,
            rank: 0,
            strain: 0,
        };
        let mut place = doubts.trials;
        let wheels = trials.wheels.iter_mut().zip(&mut trials.stands);
        for ((wheel, stands), number) in wheels.zip(doubts.numbers()) {
            let pair = springs.pairs()[number];
            let mut pull = Row::default();
            let way = i128::from(pair.weight) << PART;
            (pull[pair.upper as usize], pull[pair.lower as usize]) = (way, -way);
            let answer = factor.solve(&pull);
            for (answers, other) in wheel.answers.iter_mut().zip(doubts.numbers()) {
                *answers = springs.pairs()[other].interval(&answer);
            }
            place /= pair.sizes().len();
            wheel.place = place;
            let apart = pair.interval(&places);
            *stands = apart.clamp(-2 * PLACE_MAX, 2 * PLACE_MAX) << PART;
            wheel.pair = pair;
        }
        trials
    }

    /// The rank of the combination with the least strain.
    fn run(mut self, same: i128) -> usize {
        let (mut least, mut best) = (0, 0);
        for _ in 1..self.trials {
            let mut wheel = self.count - 1;
            while self.is_at_end(wheel) {
                self.wheels[wheel].down ^= true;
                wheel -= 1;
            }
            self.turn(wheel);
            let better = self.strain < least - same;
            if better || (self.strain <= least + same && self.rank < best) {
                best = self.rank;
            }
            least = least.min(self.strain);
        }
        best
    }

    fn is_at_end(&self, wheel: usize) -> bool {
        let Wheel { pair, down, .. } = &self.wheels[wheel];
        let end = if *down { 0 } else { pair.sizes().len() - 1 };
        usize::from(pair.chosen) == end
    }

    /// On to the next size of a pair.
    fn turn(&mut self, wheel: usize) {
        let Wheel {
            pair,
            answers,
            place,
            down,
        } = &mut self.wheels[wheel];
        let from = pair.size();
        if *down {
            pair.chosen -= 1;
            self.rank -= *place;
        } else {
            pair.chosen += 1;
            self.rank += *place;
        }
        let by = pair.size() - from;
        // The strain is a parabola in the pull.
        let slope = ((from + pair.size()) << PART) - 2 * self.stands[wheel] - by * answers[wheel];
        let slope = i128::from(slope >> (PART - FINE));
        self.strain += i128::from(pair.weight) * i128::from(by) * slope;
        for (stands, answer) in self.stands.iter_mut().zip(answers) {
            *stands += by * *answer;
        }
    }
}
