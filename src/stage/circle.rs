//! What the fifths of a tuning do: which are wolves, and what closes the circle.

use super::expression::narrow_or_wide;
use crate::pitch::{Interval, Log};
use crate::tuning::{Key, Letter, Tuning};

/// A fifth this far from pure howls: more than half of either comma.
const WOLF: Interval = Interval::from_cents(12);
/// A key this far from the others' equal places is a neutral step, and its fifths are none.
const NEUTRAL: Interval = Interval::from_cents(30);

/// A fifth by the names of its keys.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Fifth {
    pub low: Letter,
    pub high: Letter,
    /// Above nought is wide.
    pub from_pure: Interval,
    /// One of its keys is a neutral step.
    pub neutral: bool,
}

/// The twelve fifths of a tuning that repeats at the octave, upwards from one end of its chain; the last closes it.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Circle {
    pub fifths: Vec<Fifth>,
}

impl Fifth {
    pub fn is_wolf(&self) -> bool {
        !self.neutral && self.from_pure.abs() > WOLF
    }

    /// `35.7 c wide`, or `pure`.
    fn size(&self) -> String {
        // Pitches are rounded to the microcent, so a pure fifth may miss by one.
        match narrow_or_wide(self.from_pure).as_str() {
            _ if self.from_pure.abs().microcents() <= 2 => "pure".to_string(),
            typed => {
                let direction = if typed.starts_with("wide") {
                    "wide"
                } else {
                    "narrow"
                };
                format!("{:.1} c {direction}", self.from_pure.abs().cents())
            }
        }
    }
}

impl Circle {
    /// `None` unless all twelve keys sound and repeat at the octave.
    pub fn of(tuning: &Tuning, names: &[Letter; 12]) -> Option<Circle> {
        let place = |key: i32| tuning.pitch(Key::C4.moved(key)?);
        for key in 0..12 {
            if place(key + 12)? - place(key)? != Interval::OCTAVE {
                return None;
            }
        }
        let neutral = neutral_keys(tuning)?;
        let mut fifths = Vec::with_capacity(12);
        let mut low = chain_start(names);
        for _ in 0..12 {
            let (from, to) = (low as i32, (low as i32 + 7) % 12);
            let size = (place(to)? - place(from)?).within_octave();
            fifths.push(Fifth {
                low: names[low],
                high: names[to as usize],
                from_pure: size - Log::of_ratio(3, 2).interval(),
                neutral: neutral[low] || neutral[to as usize],
            });
            low = to as usize;
        }
        Some(Circle { fifths })
    }

    /// The fifth that is left over when the chain is tuned.
    pub fn closing(&self) -> &Fifth {
        &self.fifths[11]
    }

    pub fn wolves(&self) -> impl Iterator<Item = &Fifth> {
        self.fifths.iter().filter(|fifth| fifth.is_wolf())
    }

    /// Sentences for people: what closes the circle, and every other wolf.
    pub fn lines(&self) -> Vec<String> {
        let closing = self.closing();
        let mut lines = Vec::new();
        if closing.is_wolf() {
            let (low, high) = (closing.low, closing.high);
            lines.push(format!("{low}-{high} is the wolf, {}", closing.size()));
        } else if !closing.neutral {
            let (low, high) = (closing.low, closing.high);
            lines.push(format!(
                "{low}-{high} closes the circle, {}",
                closing.size()
            ));
        }
        for wolf in self.wolves().filter(|wolf| *wolf != closing) {
            lines.push(format!(
                "{}-{} is a wolf, {}",
                wolf.low,
                wolf.high,
                wolf.size()
            ));
        }
        lines
    }
}

/// The key whose name stands lowest on the line of fifths.
fn chain_start(names: &[Letter; 12]) -> usize {
    let lowest = (0..12).min_by_key(|key| names[*key].place());
    lowest.expect("there are twelve keys")
}

/// Which keys stand off the average of all by more than a temperament ever asks for.
fn neutral_keys(tuning: &Tuning) -> Option<[bool; 12]> {
    let mut offsets = [Interval::ZERO; 12];
    for (key, offset) in offsets.iter_mut().enumerate() {
        let pitch = tuning.pitch(Key::C4.moved(key as i32)?)?;
        *offset = pitch - crate::pitch::Pitch::of_key(60 + key as u8);
    }
    let sum: i64 = offsets.iter().map(|offset| offset.microcents()).sum();
    let average = Interval::from_microcents(sum / 12);
    Some(offsets.map(|offset| (offset - average).abs() > NEUTRAL))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::stage::complaint::{Complaints, Trail};
    use crate::stage::tunings::Library;
    use std::path::Path;

    fn lines(name: &str) -> Vec<String> {
        let mut complaints = Complaints::default();
        let mut library = Library::new(None, Path::new("nowhere/stage.yaml"), &mut complaints);
        let found = library
            .find(name, &Trail::default(), &mut complaints)
            .expect(name);
        let placement = found.placement(None, None, None);
        let tuning = found.scale.tune(&placement).expect(name);
        let names = found.scale.names(&placement);
        Circle::of(&tuning, &names)
            .map(|circle| circle.lines())
            .unwrap_or_default()
    }

    // Wolves: B. Ratte 1991 pp. 153, 164 and U. Meister 1991 p. 116; 40/27 = 680.449 c by its ratio.
    #[test]
    fn wolves_and_what_closes_the_circle() {
        let whole: [(&str, &[&str]); 9] = [
            (
                "quarter-comma-meantone",
                &["G#-Eb is the wolf, 35.7 c wide"],
            ),
            (
                "sixth-pythagorean-meantone",
                &["G#-Eb is the wolf, 19.6 c wide"],
            ),
            (
                "two-sevenths-comma-meantone",
                &["G#-Eb is the wolf, 44.1 c wide"],
            ),
            ("pythagorean", &["G#-Eb is the wolf, 23.5 c narrow"]),
            ("equal-12", &["G#-Eb closes the circle, 2.0 c narrow"]),
            ("werckmeister-3", &["G#-Eb closes the circle, pure"]),
            (
                "five-limit-scale",
                &[
                    "G#-Eb closes the circle, pure",
                    "Bb-F is a wolf, 21.5 c narrow",
                    "D-A is a wolf, 21.5 c narrow",
                    "F#-C# is a wolf, 19.6 c wide",
                ],
            ),
            // E and B are neutral, so A-E and the like are nobody's fifths.
            ("rast-al-farabi", &["G#-Eb closes the circle, 2.0 c narrow"]),
            ("equal-19", &[]),
        ];
        for (name, expected) in whole {
            assert_eq!(lines(name), expected, "{name}");
        }
    }
}
