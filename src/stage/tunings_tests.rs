//! Every form of a tuning, and what is said about bad ones.

use super::*;
use crate::stage::complaint::Complaint;
use crate::tuning::Tuning;

/// Reads the tunings of a text and hands each good one over; all complaints come back.
pub(super) fn read(text: &str) -> (Vec<Rc<TuningText>>, Vec<Complaint>) {
    let mut complaints = Complaints::default();
    let path = Path::new("stage.yaml");
    let file = complaints.add_file(path, text);
    let node: Node = serde_yaml::from_str(text).expect("YAML");
    let own = At::new(&node, Trail::root(file));
    let mut library = Library::new(Some(own), path, &mut complaints);
    library.check_own(&mut complaints);
    let names: Vec<String> = library.own.iter().map(|(name, _)| name.clone()).collect();
    let found = (names.iter())
        .filter_map(|name| library.find(name, &Trail::root(file), &mut complaints))
        .collect();
    (found, complaints.into_sorted())
}

/// The only tuning of a text that has no mistakes.
fn good(text: &str) -> Rc<TuningText> {
    let (mut found, complaints) = read(text);
    assert_eq!(complaints, [], "{text}");
    found.pop().expect("one tuning")
}

fn tuned(text: &str) -> Tuning {
    let tuning = good(text);
    (tuning.scale)
        .tune(&tuning.placement(None, None, None))
        .expect("tunes")
}

#[track_caller]
fn assert_above(tuning: &Tuning, low: &str, expected: &[(&str, f64)]) {
    let pitch = |name: &str| {
        let key = Key::parse(name).expect("a key");
        tuning
            .pitch(key)
            .unwrap_or_else(|| panic!("{name} is silent"))
    };
    for (high, cents) in expected {
        let is = (pitch(high) - pitch(low)).cents();
        assert!(
            (is - cents).abs() < 2e-6,
            "{low}-{high}: {is} instead of {cents}"
        );
    }
}

fn letter(name: &str) -> Letter {
    Letter::parse(name).expect("a letter")
}

fn by_letter(tuning: &TuningText) -> &crate::tuning::ByLetter {
    match &tuning.scale {
        Scale::ByLetter(scale) => scale,
        Scale::FromTonic(_) => panic!("not by letter"),
    }
}

// The examples of the language page.
const SLOW: &str =
    "slow: {fifths: {chain: [Ab, Eb, Bb, F, C, G, D, A, E, B, F#, C#], each: narrow 1/4 syntonic}}";
const BAYATI: &str = "
bayati:
  about: Bayati on D, a teacher's measurements
  tonic: D
  notes: {D: 1/1, E: 145 c, F: 32/27, G: 4/3, A: 3/2, Bb: 792 c, B: 850 c, C: 16/9}
  others: equal
  also: {E: {natural: 9/8, flat: 90 c}, G: {flat: 400 c}, B: {natural: 27/16}}
  turns: {saba: {G: flat}}
";

#[test]
fn a_chain_of_fifths_puts_its_names_on_their_keys() {
    let slow = good(SLOW);
    assert_eq!(by_letter(&slow).names[8], letter("Ab"));
    let places = [
        ("E4", 386.313714),
        ("F4", 503.421572),
        ("Ab4", 813.686286),
        ("C#4", 76.048999),
    ];
    assert_above(&tuned(SLOW), "C4", &places);
    // G# is not in the chain, but the chain is regular and goes on.
    let renamed = by_letter(&slow).renamed(letter("G#"));
    let place = renamed.places[8].expect("sounds").interval();
    assert!((place.cents() - 772.627428).abs() < 2e-6);
}

#[test]
fn a_long_chain_gives_keys_two_names_and_begins_with_the_usual() {
    let long = good(
        "t: {fifths: {chain: [Ab, Eb, Bb, F, C, G, D, A, E, B, F#, C#, G#, D#], each: -1/4 syntonic}}",
    );
    let scale = by_letter(&long);
    assert_eq!(
        (scale.names[8], scale.names[3]),
        (letter("G#"), letter("Eb"))
    );
    let place = |name| {
        scale
            .place_of_name(letter(name))
            .expect("in the chain")
            .interval()
            .cents()
    };
    assert!((place("Ab") - 813.686286).abs() < 2e-6);
    assert!((place("D#") - 269.205856).abs() < 2e-6);
    let long = good(
        "t: {fifths: {chain: [C, G, D, A, E, B, F#, C#, G#, D#, A#, E#, B#], each: narrow 1/4 syntonic}}",
    );
    let place = |name| {
        by_letter(&long)
            .place_of_name(letter(name))
            .expect("in the chain")
            .interval()
            .cents()
    };
    assert!((place("B#") - (1158.941142 - 1200.0)).abs() < 2e-6);
}

#[test]
fn single_fifths_are_altered() {
    let text = "
kitchen-well:
  fifths:
    chain: [Eb, Bb, F, C, G, D, A, E, B, F#, C#, G#]
    alter: {C-G: narrow 1/4 pythagorean, G-D: narrow 1/4 pythagorean, D-A: narrow 1/4 pythagorean, B-F#: narrow 1/4 pythagorean}";
    // Werckmeister III, Dupont 1935 p. 79 in cents.
    let places = [
        ("C#4", 90.224996),
        ("D4", 192.179997),
        ("A4", 888.269995),
        ("Bb4", 996.089998),
    ];
    assert_above(&tuned(text), "C4", &places);
}

#[test]
fn offsets_are_cents_from_equal_with_a_as_reference() {
    let sheet =
        tuned("t: {offsets: {C: +5.9, C#: 0, D: +2, Eb: +3.9, E: -2, F: +7.8, A: 0, B: -3.9 c}}");
    assert_above(
        &sheet,
        "A4",
        &[
            ("C4", -894.1),
            ("F#4", -300.0),
            ("B4", 196.1),
            ("Eb5", 603.9),
        ],
    );
    assert_eq!(sheet.pitch(Key::A4), Some(Hertz::A440.pitch()));
    let moved = tuned("t: {offsets: {A: +2, C: 1}}");
    assert_eq!(moved.pitch(Key::A4), Some(Hertz::A440.pitch()));
    assert_above(&moved, "A4", &[("C4", -901.0), ("D4", -702.0)]);
}

#[test]
fn notes_are_above_their_own_tonic_and_other_places_are_kept() {
    let places = [
        ("E4", 145.0),
        ("F#4", 400.0),
        ("C5", 996.089998),
        ("C4", -203.910002),
        ("B4", 850.0),
    ];
    assert_above(&tuned(BAYATI), "D4", &places);
    let bayati = good(BAYATI);
    assert_eq!(by_letter(&bayati).home, 2);
    assert_eq!(bayati.also.len(), 4);
    assert_eq!(
        bayati.turns,
        [Turn {
            name: "saba".into(),
            keys: vec![(letter("G"), "flat".into())]
        }]
    );
    assert_eq!(
        bayati.about.as_deref(),
        Some("Bayati on D, a teacher's measurements")
    );
    let silent = tuned("t: {notes: {C: 1/1, E: 5/4, A: 5/3}, others: silent}");
    assert_eq!(silent.pitch(Key::parse("D4").expect("a key")), None);
    assert_above(&silent, "C4", &[("E4", 386.313714), ("A4", 884.358713)]);
    // Turned inside the tuning: what stood on C stands on D.
    let turned = tuned("t: {notes: {C: 1/1, E: 5/4}, turned_to: D}");
    assert_above(
        &turned,
        "D4",
        &[("F#4", 386.313714), ("F4", 300.0), ("D5", 1200.0)],
    );
}

#[test]
fn scales_from_the_tonic() {
    let bright = "t: {pitches: [1/1, 16/15, 9/8, 6/5, 5/4, 4/3, 45/32, 3/2, 8/5, 27/16, 9/5, 15/8], period: 2/1}";
    assert_above(
        &tuned(bright),
        "C4",
        &[("A4", 905.865003), ("C5", 1200.0), ("B3", -111.731285)],
    );
    let nineteen = "
nineteen:
  equal: {steps: 19, of: 2/1}
  keys: {C: 0, C#: 1, D: 3, Eb: 5, E: 6, F: 8, F#: 9, G: 11, G#: 12, A: 14, Bb: 16, B: 17}";
    assert_above(
        &tuned(nineteen),
        "C4",
        &[("E4", 378.947368), ("C5", 1200.0), ("B4", 1073.684211)],
    );
    let overtones = "t: {harmonics: {from: 8, to: 16}, keys: {C: 0, D: 1, E: 2, F: 3, G: 4, A: 5, Bb: 6, B: 7}}";
    assert_above(
        &tuned(overtones),
        "C4",
        &[("F4", 551.317942), ("B4", 1088.268715), ("C5", 1200.0)],
    );
    let every = "t: {equal: {steps: 10, of: 2/1}, every: 5, keys: {A4: 0, C5: 4, B4: 2}}";
    assert_above(
        &tuned(every),
        "A4",
        &[("B4", 240.0), ("C5", 480.0), ("D5", 1200.0)],
    );
    let stretched = "t: {pitches: [1/1, 231 c, 474 c, 717 c, 955 c], period: 1208 c}";
    assert_above(
        &tuned(stretched),
        "C4",
        &[("F4", 1208.0), ("C#4", 231.0), ("B3", -253.0)],
    );
}

#[test]
fn a_tuning_is_built_on_another() {
    let hair = tuned("t: {like: vallotti, change: {Bb: +3 c}}");
    assert_above(&hair, "C4", &[("Bb4", 1003.0), ("E4", 392.179997)]);
    let turned = tuned("t: {like: quarter-comma-meantone, turned_to: D}");
    assert_above(&turned, "D4", &[("G4", 503.421572), ("F#4", 386.313714)]);
    let keys = tuned("t: {like: equal-19, keys: {C: 0, G: 11, A: 14}, change: {A: -2 c}}");
    assert_above(
        &keys,
        "C4",
        &[("G4", 694.736842), ("A4", 882.210526), ("C5", 1200.0)],
    );
    let (found, complaints) = read(&format!("own: {{like: bayati}}\n{}", BAYATI.trim_start()));
    assert_eq!((found[0].also.len(), complaints), (4, vec![]));
}

#[test]
fn a_tuning_in_hertz_sounds_as_written_unless_a_reference_is_asked_for() {
    let gongs = "t: {pitches: [268 Hz, 307.5 Hz, 352 Hz], period: 2/1}";
    let sounds = |text: &str, name: &str| {
        tuned(text)
            .pitch(Key::parse(name).expect("a key"))
            .expect("sounds")
            .hertz()
    };
    assert!((sounds(gongs, "C4") - 268.0).abs() < 1e-6);
    assert!((sounds(gongs, "D4") - 352.0).abs() < 1e-6);
    let notes = "t: {tonic: D, notes: {D: 147 Hz, E: 320 Hz, C: 130 Hz}}";
    assert!((sounds(notes, "D3") - 147.0).abs() < 1e-6);
    assert!((sounds(notes, "E4") - 320.0).abs() < 1e-6);
    assert!((sounds(notes, "C4") - 260.0).abs() < 1e-6);
    let asked = good(gongs);
    let reference = (Key::A4, Hertz::A440, Pin::Key);
    let placement = asked.placement(None, None, Some(reference));
    let tuning = asked.scale.tune(&placement).expect("tunes");
    assert_eq!(tuning.pitch(Key::A4), Some(Hertz::A440.pitch()));
}

#[test]
fn every_shipped_tuning_reads_without_complaint_and_says_where_it_comes_from() {
    let mut complaints = Complaints::default();
    let mut library = Library::new(None, Path::new("nowhere/stage.yaml"), &mut complaints);
    for (name, _) in SHIPPED {
        let tuning = library
            .find(name, &Trail::default(), &mut complaints)
            .expect(name);
        assert!(
            tuning.about.is_some() && tuning.source.is_some() && tuning.sure.is_some(),
            "{name}"
        );
        (tuning.scale)
            .tune(&tuning.placement(None, None, None))
            .expect(name);
    }
    assert!(complaints.is_empty());
}

#[test]
fn tunings_beside_the_stage_file_are_found_before_shipped_ones() {
    let folder = std::env::temp_dir().join(format!("trued-tunings-{}", std::process::id()));
    std::fs::create_dir_all(folder.join("tunings")).expect("a folder");
    let write = |name: &str, text: &str| {
        std::fs::write(folder.join("tunings").join(name), text).expect("a file");
    };
    write("vallotti.yaml", "about: Ours\nlike: equal-12\n");
    write("crooked.yaml", "fifths: {chain: [C, D]}\n");
    let mut complaints = Complaints::default();
    let mut library = Library::new(None, &folder.join("stage.yaml"), &mut complaints);
    let found = library
        .find("vallotti", &Trail::default(), &mut complaints)
        .expect("found");
    assert_eq!(found.about.as_deref(), Some("Ours"));
    assert!(complaints.is_empty());
    assert!(
        library
            .find("crooked", &Trail::default(), &mut complaints)
            .is_none()
    );
    assert_eq!(library.files().len(), 2);
    assert!(library.names().contains(&"crooked".to_string()));
    let said = complaints.into_sorted()[0].to_string();
    assert!(
        said.ends_with("crooked.yaml:1:21: D is not a fifth above C; the fifth above C is G"),
        "{said}"
    );
    std::fs::remove_dir_all(folder).expect("ours to remove");
}
