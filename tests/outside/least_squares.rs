//! Chords placed by least squares, against numpy's solver and worked examples.

use super::adaptive::python;
use serde_json::{Value, json};
use std::io::Write;
use std::path::Path;
use std::process::{Command, Stdio};
use trued::intonation::least_squares::{Solution, Targets, Tone, Weight, solve};
use trued::limits::TRIALS_MAX;
use trued::pitch::Interval;

/// Chord, its keys, and where five-limit (T5) or seven-limit (T7) targets put them, in cents from equal, with the strain
/// that is left. Worked out by a second hand, in Python with numpy's `linalg.inv`: octaves weigh 2, consonances 1, the
/// rest 0.1, no anchors, a leash of 0.001. Where a chord has no contradiction (strain 0) these are the just ratios about
/// their mean, as anyone can check: C-E-G is 4:5:6, 0.000 386.314 701.955.
const WORKED_OUT: &str = "
C major | 60 64 67 | T5 | +3.910 -9.776 +5.865 | 0.0000
C major | 60 64 67 | T7 | +3.910 -9.776 +5.865 | 0.0000
C minor | 60 63 67 | T5 | -5.865 +9.776 -3.910 | 0.0000
C minor | 60 63 67 | T7 | -5.865 +9.776 -3.910 | 0.0000
C dim | 60 63 66 | T5 | -13.849 -0.000 +13.849 | 38.5434
C dim | 60 63 66 | T7 | +0.616 +16.257 -16.872 | 0.0000
C aug | 60 64 68 | T5 | -0.000 +0.000 +0.000 | 561.9433
C aug | 60 64 68 | T7 | -0.000 +0.000 +0.000 | 561.9433
C7 | 60 64 67 70 | T5 | -0.986 -13.978 +0.489 +14.476 | 40.1693
C7 | 60 64 67 70 | T7 | +10.726 -2.960 +12.681 -20.448 | 0.0000
Cm7 | 60 63 67 70 | T5 | -8.798 +6.843 -6.843 +8.798 | 0.0000
Cm7 | 60 63 67 70 | T7 | -8.798 +6.843 -6.843 +8.798 | 0.0000
Cmaj7 | 60 64 67 71 | T5 | +5.866 -7.821 +7.821 -5.866 | 0.0000
Cmaj7 | 60 64 67 71 | T7 | +5.866 -7.821 +7.821 -5.866 | 0.0000
Cdim7 | 60 63 66 69 | T5 | +0.444 +0.444 -0.444 -0.444 | 995.9768
Cdim7 | 60 63 66 69 | T7 | +5.783 +17.975 -17.975 -5.783 | 56.2237
Cm7b5 | 60 63 66 70 | T5 | -14.476 -0.489 +13.978 +0.986 | 40.1693
Cm7b5 | 60 63 66 70 | T7 | +20.448 -12.681 +2.960 -10.726 | 0.0000
Csus4 | 60 65 67 | T5 | +0.000 -1.955 +1.955 | 0.0000
Csus4 | 60 65 67 | T7 | +0.000 -1.955 +1.955 | 0.0000
C6 | 60 64 67 69 | T5 | +6.843 -6.843 +8.798 -8.798 | 0.0000
C6 | 60 64 67 69 | T7 | +6.843 -6.843 +8.798 -8.798 | 0.0000
C9 | 60 64 67 70 74 | T5 | -1.523 -14.537 +0.000 +14.537 +1.523 | 41.5030
C9 | 60 64 67 70 74 | T7 | -1.678 -14.933 +0.000 +14.933 +1.678 | 17.0756
G7 over F | 53 55 59 62 | T5 | +14.476 -0.986 -13.978 +0.489 | 40.1693
G7 over F | 53 55 59 62 | T7 | -20.448 +10.726 -2.960 +12.681 | 0.0000
Dm7 | 62 65 69 72 | T5 | -8.798 +6.843 -6.843 +8.798 | 0.0000
Dm7 | 62 65 69 72 | T7 | -8.798 +6.843 -6.843 +8.798 | 0.0000
C-D-G | 60 62 67 | T5 | -1.955 +1.955 -0.000 | 0.0000
C-D-G | 60 62 67 | T7 | -1.955 +1.955 -0.000 | 0.0000
";

/// One key of a class, at rest in twelve-equal.
fn tone(class: u8) -> Tone {
    Tone {
        class,
        keys: 1,
        rest: Interval::ZERO,
        anchor: None,
    }
}

fn cents(solution: &Solution, count: usize) -> Vec<f64> {
    let offsets = solution.offsets[..count].iter();
    offsets.map(|offset| offset.cents()).collect()
}

#[test]
fn chords_about_their_mean() {
    let dissonance = Weight::millionths(100_000);
    let mut rows = 0;
    for row in WORKED_OUT.lines().filter(|row| !row.is_empty()) {
        let fields: Vec<&str> = row.split('|').map(str::trim).collect();
        let tones: Vec<Tone> = fields[1]
            .split(' ')
            .map(|key| tone(key.parse().expect("a key")))
            .collect();
        let targets = match fields[2] {
            "T5" => Targets::five_limit(dissonance),
            _ => Targets::with_sevens(dissonance),
        };
        let solution = solve(&tones, &targets, Weight::millionths(1_000));
        let ours = cents(&solution, tones.len());
        for (ours, wanted) in ours.iter().zip(fields[3].split(' ')) {
            let wanted: f64 = wanted.parse().expect("cents");
            assert!((ours - wanted).abs() < 0.0011, "{row}: {ours}");
        }
        let strain = solution.strain_millionths() as f64 / 1e6;
        let wanted: f64 = fields[4].parse().expect("a strain");
        assert!((strain - wanted).abs() < 0.000051, "{row}: {strain}");
        rows += 1;
    }
    assert_eq!(rows, 30);
}

const CASES: usize = 1000;
const NEAR_CENTS: f64 = 0.001;
/// Combinations of sizes whose strains differ by less are equally good, and trued may take another than numpy.
const NO_DIFFERENCE: f64 = 0.002;

/// Every chord stands where numpy puts it: for chords with few combinations of sizes, the best of all of them; for the
/// others, given the sizes chosen, and hardly ever with more strain than the best there is.
#[test]
fn a_thousand_random_chords_against_numpy() {
    let cases = numpy(&CASES.to_string(), String::new());
    assert_eq!(cases.len(), CASES);
    let mut answered = String::new();
    let mut strains = Vec::new();
    let (mut best_known, mut worst_cents) = (0, 0.0_f64);
    for case in &cases {
        let (ours, strain) = place(case);
        let is_best_alone = case["gap"].as_f64().is_some_and(|gap| gap > NO_DIFFERENCE);
        if is_best_alone && tries_all(case) {
            worst_cents = worst_cents.max(furthest(&ours, &case["places"]));
            best_known += 1;
        }
        let mut case = case.clone();
        case["places"] = json!(ours);
        answered += &format!("{case}\n");
        strains.push(strain);
    }
    println!("numpy's own best places: {best_known} chords, at most {worst_cents:.6} cents away");
    assert!(
        best_known > 600 && worst_cents < NEAR_CENTS,
        "{best_known} {worst_cents}"
    );

    let judged = numpy("judge", answered.clone());
    let (mut worst_cents, mut known, mut missed, mut worst_miss) = (0.0_f64, 0, 0, 0.0_f64);
    for (((case, answer), judged), strain) in
        cases.iter().zip(answered.lines()).zip(&judged).zip(strains)
    {
        let answer: Value = serde_json::from_str(answer).expect("our own line");
        let ours = numbers(&answer["places"]);
        worst_cents = worst_cents.max(furthest(&ours, &judged["places"]));
        let numpys = judged["strain"].as_f64().expect("a strain");
        assert!(
            (strain - numpys).abs() < 1e-4 * numpys.max(1.0),
            "{strain} {answer}"
        );
        if let Some(least) = case["strain"].as_f64() {
            let worse = strain - least;
            assert!(
                worse < NO_DIFFERENCE || !tries_all(case),
                "{worse} {answer}"
            );
            known += 1;
            worst_miss = worst_miss.max(worse / least.max(1.0));
            missed += usize::from(worse >= NO_DIFFERENCE);
        }
    }
    println!(
        "all {CASES}, with the sizes chosen: at most {worst_cents:.6} cents away; not the least strain in {missed} of \
         {known} where it is known, by {:.0} % at most",
        100.0 * worst_miss
    );
    assert!(worst_cents < NEAR_CENTS, "{worst_cents}");
    assert!(missed * 50 <= known, "{missed} of {known}");
}

fn tries_all(case: &Value) -> bool {
    case["combinations"].as_u64().expect("a number") <= TRIALS_MAX as u64
}

/// Where the tones stand, in cents, and the strain that is left.
fn place(case: &Value) -> (Vec<f64>, f64) {
    let tones = tones(case);
    let targets = match case["sevens"].as_bool() {
        Some(true) => Targets::with_sevens(weight(&case["dissonance"])),
        _ => Targets::five_limit(weight(&case["dissonance"])),
    };
    let solution = solve(&tones, &targets, weight(&case["leash"]));
    let strain = solution.strain_millionths() as f64 / 1e6;
    (cents(&solution, tones.len()), strain)
}

fn tones(case: &Value) -> Vec<Tone> {
    let read = |tone: &Value| Tone {
        class: tone["key"].as_u64().expect("a key") as u8,
        keys: tone["keys"].as_u64().expect("a number") as u8,
        rest: interval(&tone["rest"]),
        anchor: Some((interval(&tone["anchor"]), weight(&tone["weight"]))),
    };
    case["tones"]
        .as_array()
        .expect("tones")
        .iter()
        .map(read)
        .collect()
}

fn millionths(value: &Value) -> f64 {
    (value.as_f64().expect("a number") * 1e6).round()
}

fn interval(cents: &Value) -> Interval {
    Interval::from_microcents(millionths(cents) as i64)
}

fn weight(value: &Value) -> Weight {
    Weight::millionths(millionths(value) as u64)
}

fn numbers(values: &Value) -> Vec<f64> {
    let values = values.as_array().expect("a list").iter();
    values
        .map(|value| value.as_f64().expect("a number"))
        .collect()
}

fn furthest(ours: &[f64], theirs: &Value) -> f64 {
    let theirs = numbers(theirs);
    assert_eq!(ours.len(), theirs.len());
    let pairs = ours.iter().zip(&theirs);
    pairs
        .map(|(ours, theirs)| (ours - theirs).abs())
        .fold(0.0, f64::max)
}

/// Lines of JSON from the script.
fn numpy(word: &str, input: String) -> Vec<Value> {
    let script =
        Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/outside/least_squares/numpy_cases.py");
    let mut child = Command::new(python())
        .arg(script)
        .arg(word)
        .stdin(Stdio::piped())
        .stdout(Stdio::piped())
        .spawn()
        .expect("Python starts");
    let mut to = child.stdin.take().expect("its input");
    let writer = std::thread::spawn(move || to.write_all(input.as_bytes()));
    let output = child.wait_with_output().expect("it ends");
    writer.join().expect("a writer").expect("all taken");
    assert!(output.status.success(), "see above what it says");
    let text = String::from_utf8(output.stdout).expect("text");
    let line = |line: &str| serde_json::from_str(line).expect("JSON");
    text.lines().map(line).collect()
}
