//! How high a sound is: the frequency of the strongest partial near a place, to well under a hundredth of a cent.

use rustfft::FftPlanner;
use rustfft::num_complex::Complex;
use std::f64::consts::TAU;

/// Cents (100 x MIDI key) of the strongest partial within a quarter-tone of `near_cents`.
///
/// First the highest line of a spectrum four times as fine as the sound allows; then, six times, the turn of phase
/// between the sound's two halves (Hann windows, so that other partials do not leak in).
pub fn partial_cents(sound: &[f64], rate_hz: f64, near_cents: f64) -> f64 {
    let hertz = |cents: f64| 440.0 * ((cents - 6900.0) / 1200.0).exp2();
    let mut found_hz = strongest_hz(
        sound,
        rate_hz,
        hertz(near_cents - 50.0),
        hertz(near_cents + 50.0),
    );
    for _ in 0..6 {
        let half = sound.len() / 2;
        let late = sound.len() - half;
        let first = turned(&sound[..half], 0, found_hz / rate_hz);
        let second = turned(&sound[late..], late, found_hz / rate_hz);
        found_hz += (second * first.conj()).arg() / TAU / (late as f64 / rate_hz);
    }
    6900.0 + 1200.0 * (found_hz / 440.0).log2()
}

fn strongest_hz(sound: &[f64], rate_hz: f64, low_hz: f64, high_hz: f64) -> f64 {
    let size = sound.len() * 4;
    let mut lines: Vec<Complex<f64>> = sound
        .iter()
        .enumerate()
        .map(|(i, x)| Complex::new(x * hann(i, sound.len()), 0.0))
        .collect();
    lines.resize(size, Complex::new(0.0, 0.0));
    FftPlanner::new().plan_fft_forward(size).process(&mut lines);
    let line = |hz: f64| (hz * size as f64 / rate_hz) as usize;
    let loudest = (line(low_hz)..=line(high_hz))
        .max_by(|a, b| lines[*a].norm().total_cmp(&lines[*b].norm()))
        .expect("a band of some width");
    loudest as f64 * rate_hz / size as f64
}

/// The part of a sound at one frequency (in cycles a sample), by its phase at the sound's beginning.
fn turned(part: &[f64], from: usize, frequency: f64) -> Complex<f64> {
    let sample = |(i, x): (usize, &f64)| {
        Complex::from_polar(
            x * hann(i, part.len()),
            -TAU * frequency * (from + i) as f64,
        )
    };
    part.iter().enumerate().map(sample).sum()
}

fn hann(i: usize, length: usize) -> f64 {
    0.5 - 0.5 * (TAU * i as f64 / length as f64).cos()
}

#[test]
fn a_made_chord_is_measured_to_a_thousandth_of_a_cent() {
    let rate_hz = 48_000.0;
    let chord = [6000.0, 6386.3137, 6701.955, 7050.5];
    let sound: Vec<f64> = (0..96_000)
        .map(|i| {
            let tone = |cents: &f64| {
                let hertz = 440.0 * ((cents - 6900.0) / 1200.0).exp2();
                (TAU * hertz * i as f64 / rate_hz + cents).sin()
            };
            chord.iter().map(tone).sum()
        })
        .collect();
    for cents in chord {
        let heard = partial_cents(&sound, rate_hz, cents + 20.0);
        assert!((heard - cents).abs() < 1e-3, "{heard}, not {cents}");
    }
}
