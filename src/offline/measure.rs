//! What sounds, from the samples alone: frequencies of partials, and how they swell and fade against each other.
//!
//! A stretch of sound is first shifted down so that the partial in question stands near 0 Hz and all else is filtered
//! away; a few hundred complex values a second then say everything about it.

use std::f64::consts::TAU;
use std::path::Path;

/// A sound read back from a file, its channels averaged.
pub struct Sound {
    samples: Vec<f64>,
    rate_hz: f64,
}

/// How the loudness of one partial goes up and down.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Swell {
    /// Beats a second, where there are any.
    pub beats_hz: Option<f64>,
    /// Loudest less softest, by their sum: 1 when it dies away altogether, 0 when it stands still.
    pub depth: f64,
    /// How long was listened, in seconds.
    pub listened_s: f64,
}

/// Cents of `upper` above `lower`, both in hertz.
pub fn cents(upper_hz: f64, lower_hz: f64) -> f64 {
    1200.0 * (upper_hz / lower_hz).log2()
}

/// Complex values a second after shifting down.
const SLOW_HZ: f64 = 400.0;
/// The filter lets nothing be found further from where one looks.
const REACH_HZ_MAX: f64 = 150.0;
/// Length of the filter for frequencies: stops all that is 200 Hz away or more.
const NARROW_S: f64 = 0.02;
/// And for swelling, where neighbours must not be heard at all: stops what is 67 Hz away or more.
const NARROWER_S: f64 = 0.06;
/// Beats slower than this many in the stretch are too slow to be counted.
const BEATS_MIN: f64 = 2.5;
/// Beats faster than this are heard as roughness, and the filter would halve them.
const BEATS_HZ_MAX: f64 = 25.0;
/// Swelling weaker than this part of the mean power is none that anyone hears.
const SWELL_MIN: f64 = 0.05;

impl Sound {
    /// # Errors
    /// If the file cannot be read or is no WAV of whole numbers.
    pub fn read(path: &Path) -> Result<Sound, hound::Error> {
        let mut reader = hound::WavReader::open(path)?;
        let spec = reader.spec();
        let full = (1i64 << (spec.bits_per_sample - 1)) as f64;
        let each: Vec<i32> = reader.samples::<i32>().collect::<Result<_, _>>()?;
        let samples = each
            .chunks(spec.channels as usize)
            .map(|frame| frame.iter().map(|s| *s as f64 / full).sum::<f64>() / frame.len() as f64)
            .collect();
        Ok(Sound::new(samples, spec.sample_rate as f64))
    }

    pub fn new(samples: Vec<f64>, rate_hz: f64) -> Sound {
        Sound { samples, rate_hz }
    }

    pub fn length_s(&self) -> f64 {
        self.samples.len() as f64 / self.rate_hz
    }

    /// The frequency of the strongest partial within `around_cents` of `near_hz`, between two moments. `None` if the
    /// stretch is too short or silent. On a steady tone of half a second good to 0.01 cent.
    pub fn partial_hz(&self, span_s: (f64, f64), near_hz: f64, around_cents: f64) -> Option<f64> {
        let slow = self.shift_down(span_s, near_hz, NARROW_S)?;
        let reach_hz = (near_hz * ((around_cents / 1200.0).exp2() - 1.0)).min(REACH_HZ_MAX);
        let step_hz = SLOW_HZ / slow.len() as f64 / 2.0;
        let steps = (reach_hz / step_hz).ceil() as i32;
        let (mut offset_hz, mut strongest) = (0.0, 0.0);
        for step in -steps..=steps {
            let hz = step as f64 * step_hz;
            let power = sum_at(&slow, hz, 0..slow.len()).power();
            if power > strongest {
                (offset_hz, strongest) = (hz, power);
            }
        }
        if strongest == 0.0 {
            return None;
        }
        Some(near_hz + refine(&slow, offset_hz))
    }

    /// How what sounds at `near_hz` swells between two moments. `None` if the stretch is too short or silent.
    pub fn swell(&self, span_s: (f64, f64), near_hz: f64) -> Option<Swell> {
        let slow = self.shift_down(span_s, near_hz, NARROWER_S)?;
        let power: Vec<f64> = slow.iter().map(|z| z.power()).collect();
        let mean = power.iter().sum::<f64>() / power.len() as f64;
        if mean == 0.0 {
            return None;
        }
        let loud = power.iter().fold(0f64, |a, b| a.max(*b)).sqrt();
        let soft = power.iter().fold(f64::MAX, |a, b| a.min(*b)).sqrt();
        // Two partials together have a power of A² + B² + 2AB cos(beat), so the beat is a plain tone in it.
        let tone: Vec<Complex> = power.iter().map(|p| Complex(p / mean - 1.0, 0.0)).collect();
        let listened_s = tone.len() as f64 / SLOW_HZ;
        Some(Swell {
            beats_hz: beat(&tone, listened_s),
            depth: (loud - soft) / (loud + soft),
            listened_s,
        })
    }

    /// The stretch with `hz` moved to 0, filtered, at `SLOW_HZ` values a second.
    fn shift_down(&self, span_s: (f64, f64), hz: f64, filter_s: f64) -> Option<Vec<Complex>> {
        let place = |s: f64| ((s * self.rate_hz).round().max(0.0) as usize).min(self.samples.len());
        let span = self.samples.get(place(span_s.0)..place(span_s.1))?;
        let taps = blackman_harris((filter_s * self.rate_hz) as usize);
        let hop = (self.rate_hz / SLOW_HZ).round() as usize;
        let turns = hz / self.rate_hz;
        let shifted: Vec<Complex> = span
            .iter()
            .enumerate()
            .map(|(n, sample)| Complex::turned(-turns * n as f64).times(*sample))
            .collect();
        let slow: Vec<Complex> = shifted
            .windows(taps.len())
            .step_by(hop)
            .map(|window| {
                let both = window.iter().zip(&taps);
                both.fold(Complex(0.0, 0.0), |sum, (z, tap)| sum.plus(z.times(*tap)))
            })
            .collect();
        (slow.len() >= 16).then_some(slow)
    }
}

/// The frequency near `hz` at which the phase of the first half runs on into the second.
fn refine(slow: &[Complex], mut hz: f64) -> f64 {
    let half = slow.len() / 2;
    let apart_s = (slow.len() - half) as f64 / SLOW_HZ;
    for _ in 0..8 {
        let first = sum_at(slow, hz, 0..half);
        let second = sum_at(slow, hz, slow.len() - half..slow.len());
        hz += second.angle_from(first) / TAU / apart_s;
    }
    hz
}

fn beat(tone: &[Complex], listened_s: f64) -> Option<f64> {
    let step_hz = 0.25 / listened_s;
    let window: f64 = hann(tone.len()).sum();
    let (mut best_hz, mut strongest) = (0.0, 0.0);
    let mut hz = step_hz;
    while hz < BEATS_HZ_MAX {
        // A real tone has half its strength at each of +hz and -hz.
        let strength = 2.0 * sum_at(tone, hz, 0..tone.len()).power().sqrt() / window;
        if strength > strongest {
            (best_hz, strongest) = (hz, strength);
        }
        hz += step_hz;
    }
    // A slow creep is strongest below what can be counted.
    (strongest > SWELL_MIN && best_hz * listened_s > BEATS_MIN).then(|| refine(tone, best_hz))
}

/// What a stretch holds at one frequency, softly cut out. Phases are counted from the beginning of the whole.
fn sum_at(slow: &[Complex], hz: f64, part: std::ops::Range<usize>) -> Complex {
    let (start, count) = (part.start, part.len());
    slow[part].iter().zip(hann(count)).enumerate().fold(
        Complex(0.0, 0.0),
        |sum, (n, (z, weight))| {
            let turn = Complex::turned(-hz / SLOW_HZ * (start + n) as f64);
            sum.plus(z.by(turn).times(weight))
        },
    )
}

fn hann(count: usize) -> impl Iterator<Item = f64> {
    (0..count).map(move |n| 0.5 - 0.5 * (TAU * (n as f64 + 0.5) / count as f64).cos())
}

/// A filter whose stop band is 92 dB down. (Harris 1978, four terms, from memory; the tests hold it to it.)
fn blackman_harris(count: usize) -> Vec<f64> {
    let term = |n: usize, k: f64| (TAU * k * (n as f64 + 0.5) / count as f64).cos();
    (0..count)
        .map(|n| 0.35875 - 0.48829 * term(n, 1.0) + 0.14128 * term(n, 2.0) - 0.01168 * term(n, 3.0))
        .collect()
}

#[derive(Clone, Copy, Debug)]
struct Complex(f64, f64);

impl Complex {
    fn turned(turns: f64) -> Complex {
        let (sin, cos) = (TAU * turns.fract()).sin_cos();
        Complex(cos, sin)
    }

    fn plus(self, other: Complex) -> Complex {
        Complex(self.0 + other.0, self.1 + other.1)
    }

    fn times(self, by: f64) -> Complex {
        Complex(self.0 * by, self.1 * by)
    }

    fn by(self, other: Complex) -> Complex {
        Complex(
            self.0 * other.0 - self.1 * other.1,
            self.0 * other.1 + self.1 * other.0,
        )
    }

    fn power(self) -> f64 {
        self.0 * self.0 + self.1 * self.1
    }

    fn angle_from(self, other: Complex) -> f64 {
        let z = self.by(Complex(other.0, -other.1));
        z.1.atan2(z.0)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const RATE_HZ: f64 = 48_000.0;

    /// Tones of (hertz, strength).
    fn tones(parts: &[(f64, f64)], seconds: f64) -> Sound {
        let count = (seconds * RATE_HZ) as usize;
        let sample = |n: usize| {
            parts
                .iter()
                .enumerate()
                .map(|(i, (hz, strength))| {
                    strength * (TAU * (hz * n as f64 / RATE_HZ + 0.17 * i as f64)).sin()
                })
                .sum::<f64>()
        };
        Sound::new((0..count).map(sample).collect(), RATE_HZ)
    }

    #[test]
    fn half_a_second_is_good_to_a_hundredth_of_a_cent() {
        for hz in [27.5, 65.406, 261.6256, 440.0, 1318.51, 4186.009, 12_543.85] {
            for away in [-40.0f64, -3.3, 0.0, 17.0, 45.0] {
                let sound = tones(&[(hz, 0.1)], 0.5);
                let near = hz * (away / 1200.0).exp2();
                if (near - hz).abs() > REACH_HZ_MAX {
                    continue;
                }
                let found = sound.partial_hz((0.0, 0.5), near, 60.0).unwrap();
                assert!(cents(found, hz).abs() < 0.01, "{hz} from {away}: {found}");
            }
        }
    }

    #[test]
    fn neighbours_do_not_lead_it_astray() {
        // C, E, G and their louder neighbours' partials.
        let sound = tones(
            &[
                (261.63, 0.2),
                (523.26, 0.2),
                (329.63, 0.3),
                (392.0, 0.3),
                (784.0, 0.3),
            ],
            0.5,
        );
        for hz in [261.63, 329.63, 392.0] {
            let found = sound.partial_hz((0.0, 0.5), hz, 60.0).unwrap();
            assert!(cents(found, hz).abs() < 0.01, "{hz}: {found}");
        }
    }

    #[test]
    fn beats_are_counted_from_the_swelling_alone() {
        for (lower, upper) in [
            (1308.13, 1318.51),
            (784.9, 782.46),
            (622.9, 610.1),
            (500.0, 501.0),
        ] {
            let sound = tones(&[(lower, 0.1), (upper, 0.08), (lower + 130.0, 0.2)], 3.5);
            let swell = sound.swell((0.0, 3.5), (lower + upper) / 2.0).unwrap();
            let beats = swell.beats_hz.unwrap();
            let right = f64::abs(lower - upper);
            assert!((beats - right).abs() < 0.003, "{beats} for {right}");
            assert!(swell.depth > 0.7);
        }
    }

    #[test]
    fn what_stands_still_or_creeps_has_no_beats() {
        for upper in [1308.13, 1308.14, 1308.3] {
            let sound = tones(&[(1308.13, 0.1), (upper, 0.08)], 3.5);
            let swell = sound.swell((0.0, 3.5), 1308.13).unwrap();
            assert_eq!(swell.beats_hz, None, "{upper}: {swell:?}");
        }
    }

    #[test]
    fn silence_and_shreds_have_no_pitch() {
        let silence = Sound::new(vec![0.0; 48_000], RATE_HZ);
        assert_eq!(silence.partial_hz((0.0, 1.0), 440.0, 60.0), None);
        let tone = tones(&[(440.0, 0.1)], 0.5);
        assert_eq!(tone.partial_hz((0.2, 0.21), 440.0, 60.0), None);
        assert_eq!(tone.partial_hz((3.0, 4.0), 440.0, 60.0), None);
        assert_eq!(tone.partial_hz((0.4, 0.2), 440.0, 60.0), None);
    }
}
