//! The chord as it was last placed, for records and displays.

use super::lattice::Point;
use super::shapes::CORE_MAX;

/// Pitch classes on their points. What the points mean as a ratio is worked out only when somebody asks.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Chord {
    /// A pitch class, C = 0.
    pub root: Option<u8>,
    pub(super) classes: [u8; CORE_MAX],
    pub(super) points: [Point; CORE_MAX],
    pub(super) count: u8,
}

impl Chord {
    /// Its shape from the root upwards within an octave, in lowest terms: 4:5:6. Empty for less than two pitch classes,
    /// for intervals of the player's own, and where the numbers would fill a line.
    pub fn ratio(&self) -> impl Iterator<Item = u32> + use<> {
        let mut numbers = [0u32; CORE_MAX];
        let count = self.numbers(&mut numbers).unwrap_or(0);
        numbers.into_iter().take(count)
    }

    fn numbers(&self, numbers: &mut [u32; CORE_MAX]) -> Option<usize> {
        let count = self.count as usize;
        if count < 2 {
            return None;
        }
        let root = self.root.unwrap_or(self.classes[0]);
        let above = |index: &usize| (self.classes[*index] + 12 - root) % 12;
        let lowest = (0..count).min_by_key(above)?;
        let mut order = [0, 1, 2, 3, 4, 5];
        order[..count].sort_unstable_by_key(above);
        let mut common = 1u64;
        let mut ratios = [(1u64, 1u64); CORE_MAX];
        for (ratio, index) in ratios.iter_mut().zip(&order[..count]) {
            *ratio = self.points[*index].minus(self.points[lowest]).ratio();
            common = common / gcd(common, ratio.1) * ratio.1;
            if common > u32::MAX as u64 {
                return None;
            }
        }
        let whole = |(over, under): (u64, u64)| over * (common / under);
        let shared = ratios[..count].iter().fold(0, |g, r| gcd(g, whole(*r)));
        for (number, ratio) in numbers.iter_mut().zip(&ratios[..count]) {
            *number = u32::try_from(whole(*ratio) / shared)
                .ok()
                .filter(|n| *n < 10_000)?;
        }
        Some(count)
    }
}

fn gcd(a: u64, b: u64) -> u64 {
    if b == 0 { a } else { gcd(b, a % b) }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_shape_is_read_from_its_root() {
        let point = Point::new;
        let mut chord = Chord {
            root: Some(7),
            classes: [2, 7, 11, 5, 0, 0],
            points: [
                point(1, 0),
                point(0, 0),
                point(0, 1),
                point(-2, 0),
                point(0, 0),
                point(0, 0),
            ],
            count: 3,
        };
        assert_eq!(chord.ratio().collect::<Vec<_>>(), [4, 5, 6]);
        chord.count = 4;
        assert_eq!(chord.ratio().collect::<Vec<_>>(), [36, 45, 54, 64]);
        chord.points[3] = Point {
            sevenths: 1,
            ..point(0, 0)
        };
        assert_eq!(chord.ratio().collect::<Vec<_>>(), [4, 5, 6, 7]);
        chord.count = 1;
        assert_eq!(chord.ratio().count(), 0);
    }
}
