//! What charts say, as fields and as a sheet.

use super::*;
use crate::offline::chart_text::sheet;
use crate::pitch::Hertz;
use crate::stage::complaint::{Complaints, Trail};
use crate::stage::tunings::Library;
use std::path::Path;

fn chart(name: &str, tonic: Option<&str>, hertz: Option<u64>) -> Chart {
    let mut complaints = Complaints::default();
    let mut library = Library::new(None, Path::new("nowhere/stage.yaml"), &mut complaints);
    let found = library
        .find(name, &Trail::default(), &mut complaints)
        .expect(name);
    let tonic = tonic.map(|tonic| Key::parse(tonic).expect("a key"));
    let reference = hertz.map(|hertz| {
        let hertz = Hertz::from_micro(hertz * 1_000_000).expect("not zero");
        (Key::A4, hertz, Pin::Key)
    });
    Chart::of_tuning(&found, found.placement(tonic, None, reference)).expect(name)
}

#[test]
fn json_has_the_fields_it_should() {
    let text = chart("quarter-comma-meantone", None, Some(415)).json();
    let page: serde_json::Value = serde_json::from_str(&text).expect("JSON");
    assert_eq!(page["song"], serde_json::Value::Null);
    assert_eq!(page["tuning"], "quarter-comma-meantone");
    assert_eq!(page["tonic"], serde_json::Value::Null);
    let keys = page["keys"].as_array().expect("a list");
    assert_eq!(keys.len(), 128);
    let a4 = &keys[69];
    assert_eq!(
        (a4["key"].as_u64(), a4["name"].as_str()),
        (Some(69), Some("A4"))
    );
    assert_eq!(
        (a4["hz"].as_f64(), a4["offset"].as_f64()),
        (Some(415.0), Some(0.0))
    );
    // 415 Hz is 101.270... under 440: 1200 log2(415/440).
    let cents = a4["cents"].as_f64().expect("a number");
    assert!((cents - (6900.0 + 1200.0 * (415f64 / 440.0).log2())).abs() < 1e-6);
    let offset = keys[60]["offset"].as_f64().expect("a number");
    assert!((offset - 10.264715).abs() < 2e-6, "{offset}");
}

#[test]
fn names_follow_the_spelling_and_the_octave_changes_at_c() {
    let mut chart = chart("equal-12", None, None);
    chart.names[0] = Letter::parse("B#").expect("a letter");
    chart.names[11] = Letter::parse("Cb").expect("a letter");
    chart.names[8] = Letter::parse("Ab").expect("a letter");
    assert_eq!(chart.name(Key::C4), "B#3");
    assert_eq!(chart.name(Key::new(59).expect("a key")), "Cb4");
    assert_eq!(chart.name(Key::new(68).expect("a key")), "Ab4");
    assert_eq!(chart.name(Key::new(8).expect("a key")), "Ab-1");
}

#[test]
fn the_tonic_is_said_as_a_song_would_name_it() {
    assert_eq!(chart("vallotti", None, None).tonic(), None);
    assert_eq!(
        chart("five-limit-scale", Some("D4"), None)
            .tonic()
            .as_deref(),
        Some("D")
    );
    assert_eq!(chart("equal-19", None, None).tonic().as_deref(), Some("C4"));
}

#[test]
fn csv_is_one_line_a_key() {
    let csv = chart("equal-12", None, None).csv();
    let lines: Vec<&str> = csv.lines().collect();
    assert_eq!(lines.len(), 129);
    assert_eq!(lines[0], "key,name,hz,cents,offset");
    assert_eq!(lines[70], "69,A4,440,6900.000000,0.000000");
    assert_eq!(lines[61], "60,C4,261.625565,6000.000000,0.000000");
}

#[test]
fn the_sheet_says_how_a_harpsichord_is_set() {
    let text = sheet(&chart("quarter-comma-meantone", None, None));
    for line in [
        "A4 = 440 Hz.",
        "C4 sounds 263.18 Hz, 10.3 c over equal at A4 = 440, because A4 is 889.7 c above C4 here; pin: tonic would \
         put C4 at 261.63 Hz.",
        "G#-Eb is the wolf, 35.7 c wide.",
        "  C4     +10.3     0.000   263.181",
    ] {
        assert!(text.contains(line), "{line}\n{text}");
    }
    // Beats: 3 f(low) against 2 f(high), temperaments table at A4 = 440.
    let f3 = text
        .lines()
        .find(|line| line.starts_with("  F3 "))
        .expect("a line for F3");
    assert!(f3.contains("F3-C4     1.64  narrow 1/4 syntonic"), "{f3}");
    assert!(f3.contains("F3-A3     0.00  pure"), "{f3}");
    let wolf = text
        .lines()
        .find(|line| line.starts_with("  G#3 "))
        .expect("a line for G#3");
    assert!(wolf.contains("G#3-Eb4  12.8"), "{wolf}");
    // Setting goes from F3 to F4, one line a key.
    assert!(text.contains("  F4    "));
}

#[test]
fn a_tuning_of_other_than_twelve_keys_has_a_sheet_of_steps() {
    let text = sheet(&chart("harmonics-8-16", None, None));
    assert!(
        text.contains("Upwards from C4, 8 keys to the period:"),
        "{text}"
    );
    assert!(text.contains("  Eb4      551.318     11/8"), "{text}");
    assert!(!text.contains("beats"));
}
