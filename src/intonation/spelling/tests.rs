//! Chords and single keys, and what they are called.

use super::*;

const BLACK: [(usize, &str, &str); 5] = [
    (1, "C#", "Db"),
    (3, "Eb", "D#"),
    (6, "F#", "Gb"),
    (8, "G#", "Ab"),
    (10, "Bb", "A#"),
];

fn letter(name: &str) -> Letter {
    Letter::parse(name).expect("a name")
}

fn at_first() -> [Called; 12] {
    std::array::from_fn(|class| {
        let black = BLACK.iter().find(|(black, ..)| *black == class);
        let choice = black.map(|(_, first, second)| (letter(first), letter(second)));
        Called {
            now: choice.map_or(Letter::usual(class as u8), |(first, _)| first),
            choice,
        }
    })
}

/// Chords half a second apart, each as keys from C = 0; what the keys of the last one are called.
fn called(chords: &[&[usize]]) -> Vec<String> {
    let (mut spelling, mut called) = (Spelling::new(), at_first());
    for (place, chord) in chords.iter().enumerate() {
        let mut strokes = Strokes::default();
        for key in *chord {
            strokes.struck[key % 12] += 1;
        }
        spelling.name(Time::from_millis(500 * place as u64), &strokes, &mut called);
    }
    let last = chords.last().expect("a chord");
    last.iter()
        .map(|key| called[key % 12].now.to_string())
        .collect()
}

#[test]
fn a_chord_alone_is_called_as_it_is_written() {
    assert_eq!(called(&[&[4, 8, 11]]), ["E", "G#", "B"]);
    assert_eq!(called(&[&[5, 8, 0]]), ["F", "Ab", "C"]);
    assert_eq!(called(&[&[11, 3, 6]]), ["B", "D#", "F#"]);
    assert_eq!(called(&[&[0, 3, 7]]), ["C", "Eb", "G"]);
    assert_eq!(called(&[&[10, 1, 5]]), ["Bb", "Db", "F"]);
    assert_eq!(called(&[&[6, 10, 1]]), ["F#", "A#", "C#"]);
}

#[test]
fn a_key_alone_is_its_first_name() {
    for (key, first, _) in BLACK {
        assert_eq!(called(&[&[key]]), [first]);
    }
}

#[test]
fn what_sounded_before_decides_where_the_chord_does_not() {
    let diminished = [2, 5, 8, 11];
    let a_minor: [&[usize]; 3] = [&[9, 0, 4], &[4, 8, 11], &[9, 0, 4]];
    let c_minor: [&[usize]; 3] = [&[0, 3, 7], &[5, 8, 0], &[0, 3, 7]];
    let after = |before: [&[usize]; 3]| {
        let mut chords = before.to_vec();
        chords.push(&diminished);
        called(&chords).swap_remove(2)
    };
    assert_eq!(after(a_minor), "G#");
    assert_eq!(after(c_minor), "Ab");
}

#[test]
fn a_remote_key_called_wrong_at_first_is_put_right() {
    // Gb major by single keys: the first three are called F#, Bb and C#.
    let scale: [&[usize]; 8] = [
        &[6],
        &[10],
        &[1],
        &[5, 8, 0],
        &[5, 8, 1],
        &[5, 10, 1],
        &[10, 1, 5],
        &[6, 10, 1],
    ];
    assert_eq!(called(&scale), ["Gb", "Bb", "Db"]);
}

#[test]
fn all_is_forgotten_after_a_while() {
    let (mut spelling, mut called) = (Spelling::new(), at_first());
    let mut strokes = Strokes::default();
    for key in [5, 8, 0] {
        strokes.struck[key] = 1;
    }
    spelling.name(Time::from_millis(0), &strokes, &mut called);
    assert_eq!(called[8].now, letter("Ab"));
    let mut alone = Strokes::default();
    alone.struck[8] = 1;
    let mut later = (spelling.clone(), called);
    later.0.name(Time::from_millis(5_000), &alone, &mut later.1);
    assert_eq!(later.1[8].now, letter("Ab"));
    spelling.name(Time::from_millis(30_000), &alone, &mut called);
    assert_eq!(called[8].now, letter("G#"));
}
