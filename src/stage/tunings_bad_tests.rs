//! Tunings with mistakes in them, and what is said.

use super::tests::read;
use crate::stage::complaint::Complaint;

/// A text, and what stands in one of the complaints.
const BAD: &[(&str, &str)] = &[
    (
        "t: {about: Nothing}",
        "1:4: nothing here says what sounds; write one of fifths, offsets",
    ),
    (
        "t: {like: vallotti, offsets: {}}",
        "1:11: `like` stands beside `offsets`",
    ),
    (
        "t: {like: valotti}",
        "1:11: there is no tuning `valotti`; did you mean `vallotti`?",
    ),
    ("t: {like: t}", "1:11: `t` is built on itself"),
    (
        "t: {fifts: {}}",
        "1:5: `fifts` is not known here; did you mean `fifths`?",
    ),
    (
        "t: {fifths: {each: narrow 1/4 syntonic}}",
        "the chain of fifths is missing",
    ),
    (
        "t: {fifths: {chain: [C, G, D]}}",
        "the chain names 3 keys; name at least twelve",
    ),
    ("t: {fifths: {chain: [C, G, H]}}", "`H` is not a key"),
    (
        "t: {like: vallotti, change: {eb: 3 c}}",
        "`eb` is not a key; did you mean `Eb`?",
    ),
    (
        "t: {like: vallotti, change: {Bb4: 3 c}}",
        "`Bb4` has an octave",
    ),
    (
        "t: {like: vallotti, tonic: D}",
        "to turn it on purpose write `turned_to`",
    ),
    (
        "t: {like: vallotti, keys: {C: 0}}",
        "`keys` does not go with `like`",
    ),
    (
        "t: {like: equal-19, turned_to: D}",
        "`turned_to` is for tunings by letter",
    ),
    (
        "t: {offsets: {C: 5,9}}",
        "`9` stands where a key belongs; decimals take a point",
    ),
    ("t: {offsets: {G#: 784.4}}", "784.4 c is too far from equal"),
    ("t: {offsets: {G#: 1, Ab: 2}}", "Ab is the same key as G#"),
    ("t: {notes: {C: 9/8}}", "C is the tonic"),
    ("t: {notes: {D: -204 c}}", "this puts D below the tonic"),
    (
        "t: {notes: {D: 290 Hz}}",
        "D is in hertz, and the tonic is not; give C in hertz too",
    ),
    (
        "t: {notes: {D: 9/8}, others: mute}",
        "`mute` is not what other keys can be",
    ),
    (
        "t: {notes: {D: 145}}",
        "`145` has no unit; cents are written `145 c`",
    ),
    (
        "t: {pitches: [9/8, 5/4]}",
        "the first pitch is step 0, the tonic itself; begin with 1/1",
    ),
    (
        "t: {pitches: [1/1, 5/4, 2/1]}",
        "1:25: this is the period, where the scale begins again",
    ),
    (
        "t: {pitches: [1/1, 5/4], period: 1/2}",
        "a period has to rise",
    ),
    ("t: {equal: {of: 2/1}}", "`steps` is missing"),
    ("t: {equal: {steps: 0}}", "`0` does not fit here"),
    (
        "t: {equal: {steps: 19}, period: 3/1}",
        "`of` says what is divided",
    ),
    (
        "t: {harmonics: {from: 16, to: 8}}",
        "harmonics from 16 to 8 do not rise",
    ),
    ("t: {harmonics: {from: 8}}", "`to` is missing"),
    ("t: {equal: {steps: 19}, keys: {C: 1}}", "no key has step 0"),
    (
        "t: {equal: {steps: 19}, keys: {C4: 0}}",
        "`C4` has an octave",
    ),
    (
        "t: {equal: {steps: 19}, every: 10}",
        "`every` goes with `keys`",
    ),
    (
        "t: {equal: {steps: 19}, every: 10, keys: {C: 0}}",
        "`C` has no octave",
    ),
    (
        "t: {equal: {steps: 19}, every: 10, keys: {C4: 0, C5: 1}}",
        "C5 is not within 10 keys",
    ),
    (
        "t: {like: vallotti, also: {E: {home: 9/8}}}",
        "`home` is the place the key begins with",
    ),
    (
        "t: {like: vallotti, turns: {s: {G: flat}}}",
        "G has no place called `flat`",
    ),
    ("t: 12", "`12` stands here"),
];

#[test]
fn bad_tunings_say_what_would_be_right() {
    for (text, expected) in BAD {
        let (_, complaints) = read(text);
        let said: Vec<String> = complaints.iter().map(Complaint::to_string).collect();
        assert!(
            said.iter().any(|line| line.contains(expected)),
            "{text}: {said:?}"
        );
    }
}

#[test]
fn fifths_of_the_chain_are_named_as_they_stand() {
    let chain = "chain: [Eb, Bb, F, C, G, D, A, E, B, F#, C#, G#]";
    for (alter, expected) in [
        (
            "G-C: 1 c",
            "G-C is not a fifth of this chain; write it as C-G, upwards",
        ),
        (
            "G#-Eb: 1 c",
            "it closes the circle and takes what the others leave",
        ),
        ("C-E: 1 c", "the chain goes from Eb up to G#"),
        ("CG: 1 c", "`CG` is not a fifth; name its two keys"),
        ("C-G: 700 c", "more than a fifth is ever tempered"),
        ("C-G: narrow 1/4 sintonic", "did you mean `syntonic`?"),
    ] {
        let (_, complaints) = read(&format!("t: {{fifths: {{{chain}, alter: {{{alter}}}}}}}"));
        assert_eq!(complaints.len(), 1, "{alter}: {complaints:?}");
        assert!(
            complaints[0].to_string().contains(expected),
            "{}",
            complaints[0]
        );
    }
}

#[test]
fn all_mistakes_come_at_once() {
    let (found, complaints) = read(
        "
a: {like: nowhere, tonic: H}
b: {notes: {X: 1/1, D: 1}, others: soft}
c: {pitches: [1/1, 3/0, 7], period: 2/0, keys: {C: x}}
d: {like: a}",
    );
    assert!(found.is_empty());
    let lines: Vec<usize> = complaints.iter().map(|complaint| complaint.line).collect();
    assert_eq!(lines, [2, 3, 3, 4, 4, 4, 4], "{complaints:#?}");
}
