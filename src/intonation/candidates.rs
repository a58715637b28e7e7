//! The shapes a chord may take now, by the player's ratios.

use super::lattice::Point;
use super::pitch_classes::PitchClasses;
use super::settings::Ratios;
use super::shapes::{CORE_MAX, KEPT_MAX, Shapes};
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
pub struct Candidates {
    list: [Candidate; KEPT_MAX],
    count: usize,
    classes: [u8; CORE_MAX],
    width: usize,
    /// Whether the points mean anything.
    pub exact: bool,
}

impl Candidates {
    /// `septimal`: the root of a dominant chord whose seventh is to be 7/4.
    pub fn of(
        core: PitchClasses,
        ratios: &Ratios,
        root: Option<u8>,
        septimal: Option<u8>,
        shapes: &Shapes,
    ) -> Candidates {
        let mut all = Candidates {
            list: [Candidate::default(); KEPT_MAX],
            count: 0,
            classes: [0; CORE_MAX],
            width: core.count(),
            exact: true,
        };
        match (ratios, septimal) {
            (Ratios::Own(offsets), _) => all.own(core, offsets, root.or(core.first()).unwrap_or(0)),
            (_, Some(root)) => all.septimal(core, root, shapes),
            _ => all.pure(core, shapes),
        }
        all
    }

    /// The chord's pitch classes, in the order of each candidate's offsets.
    pub fn classes(&self) -> &[u8] {
        &self.classes[..self.width]
    }

    pub fn list(&self) -> &[Candidate] {
        &self.list[..self.count]
    }

    fn pure(&mut self, core: PitchClasses, shapes: &Shapes) {
        let found = shapes.of(core);
        self.classes[..self.width].copy_from_slice(found.classes());
        for shape in found.shapes {
            self.add(*shape, 0);
        }
    }

    /// The chord without its seventh takes its 5-limit shapes; the seventh stands on the root, sounding or not.
    fn septimal(&mut self, core: PitchClasses, root: u8, shapes: &Shapes) {
        let seventh = (root + 10) % 12;
        // A root that is missing is put in for the while, so that the others know where it would be.
        let found = shapes.of(core.without(seventh).with(root));
        let width = self.width;
        for shape in found.shapes {
            let at_root = found.classes().iter().position(|class| *class == root);
            let mut points = [Point::default(); CORE_MAX];
            let mut place = 0;
            for (class, point) in found.classes().iter().zip(shape) {
                if core.has(*class) {
                    (points[place], self.classes[place]) = (*point, *class);
                    place += 1;
                }
            }
            points[width - 1] = shape[at_root.unwrap_or(0)].plus(SEVENTH);
            self.classes[width - 1] = seventh;
            self.add(points, 1 << (width - 1));
        }
    }

    fn own(&mut self, core: PitchClasses, offsets: &[Interval; 12], root: u8) {
        self.exact = false;
        let mut candidate = Candidate {
            wanted: u8::MAX,
            ..Candidate::default()
        };
        for (place, class) in core.iter().enumerate() {
            self.classes[place] = class;
            candidate.offsets[place] = offsets[(class + 12 - root) as usize % 12].microcents();
        }
        self.list[0] = candidate;
        self.count = 1;
    }

    fn add(&mut self, points: [Point; CORE_MAX], wanted: u8) {
        self.list[self.count] = Candidate {
            offsets: points.map(|point| point.offset().microcents()),
            points,
            wanted,
        };
        self.count += 1;
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
