//! Pitch expressions: what they come to, and what is said about bad ones.

use super::*;

fn microcents(text: &str) -> i64 {
    match Expression::distance(text) {
        Ok(log) => log.interval().microcents(),
        Err(mistake) => panic!("{text}: {mistake:?}"),
    }
}

// Sizes of ratios and commas: the formula of the cent (Ellis 1885), to the microcent.
#[test]
fn every_form_comes_to_its_size() {
    for (text, size) in [
        ("3/2", 701_955_001),
        ("701.955 c", 701_955_000),
        ("701.955c", 701_955_000),
        ("-6 c", -6_000_000),
        ("+.5 c", 500_000),
        ("2^(7/12)", 700_000_000),
        ("5^(1/4)", 696_578_428),
        ("(3/2)^(-1/2)", -350_977_500),
        ("3^12 - 2^19", 23_460_010),
        ("narrow 1/4 syntonic", -5_376_572),
        ("-1/4 syntonic", -5_376_572),
        ("\u{2212}1/4 syntonic", -5_376_572),
        ("wide 1/12 pythagorean", 1_955_001),
        ("+1/6 schisma", 325_620),
        ("narrow 1 syntonic", -21_506_290),
        ("3/2 narrow 1/4 syntonic", 696_578_428),
        ("3/2 - 1/4 syntonic + 2 c", 698_578_428),
        ("1/1", 0),
        ("0 c", 0),
        ("1048576/531441", 1_176_539_990),
    ] {
        assert!(
            (microcents(text) - size).abs() <= 1,
            "{text}: {} instead of {size}",
            microcents(text)
        );
    }
    // Sums are rounded once, at the end: four quarter-comma fifths less two octaves are 5/4 exactly.
    let fifth = Expression::distance("3/2 - 1/4 syntonic").expect("reads");
    let third = fifth.times(4) - Log::OCTAVE.times(2);
    assert_eq!(third.interval().microcents(), microcents("5/4"));
}

#[test]
fn frequencies_are_absolute() {
    let hz = |micro| Hertz::from_micro(micro).expect("not zero");
    assert_eq!(
        Expression::parse("261.63 Hz"),
        Ok(Expression::Absolute(hz(261_630_000), Log::ZERO))
    );
    assert_eq!(
        Expression::parse("440 Hz - 1200 c"),
        Ok(Expression::Absolute(hz(440_000_000), -Log::OCTAVE))
    );
    assert_eq!(hertz("415 Hz"), Ok(hz(415_000_000)));
    assert_eq!(hertz("415.3 Hz"), Ok(hz(415_300_000)));
    assert_eq!(hertz("442"), Ok(hz(442_000_000)));
    assert_eq!(hertz("261.6255653006 Hz"), Ok(hz(261_625_565)));
}

#[test]
fn references_name_a_key_or_mean_a4() {
    let hz = |micro| Hertz::from_micro(micro).expect("not zero");
    let c4 = Key::C4;
    assert_eq!(reference("A4 = 415 Hz"), Ok((Key::A4, hz(415_000_000))));
    assert_eq!(reference("C4=256"), Ok((c4, hz(256_000_000))));
    assert_eq!(reference("442 Hz"), Ok((Key::A4, hz(442_000_000))));
    for text in ["A = 440 Hz", "a4 = 440 Hz", "A4 = 440 c", "A4 =", ""] {
        assert!(reference(text).is_err(), "{text}");
    }
}

/// Expression, what is wrong, what would be right.
const BAD: &[(&str, &str, &str)] = &[
    ("3/2 c", "is a ratio with a unit", "leave out `c`"),
    ("", "no pitch is written here", "a pitch is written 3/2"),
    (
        "701,955 c",
        "`701,955` has a comma in it",
        "decimals take a point: `701.955`",
    ),
    (
        "145",
        "`145` has no unit",
        "cents are written `145 c`, a ratio `145/1`",
    ),
    (
        "1.5",
        "`1.5` has no unit",
        "cents are written `1.5 c`, a ratio such as 3/2",
    ),
    ("3/0", "`3/0` has a zero in it", "whole numbers from 1"),
    ("0/2", "`0/2` has a zero in it", "whole numbers from 1"),
    (
        "1.5/1",
        "`1.5/1` is not of whole numbers",
        "a ratio such as 3/2",
    ),
    (
        "narrow 1/4 sintonic",
        "`sintonic` is neither",
        "did you mean `syntonic`?",
    ),
    (
        "narrow 1/4 Pythagorean",
        "`Pythagorean` is neither",
        "did you mean `pythagorean`?",
    ),
    (
        "1/4 narrow",
        "the wrong way round",
        "write `narrow 1/4 syntonic`",
    ),
    (
        "narow 1/4 syntonic",
        "`narow` is not known",
        "did you mean `narrow`?",
    ),
    (
        "narrow syntonic",
        "has no part before it",
        "`narrow 1/4 syntonic`",
    ),
    ("narrow 1/0 syntonic", "divided by zero", "1/4"),
    ("701 cents", "`cents` is not how", "write `701 c`"),
    ("2^7/12", "no brackets", "2^(7/12)"),
    ("2^", "breaks off", "2^(7/12)"),
    ("2^(7/0)", "zero below", "2^(7/12)"),
    ("0^(1/2)", "has a zero in it", "whole numbers"),
    ("3/2 5/4", "`5` follows without + or -", "join terms"),
    ("3/2 +", "breaks off after a sign", "a pitch is written"),
    (
        "3:2",
        "`:` has no place in a pitch",
        "a pitch is written 3/2",
    ),
    ("440 Hz + 440 Hz", "two frequencies", "keep one"),
    ("1/1 - 440 Hz", "taken away", "frequency first"),
    ("0 Hz", "cannot be a frequency", "above 0"),
    ("30000 c", "further than 20 octaves", "check the numbers"),
    ("2^9999", "further than 20 octaves", "check the numbers"),
    (
        "12345678901234567/2",
        "more than 15 digits",
        "a power such as 3^53",
    ),
    ("1.2.3 c", "is not a number", "a pitch is written"),
];

#[test]
fn bad_expressions_say_what_would_be_right() {
    for (text, wrong, right) in BAD {
        let mistake = Expression::parse(text).expect_err(text);
        assert!(mistake.wrong.contains(wrong), "{text}: {}", mistake.wrong);
        assert!(mistake.right.contains(right), "{text}: {}", mistake.right);
    }
    assert!(Expression::distance("261.63 Hz").is_err());
    for text in ["415 c", "Hz", "415,3 Hz", "-415 Hz", "0", "200000 Hz"] {
        assert!(hertz(text).is_err(), "{text}");
    }
}

#[test]
fn distances_from_pure_print_as_they_are_typed() {
    for text in [
        "narrow 1/4 syntonic",
        "wide 1/12 pythagorean",
        "narrow 2/7 syntonic",
        "narrow 3/16 syntonic",
        "wide 1 schisma",
    ] {
        let distance = Expression::distance(text).expect(text).interval();
        assert_eq!(narrow_or_wide(distance), text);
    }
    assert_eq!(narrow_or_wide(Interval::ZERO), "pure");
    assert_eq!(
        narrow_or_wide(Interval::from_microcents(35_682_000)),
        "wide 35.7 c"
    );
}

proptest::proptest! {
    /// Whatever is typed, there is an answer: no overflow, no division by zero.
    #[test]
    fn nothing_typed_can_break_it(text in "[0-9 ./^()+,-]{0,24}|([0-9]{1,16}[./^( )+-]{0,2}|narrow |wide | syntonic| schisma| c| Hz){0,8}") {
        if let Ok(Expression::Distance(log)) = Expression::parse(&text) {
            proptest::prop_assert!(log.interval().abs() <= Interval::OCTAVE * OCTAVES_MAX);
        }
        let _ = hertz(&text);
    }
}
