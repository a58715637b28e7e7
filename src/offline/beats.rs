//! How fast an interval beats: what a tuner counts.

use crate::pitch::Pitch;

/// Beats a second of a fifth, where the third partial of the low note meets the second of the high one; below nought is
/// narrow.
pub fn of_fifth(low: Pitch, high: Pitch) -> f64 {
    2.0 * high.hertz() - 3.0 * low.hertz()
}

/// Beats a second of a major third, where the fifth partial of the low note meets the fourth of the high one.
pub fn of_major_third(low: Pitch, high: Pitch) -> f64 {
    4.0 * high.hertz() - 5.0 * low.hertz()
}

#[cfg(test)]
mod tests {
    use super::*;

    // Twelve-equal from F3 at A4 = 440: B. Capleton 2007, as table 1 in J. Neurosci. 32/35 (2012), p. 12251.
    #[test]
    fn equal_temperament_beats_as_printed() {
        let key = Pitch::of_key;
        let thirds = [6.9, 7.3, 7.8, 8.2, 8.7, 9.2, 9.8, 10.4, 11.0, 11.7, 12.3];
        for (low, printed) in (53..).zip(thirds) {
            let beats = of_major_third(key(low), key(low + 4));
            assert!((beats - printed).abs() < 0.08, "{low}: {beats}");
        }
        let fifths = [0.6, 0.6, 0.7, 0.7, 0.7, 0.8, 0.8, 0.9];
        for (low, printed) in (53..).zip(fifths) {
            let beats = of_fifth(key(low), key(low + 7));
            assert!((beats + printed).abs() < 0.08, "{low}: {beats}");
        }
    }
}
