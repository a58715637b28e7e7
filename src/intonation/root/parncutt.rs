//! Parncutt's weights: which class a chord's tones speak for, as lower partials of it. A second opinion on roots, kept
//! to measure ours against; nothing is tuned by it.
//!
//! R. Parncutt, "Revision of Terhardt's psychoacoustical model of the root(s) of a musical chord", Music Perception 6(1),
//! 1988, and "Commentary on Cook & Fujisawa", Empirical Musicology Review 1(4), 2006; both as set down in P. Harrison's
//! parn88 (doi 10.5281/zenodo.1491909).

use crate::intonation::PitchClasses;
use crate::intonation::pitch_classes::CLASSES;

const WIDTH: usize = CLASSES as usize;

/// How much a tone speaks for the class so many semitones below it.
#[derive(Clone, Copy, Debug)]
pub struct Model([u16; WIDTH]);

/// In sixtieths: prime 1, fifth 1/2, major third 1/3, minor seventh 1/4, whole tone 1/5, minor third 1/10.
pub const OF_1988: Model = Model([60, 0, 12, 6, 20, 0, 0, 30, 0, 0, 15, 0]);
pub const OF_2006: Model = Model([10, 0, 1, 0, 3, 0, 0, 5, 0, 0, 2, 0]);

impl Model {
    /// For each class, from C, how much the chord speaks for it as root.
    pub fn weights(&self, chord: PitchClasses) -> [u16; WIDTH] {
        let mut weights = [0; WIDTH];
        for (weight, class) in weights.iter_mut().zip(0..) {
            let tones = chord.above(class).iter();
            *weight = tones.map(|above| self.0[usize::from(above)]).sum();
        }
        weights
    }

    /// The class that weighs most, or all of them where several do.
    pub fn roots(&self, chord: PitchClasses) -> PitchClasses {
        let weights = self.weights(chord);
        let most = weights.into_iter().max().unwrap_or(0);
        let classes = weights.into_iter().zip(0..);
        classes
            .filter(|(weight, _)| *weight == most && most > 0)
            .map(|(_, class)| class)
            .collect()
    }
}
