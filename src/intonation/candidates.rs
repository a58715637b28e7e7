//! The shapes a chord may take now, by the player's ratios.

use super::lattice::Point;
use super::pitch_classes::PitchClasses;
use super::settings::Ratios;
use super::shapes::{CORE_MAX, Shape, Shapes};
use crate::pitch::Interval;

/// The harmonic seventh above a root.
const SEVENTH: Point = Point {
    fifths: 0,
    thirds: 0,
    sevenths: 1,
};
/// Pitch classes above its root that a dominant chord may have: third, fifth, seventh, ninth.
const DOMINANT: PitchClasses = PitchClasses::of(&[0, 2, 4, 7, 10]);

/// One shape: offsets from equal, with its zero anywhere.
#[derive(Clone, Copy, Default)]
pub struct Candidate {
    pub offsets: [i64; CORE_MAX],
    /// Empty for intervals of the player's own.
    pub points: [Point; CORE_MAX],
    /// Members whose intervals are as they should be in this shape, whatever their nearest 5-limit size: bit 0 is the
    /// first.
    pub wanted: u8,
}

/// At least one shape for a chord.
pub struct Candidates<'a> {
    from: From<'a>,
    classes: [u8; CORE_MAX],
    width: usize,
}

enum From<'a> {
    Pure(&'a [Shape]),
    /// Shapes of the chord without its seventh, or with a root put in; which of their points are members, and the
    /// root's.
    Septimal {
        shapes: &'a [Shape],
        members: [usize; CORE_MAX],
        root: usize,
    },
    Own([i64; CORE_MAX]),
}

impl<'a> Candidates<'a> {
    /// `septimal`: the root of a dominant chord whose seventh is to be 7/4.
    pub fn of(
        core: PitchClasses,
        ratios: &Ratios,
        root: Option<u8>,
        septimal: Option<u8>,
        shapes: &'a Shapes,
    ) -> Candidates<'a> {
        match (ratios, septimal) {
            (Ratios::Own(offsets), _) => {
                Candidates::own(core, offsets, root.or(core.first()).unwrap_or(0))
            }
            (_, Some(root)) => Candidates::septimal(core, root, shapes),
            _ => Candidates::pure(core, shapes),
        }
    }

    /// The chord's pitch classes, in the order of each candidate's offsets.
    pub fn classes(&self) -> &[u8] {
        &self.classes[..self.width]
    }

    /// Whether the points mean anything.
    pub fn is_exact(&self) -> bool {
        !matches!(self.from, From::Own(_))
    }

    pub fn count(&self) -> usize {
        match self.from {
            From::Pure(shapes) | From::Septimal { shapes, .. } => shapes.len(),
            From::Own(_) => 1,
        }
    }

    /// What a candidate errs at least where its shape is kept, in microcents.
    pub fn errs(&self, index: usize) -> i64 {
        match self.from {
            From::Pure(shapes) => shapes[index].errs,
            _ => 0,
        }
    }

    /// One of them; the best come first.
    pub fn get(&self, index: usize) -> Candidate {
        let (points, wanted) = match &self.from {
            From::Pure(shapes) => (shapes[index].points, 0),
            From::Septimal {
                shapes,
                members,
                root,
            } => {
                let shape = &shapes[index].points;
                let mut points = members.map(|member| shape[member]);
                points[self.width - 1] = shape[*root].plus(SEVENTH);
                (points, 1 << (self.width - 1))
            }
            From::Own(offsets) => {
                return Candidate {
                    offsets: *offsets,
                    wanted: u8::MAX,
                    ..Candidate::default()
                };
            }
        };
        Candidate {
            offsets: points.map(|point| point.offset().microcents()),
            points,
            wanted,
        }
    }

    fn pure(core: PitchClasses, shapes: &'a Shapes) -> Candidates<'a> {
        let found = shapes.of(core);
        Candidates {
            from: From::Pure(found.shapes),
            classes: found.classes,
            width: found.count,
        }
    }

    /// The chord without its seventh takes its 5-limit shapes; the seventh stands on the root, sounding or not.
    fn septimal(core: PitchClasses, root: u8, shapes: &'a Shapes) -> Candidates<'a> {
        let seventh = (root + 10) % 12;
        // A root that is missing is put in for the while, so that the others know where it would be.
        let found = shapes.of(core.without(seventh).with(root));
        let (mut members, mut at_root) = ([0; CORE_MAX], 0);
        let mut classes = [0; CORE_MAX];
        let mut place = 0;
        for (index, class) in found.classes().iter().enumerate() {
            if *class == root {
                at_root = index;
            }
            if core.has(*class) {
                (members[place], classes[place]) = (index, *class);
                place += 1;
            }
        }
        classes[place] = seventh;
        Candidates {
            from: From::Septimal {
                shapes: found.shapes,
                members,
                root: at_root,
            },
            classes,
            width: place + 1,
        }
    }

    fn own(core: PitchClasses, offsets: &[Interval; 12], root: u8) -> Candidates<'a> {
        let (mut at, mut classes) = ([0; CORE_MAX], [0; CORE_MAX]);
        for (place, class) in core.iter().enumerate() {
            classes[place] = class;
            at[place] = offsets[(class + 12 - root) as usize % 12].microcents();
        }
        Candidates {
            from: From::Own(at),
            classes,
            width: core.count(),
        }
    }
}

/// Whether a chord is a dominant seventh over this root, which need not sound: 4:5:6:7, with or without its fifth and
/// ninth.
pub fn is_dominant(core: PitchClasses, root: u8) -> bool {
    let above = core.above(root);
    let whole = above.has(0) && above.has(4) && above.has(10);
    let rootless = above.has(4) && above.has(7) && above.has(10);
    (whole || rootless) && above.less(DOMINANT).is_empty()
}
