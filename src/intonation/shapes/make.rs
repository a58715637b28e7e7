//! How the table of shapes is made. Where it differs, `cargo test --lib shapes::make` shows what it should be.

use super::{CORE_MAX, EXACT, Shapes, TABLE, error, exact, quarters};
use crate::intonation::lattice::Point;
use crate::intonation::pitch_classes::PitchClasses;
use std::fmt::Write;

/// Shapes kept for one chord.
const KEPT_MAX: usize = 12;
/// Shapes that err by more than this for each pitch class beyond the best are not kept.
const SLACK: i64 = 6_000_000 * 4;
/// Of unfinished shapes so many are followed up, those that err least.
const FOLLOWED_MAX: usize = 200;

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

/// What is being worked on.
#[derive(Default)]
struct Work {
    level: Vec<Partly>,
    next: Vec<Partly>,
}

impl Work {
    /// Places one pitch class after another, each exactly above or below one that stands already.
    fn shapes_of(&mut self, set: PitchClasses) -> Vec<[Point; CORE_MAX]> {
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
        kept.map(|partly| partly.points).collect()
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
            quarters(semitones) * error(exact(semitones), stands.microcents())
        })
        .sum()
}

fn table() -> String {
    let mut text = String::from(
        "# Made by shapes/make.rs: a chord, and the points of its shapes as fifths,thirds.\n",
    );
    for bits in 1u16..1 << 12 {
        let set = PitchClasses::from_bits(bits);
        if lowest_turn(set).0 != set || set.count() > CORE_MAX {
            continue;
        }
        let classes: Vec<String> = set.iter().map(|class| class.to_string()).collect();
        let shapes = Work::default().shapes_of(set);
        let shapes = shapes.iter().map(|shape| {
            let points = shape[..set.count()].iter();
            let points = points.map(|p| format!("{},{}", p.fifths, p.thirds));
            points.collect::<Vec<_>>().join(" ")
        });
        let shapes: Vec<String> = shapes.collect();
        writeln!(text, "{}: {}", classes.join(" "), shapes.join(" | ")).expect("text has room");
    }
    text
}

#[test]
fn the_table_is_what_comes_of_it() {
    let made = table();
    // The core reaches no files, so what differs is to be copied by hand.
    assert!(made == TABLE, "{made}");
}

// The templates of least weighted error, as published with the method (adaptive tables): major 4:5:6, minor 10:12:15,
// diminished 25:30:36, dominant seventh with 9/5, minor seventh 10:12:15:18.
#[test]
fn chords_have_the_shapes_of_the_books() {
    let shapes = Shapes::new();
    let best = |keys: &[u8]| {
        let set = PitchClasses::of(keys);
        let found = shapes.of(set);
        let at = |key: u8| {
            found
                .classes()
                .iter()
                .position(|class| *class == key)
                .expect("of the chord")
        };
        let root = found.shapes[0].points[at(keys[0])];
        let ratio = |key: &u8| found.shapes[0].points[at(*key)].minus(root).ratio();
        keys.iter().map(ratio).collect::<Vec<_>>()
    };
    assert_eq!(best(&[0, 4, 7]), [(1, 1), (5, 4), (3, 2)]);
    assert_eq!(best(&[9, 0, 4]), [(1, 1), (6, 5), (3, 2)]);
    assert_eq!(best(&[11, 2, 5]), [(1, 1), (6, 5), (36, 25)]);
    assert_eq!(best(&[7, 11, 2, 5]), [(1, 1), (5, 4), (3, 2), (9, 5)]);
    assert_eq!(best(&[2, 5, 9, 0]), [(1, 1), (6, 5), (3, 2), (9, 5)]);
    assert_eq!(best(&[0, 2, 7]), [(1, 1), (9, 8), (3, 2)]);
}
