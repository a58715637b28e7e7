//! The exact shapes of every chord of up to six pitch classes.
//!
//! A shape puts each pitch class on a point of the lattice so that enough intervals are just to tie all of them together
//! (a spanning tree of exact intervals), and what is left over errs as little as it can. Dissonances weigh a quarter of
//! consonances: listeners tell the former only crudely (Hall and Hess 1984). The sum of absolute errors, not of squares,
//! is made small, so that most intervals are exact and one dissonance carries the comma; small errors already cost
//! (Vos 1986).

use super::harmony::springs::DISSONANCE;
use super::lattice::Point;
use super::least_squares::Targets;
use super::pitch_classes::PitchClasses;

/// Pitch classes that are tuned as one shape; any more are attached to it.
pub const CORE_MAX: usize = 6;
/// Shapes kept for one chord.
pub const KEPT_MAX: usize = 12;
/// Shapes that err by more than this for each pitch class beyond the best are not kept.
const SLACK: i64 = 6_000_000 * 4;
/// Of unfinished shapes so many are followed up, those that err least.
const FOLLOWED_MAX: usize = 200;

/// Ways to make an interval of so many semitones exact: 5-limit, and nothing wilder than 45/32.
const EXACT: [&[Point]; 12] = [
    &[Point::new(0, 0)],
    &[Point::new(-1, -1)],                   // 16/15
    &[Point::new(2, 0), Point::new(-2, 1)],  // 9/8, 10/9
    &[Point::new(1, -1)],                    // 6/5
    &[Point::new(0, 1)],                     // 5/4
    &[Point::new(-1, 0)],                    // 4/3
    &[Point::new(2, 1), Point::new(-2, -1)], // 45/32, 64/45
    &[Point::new(1, 0)],                     // 3/2
    &[Point::new(0, -1)],                    // 8/5
    &[Point::new(-1, 1)],                    // 5/3
    &[Point::new(-2, 0), Point::new(2, -1)], // 16/9, 9/5
    &[Point::new(1, 1)],                     // 15/8
];

/// What an error of an interval counts, in quarters.
pub const fn quarters(semitones: u8) -> i64 {
    match semitones {
        0 | 3 | 4 | 5 | 7 | 8 | 9 => 4,
        _ => 1,
    }
}

/// One way to tune a chord.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Shape {
    /// Of the chord's pitch classes, in the order of [`Found::classes`].
    pub points: [Point; CORE_MAX],
    /// Sum of its intervals' errors, dissonances a quarter, in microcents.
    pub cost: i64,
}

/// The shapes of one chord, best first.
#[derive(Clone, Copy)]
pub struct Found<'a> {
    pub shapes: &'a [Shape],
    classes: [u8; CORE_MAX],
    count: usize,
}

impl Found<'_> {
    /// The chord's pitch classes, in the order of the points.
    pub fn classes(&self) -> &[u8] {
        &self.classes[..self.count]
    }
}

/// All shapes, by chord. Built once; transpositions of a chord share theirs.
pub struct Shapes {
    all: Vec<Shape>,
    /// By pitch-class set: where its shapes begin and how many, and how far up the chord stands from the one they were
    /// made for.
    index: Vec<Entry>,
    /// The sizes that least squares pulls towards.
    pub(super) five_limit: Targets,
    pub(super) seven_limit: Targets,
}

#[derive(Clone, Copy, Default)]
struct Entry {
    first: u16,
    count: u8,
    up: u8,
}

impl Shapes {
    /// The only allocation.
    pub fn new() -> Shapes {
        let mut shapes = Shapes {
            all: Vec::new(),
            index: vec![Entry::default(); 1 << 12],
            five_limit: Targets::five_limit(DISSONANCE),
            seven_limit: Targets::with_sevens(DISSONANCE),
        };
        let mut work = Work::default();
        for bits in 1u16..1 << 12 {
            let set = PitchClasses::from_bits(bits);
            let (home, up) = lowest_turn(set);
            if set.count() > CORE_MAX {
                continue;
            }
            if home == set {
                let first = shapes.all.len() as u16;
                work.shapes_of(set, &mut shapes.all);
                shapes.index[bits as usize] = Entry {
                    first,
                    count: (shapes.all.len() - first as usize) as u8,
                    up: 0,
                };
            } else {
                let entry = shapes.index[home.bits() as usize];
                shapes.index[bits as usize] = Entry { up, ..entry };
            }
        }
        shapes
    }

    /// The shapes of a chord of one to [`CORE_MAX`] pitch classes.
    pub fn of(&self, chord: PitchClasses) -> Found<'_> {
        let entry = self.index[chord.bits() as usize];
        let first = entry.first as usize;
        let mut found = Found {
            shapes: &self.all[first..first + entry.count as usize],
            classes: [0; CORE_MAX],
            count: 0,
        };
        for class in chord.above(entry.up).iter().take(CORE_MAX) {
            found.classes[found.count] = (class + entry.up) % 12;
            found.count += 1;
        }
        found
    }
}

impl Default for Shapes {
    fn default() -> Shapes {
        Shapes::new()
    }
}

/// The transposition of a chord with the smallest number, and how far up from it the chord stands.
fn lowest_turn(set: PitchClasses) -> (PitchClasses, u8) {
    (0..12)
        .map(|up| (set.above(up), up))
        .min_by_key(|(turned, up)| (turned.bits(), *up))
        .expect("there are twelve")
}

/// A chord partly placed.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
struct Partly {
    placed: u8,
    points: [Point; CORE_MAX],
    cost: i64,
}

/// What is being worked on; kept from chord to chord to spare allocations.
#[derive(Default)]
struct Work {
    level: Vec<Partly>,
    next: Vec<Partly>,
}

impl Work {
    /// Places one pitch class after another, each exactly above or below one that stands already.
    fn shapes_of(&mut self, set: PitchClasses, all: &mut Vec<Shape>) {
        let mut classes = [0u8; CORE_MAX];
        let count = set.count();
        for (place, class) in classes.iter_mut().zip(set.iter()) {
            *place = class;
        }
        let classes = &classes[..count];
        self.level.clear();
        self.level.push(Partly {
            placed: 1,
            points: [Point::default(); CORE_MAX],
            cost: 0,
        });
        for _ in 1..count {
            self.next.clear();
            for partly in &self.level {
                spread(partly, classes, &mut self.next);
            }
            self.next.sort_unstable();
            self.next.dedup();
            self.next.sort_by_key(|partly| partly.cost);
            self.next.truncate(FOLLOWED_MAX);
            std::mem::swap(&mut self.level, &mut self.next);
        }
        self.level
            .sort_unstable_by_key(|partly| (partly.cost, spread_of(partly), *partly));
        let best = self.level[0].cost;
        let kept = self.level.iter().take(KEPT_MAX);
        let kept = kept.filter(|partly| partly.cost <= best + SLACK * count as i64);
        all.extend(kept.map(|partly| Shape {
            points: partly.points,
            cost: partly.cost / 4,
        }));
    }
}

/// How wide a shape lies on the lattice: of equally good ones the compact is preferred (Honingh 2008).
fn spread_of(partly: &Partly) -> i32 {
    let points = partly.points.iter();
    points
        .map(|p| p.fifths as i32 * p.fifths as i32 + 2 * p.thirds as i32 * p.thirds as i32)
        .sum()
}

fn spread(partly: &Partly, classes: &[u8], next: &mut Vec<Partly>) {
    let is_placed = |index: usize| partly.placed >> index & 1 == 1;
    for new in (0..classes.len()).filter(|index| !is_placed(*index)) {
        for old in (0..classes.len()).filter(|index| is_placed(*index)) {
            let semitones = (classes[new] + 12 - classes[old]) % 12;
            for step in EXACT[semitones as usize] {
                let mut more = *partly;
                more.points[new] = partly.points[old].plus(*step);
                more.placed |= 1 << new;
                more.cost += cost_of(new, &more, partly.placed, classes);
                next.push(more);
            }
        }
    }
}

/// What a new pitch class adds in errors, in quarters of microcents.
fn cost_of(new: usize, partly: &Partly, others: u8, classes: &[u8]) -> i64 {
    let others = (0..classes.len()).filter(|index| others >> index & 1 == 1);
    others
        .map(|other| {
            let semitones = (classes[new] + 12 - classes[other]) % 12;
            let stands = partly.points[new].minus(partly.points[other]).offset();
            quarters(semitones) * error(semitones, stands.microcents())
        })
        .sum()
}

/// How far an interval of so many semitones, standing so far from equal, is from its nearest exact size; microcents.
pub fn error(semitones: u8, offset: i64) -> i64 {
    let sizes = exact(semitones);
    sizes
        .map(|size| (offset - size).abs())
        .min()
        .expect("every interval has an exact size")
}

/// The exact sizes of an interval of so many semitones, as microcents from equal.
pub fn exact(semitones: u8) -> impl Iterator<Item = i64> {
    EXACT[semitones as usize % 12]
        .iter()
        .map(|p| p.offset().microcents())
}

/// How hard an interval of so many semitones holds its size where held notes will not let all of them have it.
pub const fn pull(semitones: u8) -> i64 {
    match semitones % 12 {
        3 | 4 | 5 | 7 | 8 | 9 => 20,
        _ => 1,
    }
}
