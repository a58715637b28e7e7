//! Where keys stand: both kinds, every key map, both pins.

use super::*;
use crate::pitch::Pitch;
use crate::tuning::near_key;

fn cents(text: f64) -> i64 {
    (text * 1e6).round() as i64
}

fn at_a440() -> Placement {
    Placement {
        tonic: None,
        turned_to: None,
        reference: Key::A4,
        hertz: Hertz::A440,
        pin: Pin::Key,
    }
}

fn key(name: &str) -> Key {
    Key::parse(name).expect("a key name")
}

fn letter(name: &str) -> Letter {
    Letter::parse(name).expect("a letter")
}

/// Eb to G# (or as many names as asked for), every fifth narrow by a quarter of 81/80.
fn quarter_comma(first: i8, names: i8) -> ByLetter {
    let fifth = Log::of_ratio(3, 2) - Log::of_ratio(81, 80).part(1, 4);
    let chain: Vec<(Letter, Log)> = (first..first + names)
        .map(|place| Letter::on_line(place).expect("on the line"))
        .map(|name| (name, near_key(name, fifth.times(name.place() as i64))))
        .collect();
    let mut scale = ByLetter {
        places: [None; 12],
        names: std::array::from_fn(|key| Letter::usual(key as u8)),
        home: 0,
        chain,
    };
    for (name, place) in &scale.chain {
        scale.places[name.pitch_class() as usize].get_or_insert(*place);
        scale.names[name.pitch_class() as usize] = *name;
    }
    scale
}

fn above(tuning: &Tuning, low: &str, high: &str) -> i64 {
    let sounds = |name| tuning.pitch(key(name)).expect("sounds");
    (sounds(high) - sounds(low)).microcents()
}

/// Two pitches are each rounded once, so their distance may be off by a microcent.
#[track_caller]
fn assert_near(is: i64, should_be: i64) {
    assert!((is - should_be).abs() <= 1, "{is} instead of {should_be}");
}

fn steps(ratios: &[(u64, u64)], map: KeyMap) -> Scale {
    Scale::FromTonic(FromTonic {
        steps: ratios.iter().map(|(o, u)| Log::of_ratio(*o, *u)).collect(),
        period: Log::OCTAVE,
        map,
        changes: [Log::ZERO; 12],
    })
}

fn equal(count: i64, map: KeyMap) -> Scale {
    Scale::FromTonic(FromTonic {
        steps: (0..count)
            .map(|step| Log::OCTAVE.part(step, count))
            .collect(),
        period: Log::OCTAVE,
        map,
        changes: [Log::ZERO; 12],
    })
}

/// By letter: which step each named key has.
fn letters(home: u8, named: &[(&str, u32)]) -> KeyMap {
    let mut steps = [None; 12];
    for (name, step) in named {
        steps[letter(name).pitch_class() as usize] = Some(*step);
    }
    KeyMap::Letters { home, steps }
}

#[test]
fn the_reference_key_sounds_exactly_the_reference() {
    let scale = Scale::ByLetter(quarter_comma(-3, 12));
    let mut placement = at_a440();
    placement.hertz = Hertz::from_micro(415_000_000).expect("not zero");
    let tuning = scale.tune(&placement).expect("tunes");
    assert_eq!(tuning.pitch(Key::A4), Some(placement.hertz.pitch()));
    // Pure thirds, F where quarter-comma meantone has it, octaves exact at both ends of the keyboard.
    assert_near(above(&tuning, "C4", "E4"), cents(386.313714));
    assert_near(above(&tuning, "C4", "F4"), cents(503.421572));
    assert_near(above(&tuning, "C-1", "C9"), cents(12000.0));
    assert!(Key::all().all(|key| tuning.pitch(key).is_some()));
}

#[test]
fn pinned_at_the_tonic_home_stands_where_equal_puts_it() {
    let scale = Scale::ByLetter(quarter_comma(-3, 12));
    let mut placement = at_a440();
    placement.pin = Pin::Tonic;
    let tuning = scale.tune(&placement).expect("tunes");
    assert_eq!(tuning.pitch(Key::C4), Some(Pitch::of_key(60)));
    placement.turned_to = Some(letter("D"));
    let turned = scale.tune(&placement).expect("tunes");
    assert_eq!(turned.pitch(key("D4")), Some(Pitch::of_key(62)));
}

#[test]
fn turning_puts_what_stood_on_home_on_another_key() {
    let scale = quarter_comma(-3, 12);
    let plain = Scale::ByLetter(scale.clone())
        .tune(&at_a440())
        .expect("tunes");
    for (to, low, high) in [("D", "G#3", "C#4"), ("Eb", "G3", "C4"), ("B", "A3", "D4")] {
        let mut placement = at_a440();
        placement.turned_to = Some(letter(to));
        let turned = Scale::ByLetter(scale.clone())
            .tune(&placement)
            .expect("tunes");
        let by = letter(to).pitch_class() as i32;
        let moved = |name: &str| key(name).moved(by).expect("on the keyboard").to_string();
        for (from, up) in [("C3", "E3"), ("G#3", "Eb4"), ("B2", "F4"), (low, high)] {
            let there = above(&turned, &moved(from), &moved(up));
            assert_near(above(&plain, from, up), there);
        }
    }
    // Names go along: F to A# when Eb to G# is turned from C to D; twice round comes home.
    let turned = scale.turned(letter("D"));
    assert_eq!(turned.names[3], letter("D#"));
    assert_eq!(turned.chain[0].0, letter("F"));
    assert_eq!(turned.place_of_name(letter("C")), Some(Log::ZERO));
    assert_eq!(turned.turned(letter("C")).names, scale.names);
    assert_eq!(turned.turned(letter("C")).places, scale.places);
}

#[test]
fn a_key_takes_the_pitch_of_its_other_name() {
    // 41.059 cents between G# and Ab in quarter-comma meantone: 128/125 (temperaments table, computed and certain).
    let scale = quarter_comma(-3, 12);
    let diesis = cents(41.058858);
    for (name, by) in [("Ab", diesis), ("D#", -diesis), ("G#", 0), ("Db", diesis)] {
        let key = letter(name).pitch_class() as usize;
        let was = scale.places[key].expect("sounds");
        let renamed = scale.renamed(letter(name));
        let is = renamed.places[key].expect("sounds");
        assert_eq!((is - was).interval().microcents(), by, "{name}");
        assert_eq!(renamed.names[key], letter(name));
    }
    // Irregular: one key, one pitch, whatever it is called.
    let mut bent = scale.clone();
    bent.chain[2].1 = bent.chain[2].1 + Log::of_microcents(5);
    assert_eq!(bent.renamed(letter("Ab")).places, bent.places);
}

#[test]
fn one_key_a_step_runs_up_and_down_from_the_tonic() {
    let tuning = equal(19, KeyMap::EachKey).tune(&at_a440()).expect("tunes");
    assert_eq!(tuning.pitch(Key::A4), Some(Pitch::of_key(69)));
    assert_near(above(&tuning, "C4", "G5"), cents(1200.0));
    assert_near(above(&tuning, "C3", "C4"), cents(757.894737));

    let triad = steps(&[(1, 1), (5, 4), (3, 2)], KeyMap::EachKey);
    let mut placement = at_a440();
    placement.tonic = Some(key("D4"));
    placement.pin = Pin::Tonic;
    let tuning = triad.tune(&placement).expect("tunes");
    assert_eq!(tuning.pitch(key("D4")), Some(Pitch::of_key(62)));
    assert_near(above(&tuning, "D4", "Eb4"), cents(386.313714));
    assert_near(above(&tuning, "C#4", "D4"), cents(498.044999));
    assert_near(above(&tuning, "B3", "D4"), cents(1200.0));
}

#[test]
fn keys_by_letter_repeat_every_twelve_and_shift_whole_with_the_tonic() {
    let white = [
        ("C", 0),
        ("D", 1),
        ("E", 2),
        ("F", 3),
        ("G", 4),
        ("A", 5),
        ("Bb", 6),
        ("B", 7),
    ];
    let harmonics: Vec<(u64, u64)> = (8..16).map(|n| (n, 8)).collect();
    let scale = steps(&harmonics, letters(0, &white));
    let tuning = scale.tune(&at_a440()).expect("tunes");
    assert_near(above(&tuning, "C4", "F4"), cents(551.317942));
    assert_near(above(&tuning, "C3", "C5"), cents(2400.0));
    assert_near(above(&tuning, "B3", "C4"), cents(111.731285));
    assert_eq!(tuning.pitch(key("C#4")), None);

    let mut placement = at_a440();
    placement.tonic = Some(key("D4"));
    let shifted = scale.tune(&placement).expect("tunes");
    assert_near(above(&shifted, "D4", "G4"), cents(551.317942));
    assert_eq!(shifted.pitch(key("Eb4")), None);
    // C and C# carry what Bb and B had.
    assert_near(above(&shifted, "D4", "C5"), cents(968.825906));
    placement.reference = key("Eb4");
    assert_eq!(
        scale.tune(&placement),
        Err(TuneError::SilentReference(key("Eb4")))
    );
}

#[test]
fn keys_by_letter_may_start_elsewhere_and_count_past_the_period() {
    let scale = steps(
        &[(1, 1), (5, 4), (3, 2)],
        letters(2, &[("D", 0), ("E", 1), ("C", 4)]),
    );
    let tuning = scale
        .tune(&Placement {
            reference: key("D4"),
            ..at_a440()
        })
        .expect("tunes");
    assert_eq!(tuning.pitch(key("D4")), Some(Hertz::A440.pitch()));
    assert_near(above(&tuning, "D4", "E4"), cents(386.313714));
    assert_near(above(&tuning, "D4", "C5"), cents(1586.313714));
    assert_near(above(&tuning, "C4", "D4"), cents(1200.0 - 1586.313714));
}

#[test]
fn keys_by_name_repeat_every_so_many() {
    let map = KeyMap::Keys {
        start: Key::C4,
        steps: vec![Some(0), None, Some(2), Some(1), None],
    };
    let scale = steps(&[(1, 1), (5, 4), (3, 2)], map);
    let tuning = scale
        .tune(&Placement {
            reference: Key::C4,
            ..at_a440()
        })
        .expect("tunes");
    assert_near(above(&tuning, "C4", "D4"), cents(701.955001));
    assert_near(above(&tuning, "C4", "Eb4"), cents(386.313714));
    assert_near(above(&tuning, "C4", "F4"), cents(1200.0));
    assert_near(above(&tuning, "G3", "C4"), cents(1200.0));
    assert_eq!(tuning.pitch(key("E4")), None);
    assert_eq!(scale.tonic_wanted(), TonicWanted::Key);
}

#[test]
fn a_stretched_period_and_changes_are_kept() {
    let mut changes = [Log::ZERO; 12];
    changes[10] = Log::of_microcents(3_000_000);
    let scale = Scale::FromTonic(FromTonic {
        steps: (0..12)
            .map(|step| Log::of_ratio(3, 1).part(step, 12))
            .collect(),
        period: Log::of_ratio(3, 1),
        map: KeyMap::EachKey,
        changes,
    });
    let tuning = scale.tune(&at_a440()).expect("tunes");
    assert_near(above(&tuning, "C4", "C5"), cents(1901.955001));
    assert_near(above(&tuning, "A4", "Bb4"), cents(1901.955001 / 12.0 + 3.0));
    assert_eq!(scale.tonic_wanted(), TonicWanted::Letter);
}

#[test]
fn silent_pins_and_silent_keyboards_are_errors() {
    let mut scale = quarter_comma(-3, 12);
    scale.places[9] = None;
    scale.places[0] = None;
    let put = |placement: &Placement| Scale::ByLetter(scale.clone()).tune(placement);
    assert_eq!(put(&at_a440()), Err(TuneError::SilentReference(Key::A4)));
    let pinned = Placement {
        pin: Pin::Tonic,
        ..at_a440()
    };
    assert_eq!(put(&pinned), Err(TuneError::SilentReference(Key::C4)));
    scale.places = [None; 12];
    let silent = Scale::ByLetter(scale).tune(&at_a440());
    assert_eq!(silent, Err(TuneError::NothingSounds));
}
