//! Which just size each interval takes.
//!
//! Up to a fixed number of combinations all are tried; few chords under the hands have more. Of more, half that number
//! are tried for the intervals that weigh most, half for those that then are most in doubt; the others take the size
//! nearest to where they stand. Between combinations that are equally good the sizes named first win, for the lowest pair
//! first: a diminished triad is 5:6:7 from its first tone up.

use super::inverse::{Inverse, high, times};
use super::springs::{PLACE_MAX, Pair, Springs};
use super::targets::{SIZE_MAX, SIZES_MAX};
use crate::limits::TRIALS_MAX;

/// Pairs in doubt: each at least doubles the trials.
const DOUBTS_MAX: usize = TRIALS_MAX.ilog2() as usize;
/// How the chord gives way to a pull is told in parts of that pull, 2^-27ths.
const PART: u32 = 27;
/// Pulls are told without so many of their last bits,
const PULL: u32 = 4;
/// and the strain that comes of them without so many.
const STRAIN: u32 = 64 + PULL - PART;
/// Less than this between the strains of two trials is no difference: a thousandth of a squared cent at weight 1, a few
/// times what the rounding of places to microcents can make.
const SAME: i64 = 1_000_000_000_000_000 >> STRAIN;
/// Rounds of taking the nearest sizes anew.
const SETTLING_ROUNDS: usize = 4;

/// An interval in parts, twice, and the way from one size to another times a part are no too large whole numbers.
const _: () = assert!(2 * SIZE_MAX < 1 << (62 - PART) && 4 * PLACE_MAX < 1 << (62 - PART));

/// Chooses a size for each pair.
pub fn choose<const N: usize, const P: usize>(springs: &mut Springs<N, P>, inverse: &Inverse<N>) {
    if let Some(doubts) = Doubts::all(springs) {
        if doubts.count > 0 {
            try_all(springs, inverse, &doubts);
        }
        return;
    }
    // With each pair pulled to the middle of its sizes, nothing is decided yet.
    let undecided = springs.roughly(inverse, middle);
    take_nearest(springs, &undecided);
    settle_on_nearest(springs, inverse);
    for heaviest_first in [true, false] {
        let places = springs.roughly(inverse, Pair::size);
        let doubts = Doubts::most(springs, TRIALS_MAX / 2, |pair| {
            let weight = if heaviest_first { pair.weight } else { 0 };
            (-weight, margin(pair, pair.interval(&places)))
        });
        try_all(springs, inverse, &doubts);
        settle_on_nearest(springs, inverse);
    }
}

/// Leaves the best combination in the springs.
fn try_all<const N: usize, const P: usize>(
    springs: &mut Springs<N, P>,
    inverse: &Inverse<N>,
    doubts: &Doubts,
) {
    for number in doubts.numbers() {
        springs.pairs_mut()[number].chosen = 0;
    }
    let same = SAME * springs.all_keys();
    let mut trials = Trials::NONE;
    trials.begin(springs, inverse, doubts);
    let mut rank = trials.run(same);
    for (wheel, number) in trials.wheels.iter().zip(doubts.numbers()) {
        springs.pairs_mut()[number].chosen = (rank / wheel.place) as u8;
        rank %= wheel.place;
    }
}

fn middle(pair: &Pair) -> i64 {
    pair.sizes().iter().sum::<i64>() / pair.sizes().len() as i64
}

fn settle_on_nearest<const N: usize, const P: usize>(
    springs: &mut Springs<N, P>,
    inverse: &Inverse<N>,
) {
    for _ in 0..SETTLING_ROUNDS {
        let places = springs.roughly(inverse, Pair::size);
        if !take_nearest(springs, &places) {
            break;
        }
    }
}

/// True if that changed something.
fn take_nearest<const N: usize, const P: usize>(
    springs: &mut Springs<N, P>,
    places: &[i64; N],
) -> bool {
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
    const NONE: Doubts = Doubts {
        pairs: [0; DOUBTS_MAX],
        count: 0,
        trials: 1,
    };

    /// All with several sizes, unless they make too many trials.
    fn all<const N: usize, const P: usize>(springs: &Springs<N, P>) -> Option<Doubts> {
        let mut doubts = Doubts::NONE;
        for (number, pair) in springs.pairs().iter().enumerate() {
            if pair.sizes().len() > 1 && !doubts.add(number, pair, TRIALS_MAX) {
                return None;
            }
        }
        Some(doubts)
    }

    /// As many of those with several sizes as make no more trials than this, in this order.
    fn most<T: Ord + Copy + Default, const N: usize, const P: usize>(
        springs: &Springs<N, P>,
        trials_max: usize,
        order: impl Fn(&Pair) -> T,
    ) -> Doubts {
        let mut open = [(T::default(), 0); P];
        let mut open_count = 0;
        for (number, pair) in springs.pairs().iter().enumerate() {
            if pair.sizes().len() > 1 {
                open[open_count] = (order(pair), number);
                open_count += 1;
            }
        }
        let open = &mut open[..open_count];
        open.sort_unstable();
        let mut doubts = Doubts::NONE;
        for (_, number) in open.iter() {
            if !doubts.add(*number, &springs.pairs()[*number], trials_max) {
                break;
            }
        }
        doubts.pairs[..doubts.count].sort_unstable();
        doubts
    }

    /// False if that makes too many trials.
    fn add(&mut self, number: usize, pair: &Pair, trials_max: usize) -> bool {
        let trials = self.trials * pair.sizes().len();
        if trials > trials_max {
            return false;
        }
        self.trials = trials;
        self.pairs[self.count] = number;
        self.count += 1;
        true
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
struct Trials {
    wheels: [Wheel; DOUBTS_MAX],
    /// Where their intervals stand, in 2^-27ths of a microcent.
    stands: [i64; DOUBTS_MAX],
    count: usize,
    trials: usize,
    /// Which combination this is, in the order of the sizes' names.
    rank: usize,
    /// Against the first combination.
    strain: i64,
}

#[derive(Clone, Copy)]
struct Wheel {
    steps: [Step; SIZES_MAX - 1],
    last: usize,
    chosen: usize,
    /// How far the interval of each wheel gives when this one is pulled.
    answers: [i64; DOUBTS_MAX],
    /// How far the rank moves with each size.
    place: usize,
    down: bool,
}

impl Wheel {
    const NONE: Wheel = Wheel {
        steps: [Step::NONE; SIZES_MAX - 1],
        last: 0,
        chosen: 0,
        answers: [0; DOUBTS_MAX],
        place: 0,
        down: false,
    };
}

/// From one size to the next.
#[derive(Clone, Copy)]
struct Step {
    /// Both sizes, in 2^-27ths.
    sum: i64,
    by: i64,
    /// The way times the weight, without its last bits.
    pull: i64,
}

impl Step {
    const NONE: Step = Step {
        sum: 0,
        by: 0,
        pull: 0,
    };
}

impl Trials {
    const NONE: Trials = Trials {
        wheels: [Wheel::NONE; DOUBTS_MAX],
        stands: [0; DOUBTS_MAX],
        count: 0,
        trials: 0,
        rank: 0,
        strain: 0,
    };

    /// The doubtful pairs begin with their first sizes.
    #[inline]
    fn begin<const N: usize, const P: usize>(
        &mut self,
        springs: &Springs<N, P>,
        inverse: &Inverse<N>,
        doubts: &Doubts,
    ) {
        let places = springs.settle(inverse);
        (self.count, self.trials) = (doubts.count, doubts.trials);
        let mut place = doubts.trials;
        let wheels = self.wheels.iter_mut().zip(&mut self.stands);
        for ((wheel, stands), number) in wheels.zip(doubts.numbers()) {
            let pair = &springs.pairs()[number];
            for (answer, other) in wheel.answers.iter_mut().zip(doubts.numbers()) {
                let other = springs.pairs()[other].tones();
                *answer = inverse.answer(other, pair.tones(), pair.weight, PART);
            }
            place /= pair.sizes().len();
            wheel.place = place;
            wheel.last = pair.sizes().len() - 1;
            for (step, sizes) in wheel.steps.iter_mut().zip(pair.sizes().windows(2)) {
                step.sum = (sizes[0] + sizes[1]) << PART;
                step.by = sizes[1] - sizes[0];
                step.pull = (times(pair.weight, step.by) >> PULL) as i64;
            }
            let apart = pair.interval(&places);
            *stands = apart.clamp(-2 * PLACE_MAX, 2 * PLACE_MAX) << PART;
        }
    }

    /// The rank of the combination with the least strain.
    fn run(&mut self, same: i64) -> usize {
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
        let wheel = &self.wheels[wheel];
        wheel.chosen == if wheel.down { 0 } else { wheel.last }
    }

    /// On to the next size of a pair.
    fn turn(&mut self, number: usize) {
        let wheel = &mut self.wheels[number];
        let (step, by, pull);
        if wheel.down {
            wheel.chosen -= 1;
            self.rank -= wheel.place;
            step = &wheel.steps[wheel.chosen];
            (by, pull) = (-step.by, -step.pull);
        } else {
            step = &wheel.steps[wheel.chosen];
            (by, pull) = (step.by, step.pull);
            wheel.chosen += 1;
            self.rank += wheel.place;
        }
        // The strain is a parabola in the pull.
        let slope = step.sum - 2 * self.stands[number] - by * wheel.answers[number];
        self.strain += high(pull, slope);
        for (stands, answer) in self.stands.iter_mut().zip(&wheel.answers) {
            *stands += by * answer;
        }
    }
}
