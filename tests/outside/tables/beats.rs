//! Thirds, fifths, wolves, and how fast they beat.

use super::*;
use trued::offline::beats::{of_fifth, of_major_third};
use trued::pitch::Pitch;

const KEYS: [&str; 12] = [
    "C", "C#", "D", "Eb", "E", "F", "F#", "G", "G#", "A", "Bb", "B",
];

/// Printed: B. Ratte 1991 pp. 153 and 164, U. Meister 1991 (p. 116 of Ratte): good and bad major thirds, good and bad
/// minor thirds, excess of the wolf; the tolerance is that of figures made from rounded fifths.
const RATTE: [(&str, [f64; 5], f64); 3] = [
    (
        "quarter-comma-meantone",
        [386.314, 427.372, 310.2645, 269.2065, 35.6815],
        0.002,
    ),
    (
        "two-sevenths-comma-meantone",
        [383.24, 433.52, 312.57, 262.29, 44.135],
        0.012,
    ),
    (
        "sixth-pythagorean-meantone",
        [392.18, 415.64, 305.865, 282.405, 19.55],
        0.002,
    ),
];

fn size(chart: &Chart, low: u8, keys: u8) -> f64 {
    cents(chart, low + keys) - cents(chart, low)
}

#[test]
fn fifths_and_thirds_of_all_twelve_keys() {
    let figures = figures();
    let mut worst = 0f64;
    for (scale, intervals) in figures["intervals"].as_object().expect("a map") {
        let chart = chart(shipped_name(scale));
        for (kind, keys) in [("major_thirds", 4), ("minor_thirds", 3), ("fifths", 7)] {
            for (low, name) in (60..).zip(KEYS) {
                let expected = intervals[kind][name].as_f64().expect("a number");
                worst = worst.max((size(&chart, low, keys) - expected).abs());
            }
        }
    }
    println!("thirds and fifths in every key: worst {worst:.6} c");
    assert!(worst < 1e-5, "{worst}");
}

#[test]
fn printed_thirds_and_wolves_of_meantone() {
    for (name, [good, bad, minor_good, minor_bad, wolf], tolerance) in RATTE {
        let chart = chart(name);
        let is = |keys: u8, low: u8, printed: f64| {
            (size(&chart, low, keys) - printed).abs() <= tolerance
        };
        let count = |keys: u8, printed: f64| (60..72).filter(|low| is(keys, *low, printed)).count();
        assert_eq!((count(4, good), count(4, bad)), (8, 4), "{name}");
        assert_eq!(
            (count(3, minor_good), count(3, minor_bad)),
            (9, 3),
            "{name}"
        );
        let excess = size(&chart, 68, 7) - 1200.0 * 1.5f64.log2();
        assert!((excess - wolf).abs() <= tolerance, "{name}: {excess}");
    }
}

fn pitches(chart: &Chart, low: u8, keys: u8) -> (Pitch, Pitch) {
    let pitch = |key: u8| {
        chart
            .tuning
            .pitch(Key::new(key).expect("a key"))
            .expect("sounds")
    };
    (pitch(low), pitch(low + keys))
}

#[test]
fn beats_from_f3_at_two_pitches() {
    let figures = figures();
    let mut worst = 0f64;
    for table in figures["beats"].as_array().expect("a list") {
        let name = shipped_name(table["scale"].as_str().expect("a scale"));
        let chart = chart_at(name, table["a4_hz"].as_f64().expect("a number"));
        for low in 53..65u8 {
            let name = |keys: u8| KEYS[(low + keys) as usize % 12];
            let expected = |kind: &str, keys: u8| {
                let pair = format!("{}-{}", name(0), name(keys));
                table[kind][&pair]
                    .as_f64()
                    .unwrap_or_else(|| panic!("{kind} {pair}"))
            };
            let (from, to) = pitches(&chart, low, 7);
            worst = worst.max((of_fifth(from, to) - expected("fifths", 7)).abs());
            let (from, to) = pitches(&chart, low, 4);
            worst = worst.max((of_major_third(from, to) - expected("thirds", 4)).abs());
        }
    }
    println!("beats of fifths and thirds from F3: worst {worst:.6} a second (printed to 0.001)");
    assert!(worst <= 0.000_501, "{worst}");
}

// A tuning instruction for Vallotti: F3-A3 twice a metronome at 89; a maker's page on Neidhardt: five times a second. Both
// leave the pitch unsaid; 440 fits.
#[test]
fn instructions_for_tuners_agree() {
    for (name, printed, tolerance) in [
        ("vallotti", 2.967, 0.03),
        ("neidhardt-1724-big-city", 5.0, 0.1),
    ] {
        let (low, high) = pitches(&chart(name), 53, 4);
        let beats = of_major_third(low, high);
        println!("{name}: F3-A3 beats {beats:.3} a second, printed {printed}");
        assert!((beats - printed).abs() <= tolerance);
    }
}
