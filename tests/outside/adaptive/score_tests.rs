//! The metrics on movements made by hand, whose figures follow from their definition.

use super::played::{Hearing, Sounding};
use super::score::{Scores, Table};

const MS: u64 = 1_000_000;

fn note(key: u8, on_ms: u64, off_ms: u64, path: &[(u64, f64)]) -> Sounding {
    Sounding {
        key,
        on_ns: on_ms * MS,
        let_go_ns: off_ms * MS,
        off_ns: off_ms * MS,
        path: path.iter().map(|(ms, cents)| (ms * MS, *cents)).collect(),
    }
}

fn scored(soundings: Vec<Sounding>) -> Scores {
    let mut scores = Scores::new();
    scores.add(&Hearing {
        soundings,
        ..Hearing::default()
    });
    scores
}

fn near(ours: f64, wanted: f64) {
    assert!((ours - wanted).abs() < 1e-3, "{ours}, not {wanted}");
}

#[test]
fn purity_is_weighted_by_time_through_changes() {
    // A third: equal for a second, just for three.
    let scores = scored(vec![
        note(60, 0, 4000, &[(0, 0.0)]),
        note(64, 0, 4000, &[(0, 0.0), (1000, -13.686)]),
    ]);
    near(scores.purity(Table::V5c).mean, 13.686 / 4.0);
    near(scores.purity(Table::V5c).max, 13.686);
    // A tritone counts only where it has targets: 590.22, 609.78; and 582.51, 617.49 within seven.
    let scores = scored(vec![
        note(60, 0, 1000, &[(0, 0.0)]),
        note(66, 0, 1000, &[(0, -17.488)]),
    ]);
    assert!(scores.purity(Table::V5c).mean.is_nan());
    near(scores.purity(Table::V5a).mean, 590.224 - 582.512);
    near(scores.purity(Table::V7a).mean, 0.0);
}

#[test]
fn a_triad_is_pure_within_three_cents() {
    for (third_off, percent) in [(2.9, 100.0), (3.1, 0.0)] {
        let scores = scored(vec![
            note(65, 0, 1000, &[(0, 0.0)]),
            note(69, 0, 1000, &[(0, -13.686 + third_off)]),
            note(72, 0, 1000, &[(0, 1.955)]),
        ]);
        near(scores.pure_triads_percent(), percent);
    }
}

#[test]
fn motion_is_settling_or_late_by_the_age_of_the_note() {
    // The long note hears one other come at 30 ms and one at 500 ms, and moves at each.
    let long = note(60, 0, 1000, &[(0, 0.0), (30, 4.0), (500, 4.5), (600, 5.0)]);
    let scores = scored(vec![
        long,
        note(64, 30, 1000, &[(30, 0.0)]),
        note(67, 500, 1000, &[(500, 0.0)]),
    ]);
    near(scores.settling().max, 4.0);
    near(scores.late().max, 1.0);
    near(scores.held().mean, (4.0 + 1.0 + 0.0) / 3.0);
    near(scores.fastest(), 0.5);
}

#[test]
fn fastest_sees_glides_jumps_and_there_and_back() {
    let glide = |step_ms: u64, cents: f64| {
        let steps = (0..50).map(move |n| (100 + n * step_ms, n as f64 * cents));
        steps.collect::<Vec<_>>()
    };
    // 30 cents a second: 0.6 in 20 ms.
    near(
        scored(vec![note(60, 0, 2000, &glide(10, 0.3))]).fastest(),
        0.6,
    );
    let back = [(0, 0.0), (500, 3.0), (505, 0.0)];
    near(scored(vec![note(60, 0, 2000, &back)]).fastest(), 3.0);
    // Young notes may jump; an old one's jump shows whole, however long it stood still.
    near(
        scored(vec![note(60, 0, 2000, &[(0, 0.0), (40, 9.0)])]).fastest(),
        0.0,
    );
    near(
        scored(vec![note(60, 0, 2000, &[(0, 0.0), (900, 9.0)])]).fastest(),
        9.0,
    );
}

#[test]
fn drift_is_against_the_start_and_rest_against_equal() {
    // 16 quarters (12 s) on one key, 5 cents high, then 8 from the middle on.
    let scores = scored(vec![
        note(60, 0, 6000, &[(0, 5.0)]),
        note(60, 6000, 12000, &[(6000, 8.0)]),
    ]);
    near(scores.drift_ends().mean, 3.0);
    near(scores.drift_peak(), 3.0);
    near(scores.rest(), 8.0);
    // Glides are integrated: half of the last window at 5, half at 9.
    let scores = scored(vec![note(60, 0, 6000, &[(0, 5.0), (3000, 9.0)])]);
    near(scores.rest(), 7.0);
}
