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
/// Every chord that is no transposition of one above it, by its pitch classes: its shapes, best first, each the fifths
/// and thirds of its points. Worked out by `shapes/make.rs`, whose test says that it still is what comes of it.
const TABLE: &str = include_str!("shapes.txt");

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
#[derive(Clone, Copy, Default)]
pub struct Shape {
    /// In the order of [`Found::classes`].
    pub points: [Point; CORE_MAX],
    /// How far its intervals are from just, if each pitch class has one key, in microcents.
    pub errs: i64,
}

/// The shapes of one chord, best first.
#[derive(Clone, Copy)]
pub struct Found<'a> {
    pub shapes: &'a [Shape],
    pub(super) classes: [u8; CORE_MAX],
    pub(super) count: usize,
}

impl Found<'_> {
    /// The chord's pitch classes, in the order of the points.
    pub fn classes(&self) -> &[u8] {
        &self.classes[..self.count]
    }
}

/// All shapes, by chord; transpositions of a chord share theirs.
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
    /// The only allocation: reads the table.
    pub fn new() -> Shapes {
        let mut shapes = Shapes {
            all: Vec::new(),
            index: vec![Entry::default(); 1 << 12],
            five_limit: Targets::five_limit(DISSONANCE),
            seven_limit: Targets::with_sevens(DISSONANCE),
        };
        for line in TABLE.lines().filter(|line| !line.starts_with('#')) {
            shapes
                .take(line)
                .expect("the table is whole, as its test says");
        }
        shapes
    }

    /// One chord and its transpositions.
    fn take(&mut self, line: &str) -> Option<()> {
        let (chord, written) = line.split_once(':')?;
        let first = self.all.len() as u16;
        let classes = chord.split_whitespace();
        let home: PitchClasses = classes.filter_map(|class| class.parse().ok()).collect();
        for shape in written.split('|') {
            let mut points = [Point::default(); CORE_MAX];
            for (point, written) in points.iter_mut().zip(shape.split_whitespace()) {
                let (fifths, thirds) = written.split_once(',')?;
                *point = Point::new(fifths.parse().ok()?, thirds.parse().ok()?);
            }
            let errs = errs(home, &points);
            self.all.push(Shape { points, errs });
        }
        let count = (self.all.len() - first as usize) as u8;
        for up in 0..12 {
            let entry = &mut self.index[home.raised(up).bits() as usize];
            if entry.count == 0 {
                *entry = Entry { first, count, up };
            }
        }
        Some(())
    }

    /// The shapes of a chord of one to six pitch classes.
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

fn errs(chord: PitchClasses, points: &[Point; CORE_MAX]) -> i64 {
    let mut sum = 0;
    let tones = || chord.iter().zip(points);
    for (one, a) in tones() {
        for (other, b) in tones().take_while(|(other, _)| *other < one) {
            let stands = a.minus(*b).offset().microcents();
            sum += error(exact(one - other), stands) * quarters(one - other);
        }
    }
    sum / 4
}

impl Default for Shapes {
    fn default() -> Shapes {
        Shapes::new()
    }
}

/// How far an interval, standing so far from equal, is from the nearest of its exact sizes; microcents.
pub const fn error(sizes: [i64; 2], offset: i64) -> i64 {
    let (one, other) = ((offset - sizes[0]).abs(), (offset - sizes[1]).abs());
    if one < other { one } else { other }
}

/// The exact sizes of an interval of so many semitones, as microcents from equal; where there is but one, that twice.
pub const fn exact(semitones: u8) -> [i64; 2] {
    SIZES[semitones as usize % 12]
}

const SIZES: [[i64; 2]; 12] = {
    let mut sizes = [[0; 2]; 12];
    let mut semitones = 0;
    while semitones < 12 {
        let points = EXACT[semitones];
        sizes[semitones] = [
            points[0].offset().microcents(),
            points[points.len() - 1].offset().microcents(),
        ];
        semitones += 1;
    }
    sizes
};

/// How hard an interval of so many semitones holds its size where held notes will not let all of them have it.
pub const fn pull(semitones: u8) -> i64 {
    match semitones % 12 {
        3 | 4 | 5 | 7 | 8 | 9 => 20,
        _ => 1,
    }
}

#[cfg(test)]
mod make;
