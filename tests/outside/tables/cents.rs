//! Cents and hertz of every shipped tuning.

use super::*;
use trued::stage::shipped::SHIPPED;

const WORST_CENTS: f64 = 0.001;

/// The worst error of the keys from `from` upwards against cents above that key.
fn worst(chart: &Chart, from: u8, expected: &[f64]) -> f64 {
    let zero = cents(chart, from);
    (from..)
        .zip(expected)
        .map(|(key, expected)| (cents(chart, key) - zero - expected).abs())
        .fold(0.0, f64::max)
}

fn report(name: &str, worst: f64, source: &str) {
    println!("{name:28} worst {worst:.6} c  ({source})");
    assert!(worst <= WORST_CENTS, "{name}: {worst} c");
}

#[test]
fn every_shipped_tuning_is_where_its_source_puts_it() {
    let figures = figures();
    let scales = &figures["scales"];
    let mut checked = Vec::new();
    for (name, figure) in NAMES {
        let scale = &scales[figure];
        let mut expected = numbers(&scale["cents"]);
        if figure == "rast_arab_53" {
            expected = on_white_keys(&expected);
        } else {
            expected.push(scale["period"].as_f64().expect("a period"));
        }
        report(
            name,
            worst(&chart(name), 60, &expected),
            scale["source"].as_str().expect("a source"),
        );
        checked.push(name);
    }
    for (name, expected, source) in built_scales(scales) {
        report(name, worst(&chart(name), 60, &expected), source);
        checked.push(name);
    }
    for (name, _) in SHIPPED {
        assert!(checked.contains(name), "{name} is shipped and not checked");
    }
}

/// Seven steps on the white keys from C, the black ones at equal temperament.
fn on_white_keys(steps: &[f64]) -> Vec<f64> {
    let mut cents: Vec<f64> = (0..=12).map(|key| key as f64 * 100.0).collect();
    for (key, step) in [0, 2, 4, 5, 7, 9, 11].into_iter().zip(steps) {
        cents[key] = *step;
    }
    cents
}

/// Scales put together from published pieces.
fn built_scales(scales: &Value) -> Vec<(&'static str, Vec<f64>, &'static str)> {
    let of = |scale: &str, ratio: &str| {
        let ratios = scales[scale]["ratios"].as_array().expect("ratios");
        let place = ratios.iter().position(|known| known == ratio);
        numbers(&scales[scale]["cents"])[place.unwrap_or_else(|| panic!("{ratio} in {scale}"))]
    };
    let (diamond, duodene) = ("partch_7_limit_diamond", "duodene");
    let sevens = [
        (duodene, "1"),
        (duodene, "16/15"),
        (duodene, "9/8"),
        (diamond, "7/6"),
        (diamond, "5/4"),
        (diamond, "4/3"),
        (diamond, "7/5"),
        (diamond, "3/2"),
        (diamond, "8/5"),
        (diamond, "5/3"),
        (diamond, "7/4"),
        (duodene, "15/8"),
    ];
    let sevens = sevens
        .iter()
        .map(|(scale, ratio)| of(scale, ratio))
        .chain([1200.0])
        .collect();
    // Two alike tetrachords, on C and a pure fifth above it.
    let twice = |scale: &str| {
        let lower = numbers(&scales[scale]["cents"]);
        let fifth = of(duodene, "3/2");
        let upper = lower[..3].iter().map(|step| step + fifth);
        on_white_keys(&lower.iter().copied().chain(upper).collect::<Vec<f64>>())
    };
    let commas = |steps: [f64; 7]| on_white_keys(&steps.map(|step| step * 1200.0 / 53.0));
    vec![
        (
            "seven-limit-scale",
            sevens,
            "tonality diamond, Partch; 16/15, 9/8 and 15/8 from the duodene, Ellis 1874-5",
        ),
        (
            "rast-al-farabi",
            twice("farabi_diatonic"),
            "al-Farabi's neutral tetrachord, from a modern summary",
        ),
        (
            "rast-ibn-sina",
            twice("ibnsina_diatonic"),
            "tetrachord credited to Ibn Sina, from a modern summary",
        ),
        (
            "rast-53-turkish",
            commas([0.0, 9.0, 17.0, 22.0, 31.0, 40.0, 48.0]),
            "makam tables in 53-commas, by formula",
        ),
        (
            "equal-17",
            (0..=17).map(|step| step as f64 * 1200.0 / 17.0).collect(),
            "by definition",
        ),
    ]
}

#[test]
fn printed_tables_agree_to_their_own_digits() {
    for table in figures()["printed"].as_array().expect("a list") {
        let name = shipped_name(table["scale"].as_str().expect("a scale"));
        let (figures, tolerance) = (
            numbers(&table["figures"]),
            table["tolerance"].as_f64().expect("a number"),
        );
        let chart = chart(name);
        let error = match table["what"].as_str().expect("a word") {
            "cents" => worst(&chart, 60, &figures),
            "hz_48" => (48..)
                .zip(&figures)
                .map(|(key, printed)| (hertz(&chart, key) - printed).abs())
                .fold(0.0, f64::max),
            "offsets" => {
                let keys = table["order"].as_str().expect("names").split(' ');
                keys.zip(&figures)
                    .map(|(name, printed)| {
                        let key = Key::parse(&format!("{name}4")).expect("a key");
                        (chart.key(key).expect("sounds").offset - printed).abs()
                    })
                    .fold(0.0, f64::max)
            }
            other => panic!("{other}"),
        };
        println!(
            "{name:28} {error:.4} within {tolerance}  ({})",
            table["source"]
        );
        assert!(error <= tolerance, "{name}: {error}");
    }
}

// Common practice, no source.
#[test]
fn equal_temperament_has_the_frequencies_everybody_knows() {
    let chart = chart("equal-12");
    assert_eq!(hertz(&chart, 69), 440.0);
    for (key, about) in [(70, 466.0), (71, 494.0), (72, 523.0)] {
        assert!((hertz(&chart, key) - about).abs() < 0.5);
    }
}

// Common practice: the degrees of the just scale on C, and its two equal semitones.
#[test]
fn the_five_limit_scale_has_its_degrees() {
    let chart = chart("five-limit-scale");
    let ratio = |low: u8, high: u8| hertz(&chart, high) / hertz(&chart, low);
    let degrees = [
        (62, 9.0 / 8.0),
        (64, 5.0 / 4.0),
        (65, 4.0 / 3.0),
        (67, 3.0 / 2.0),
        (69, 5.0 / 3.0),
        (71, 15.0 / 8.0),
    ];
    for (key, degree) in degrees {
        assert!((ratio(60, key) / degree - 1.0).abs() < 1e-8, "{key}");
    }
    for (low, high) in [(64, 65), (71, 72)] {
        assert!((ratio(low, high) / (16.0 / 15.0) - 1.0).abs() < 1e-8);
    }
}

/// A quarter-comma evening with a piece in `key`.
fn quarter_comma_in(key: &str) -> String {
    format!("stage: t\nset: [{{song: a, tuning: quarter-comma-meantone, in: {key}}}]\n")
}

#[test]
fn a_tuning_by_letter_never_moves_because_of_the_key_a_piece_is_in() {
    let phrygian = song_chart(&quarter_comma_in("E phrygian"));
    let f = cents(&phrygian, 65) - cents(&phrygian, 60);
    println!("quarter-comma-meantone in E phrygian: F {f:.6} c above C");
    assert!((f - 503.422).abs() < 0.001, "{f}");
    for key in ["C", "D minor", "Ab", "F#", "[G, E minor]", "B lydian"] {
        assert_eq!(
            song_chart(&quarter_comma_in(key)).tuning,
            phrygian.tuning,
            "{key}"
        );
    }
}

/// Tunings that the vectors know and trued does not ship; written here as a player would.
const OWN: &str = "
tunings:
  bach_lehman:
    fifths:
      chain: [Eb, Bb, F, C, G, D, A, E, B, F#, C#, G#]
      alter:
        F-C: narrow 1/6 pythagorean
        C-G: narrow 1/6 pythagorean
        G-D: narrow 1/6 pythagorean
        D-A: narrow 1/6 pythagorean
        A-E: narrow 1/6 pythagorean
        C#-G#: narrow 1/12 pythagorean
        Eb-Bb: narrow 1/12 pythagorean
        Bb-F: wide 1/12 pythagorean
  ptolemy_intense: {pitches: [1/1, 9/8, 5/4, 4/3, 3/2, 5/3, 15/8]}
  bohlen_pierce_just: {pitches: [1/1, 27/25, 25/21, 9/7, 7/5, 75/49, 5/3, 9/5, 49/25, 15/7, 7/3, 63/25, 25/9], period: 3/1}
  carlos_alpha: {pitches: [1/1], period: 77.96499 c}
  carlos_beta: {pitches: [1/1], period: 63.832933 c}
  carlos_gamma: {pitches: [1/1], period: 35.098542 c}
  aeu_24:
    pitches: [1/1, 256/243, 2187/2048, 65536/59049, 9/8, 32/27, 19683/16384, 8192/6561, 81/64, 4/3, 177147/131072, 1024/729,
      729/512, 262144/177147, 3/2, 128/81, 6561/4096, 32768/19683, 27/16, 16/9, 59049/32768, 4096/2187, 243/128, 1048576/531441]
  slendro_mean_java: {pitches: [1/1, 231 c, 474 c, 717 c, 955 c], period: 1208 c}
  pelog_mean_java: {pitches: [1/1, 120 c, 258 c, 539 c, 675 c, 785 c, 943 c], period: 1206 c}
";

fn vector_chart(scale: &str, placing: &str) -> Chart {
    let name = match NAMES.iter().find(|(_, figure)| *figure == scale) {
        Some((name, _)) => name,
        None => scale,
    };
    song_chart(&format!(
        "stage: t\n{OWN}\nset: [{{song: a, tuning: {name}, {placing}}}]\n"
    ))
}

#[test]
fn vectors_of_twelve_keys_in_two_pitches_and_turned() {
    use trued::pitch::Pitch;
    use trued::pitch::word::{Bend, BendRange};
    let figures = figures();
    let (mut worst, mut bends) = (0f64, 0);
    for vector in figures["vectors_12"].as_array().expect("a list") {
        let number = |field: usize| vector[field].as_f64().expect("a number");
        let scale = vector[0].as_str().expect("a scale");
        let turned = if number(1) == 2.0 {
            "turned_to: D, "
        } else {
            ""
        };
        let chart = vector_chart(scale, &format!("{turned}pitch: A4 = {} Hz", number(2)));
        let key = number(3) as u8;
        worst = worst.max((cents(&chart, key) - 100.0 * key as f64 - number(5)).abs());
        assert!((hertz(&chart, key) - number(4)).abs() < 1e-6, "{vector}");
        let pitch = chart
            .tuning
            .pitch(Key::new(key).expect("a key"))
            .expect("sounds");
        for (semitones, field) in [(2, 6), (48, 7)] {
            let range = BendRange::new(semitones).expect("a range");
            let (bend, _) = Bend::encode(pitch - Pitch::of_key(key), range);
            // Halves may be rounded either way.
            assert!(
                (bend.value() as f64 - number(field)).abs() <= 1.0,
                "{vector}"
            );
            bends += 1;
        }
    }
    println!("vectors of twelve keys: worst {worst:.6} c, {bends} bend words");
    assert!(worst < 1e-5, "{worst}");
}

#[test]
fn vectors_of_scales_one_key_a_step() {
    let figures = figures();
    let mut worst = 0f64;
    for vector in figures["vectors_linear"].as_array().expect("a list") {
        let number = |field: usize| vector[field].as_f64().expect("a number");
        let scale = vector[0].as_str().expect("a scale");
        let chart = vector_chart(scale, "pitch: {key: A4, hz: 440, pin: tonic}");
        let key = number(1) as u8;
        // Steps typed to six decimals, 24 of them.
        worst = worst.max((cents(&chart, key) - 6000.0 - number(2)).abs());
        assert!(
            (hertz(&chart, key) / number(3) - 1.0).abs() < 1e-7,
            "{vector}"
        );
    }
    println!("vectors one key a step: worst {worst:.6} c");
    assert!(worst < 2.5e-5, "{worst}");
}
