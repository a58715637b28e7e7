//! Chords that walk away: the comma pump and Benedetti's pattern, fifty times over.

use super::keyboard::{Music, QUARTER_S, Touch};
use super::played::{CHANNEL_BEND, Hearing, hear, plan};
use super::score::{Scores, Table, mean_between};

/// I vi ii V in C. Tied, C and E are held into A minor, A into D minor, D into G, G into C.
const COMMA_PUMP: [&[u8]; 4] = [
    &[48, 60, 64, 67],
    &[45, 60, 64, 69],
    &[50, 62, 65, 69],
    &[43, 59, 62, 67],
];
/// G. B. Benedetti to Cipriano de Rore, printed 1585, its pure steps alone: C below a tied A, G above the C, D below the
/// G, A above the D.
const BENEDETTI: [&[u8]; 4] = [&[60, 69], &[60, 67], &[62, 67], &[62, 69]];

const CHORD_S: f64 = 2.0 * QUARTER_S;
const PASSES: usize = 50;
/// 81/80 in cents, what one pass of either pattern comes to: down by 5/3 x 2/3 x 4/3 x 2/3, up by 3/5 x 3/2 x 3/4 x 3/2.
const COMMA_CENTS: f64 = 21.506_289_6;
/// Half a bend step for the pitch, and as much for its mean.
const STEP_CENTS: f64 = 0.0245;

/// The pattern so many times and its first chord once more. Tied, a key of two neighbouring chords is held.
fn repeated(chords: &[&[u8]], passes: usize, tied: bool) -> Music {
    let first = [chords[0]];
    let all = chords.iter().copied().cycle().take(passes * chords.len());
    let all: Vec<&[u8]> = all.chain(first).collect();
    let mut touches = Vec::new();
    for (place, chord) in all.iter().enumerate() {
        for key in *chord {
            let held = |place: usize| all.get(place).is_some_and(|chord| chord.contains(key));
            if tied && place > 0 && held(place - 1) {
                continue;
            }
            let mut end = place + 1;
            while tied && held(end) {
                end += 1;
            }
            touches.push(Touch {
                on_s: place as f64 * CHORD_S,
                off_s: end as f64 * CHORD_S,
                key: *key,
            });
        }
    }
    Music::without_pedal(touches)
}

/// Where the lowest key of the first chord stands at the start of each pass.
fn starts(hearing: &Hearing, chords: &[&[u8]]) -> Vec<f64> {
    let pass_ns = (CHORD_S * 1e9) as u64 * chords.len() as u64;
    let at = |pass: u64| {
        let ns = pass * pass_ns;
        let sounds = |n: &&super::played::Sounding| {
            n.key == chords[0][0] && (n.on_ns..n.off_ns).contains(&ns)
        };
        let note = hearing.soundings.iter().find(sounds);
        note.expect("the first chord of each pass").at(ns)
    };
    (0..=PASSES as u64).map(at).collect()
}

fn played(intonation: &str, chords: &[&[u8]], tied: bool) -> (Vec<f64>, f64, Scores) {
    let plan = plan(
        &format!("tuning: equal-12, intonation: {intonation}"),
        CHANNEL_BEND,
    );
    let hearing = hear(&plan, &repeated(chords, PASSES, tied));
    let mut scores = Scores::new();
    scores.add(&hearing);
    super::chorales::assert_nothing_lost(&scores);
    let starts = starts(&hearing, chords);
    let far = farthest_chord(&hearing);
    let shown = [0, 1, 2, 5, 10, 50].map(|pass| format!("{:8.1}", starts[pass]));
    let name = if chords == COMMA_PUMP {
        "I vi ii V"
    } else {
        "Benedetti"
    };
    let how = if tied { "tied" } else { "re-struck" };
    println!(
        "{name} {how:<10} {intonation:<50}{}   held {:.1}, off {:.1}, chord {far:.1}, ever {:.1}",
        shown.concat(),
        scores.held().max,
        scores.purity(Table::V5c).max,
        scores.farthest()
    );
    (starts, far, scores)
}

/// The largest mean distance from rest of a chord in its second half, when what was held has glided to its place.
fn farthest_chord(hearing: &Hearing) -> f64 {
    let half_ns = (CHORD_S * 1e9) as u64 / 2;
    let halves = (0..=PASSES as u64 * 4).map(|place| (2 * place + 1) * half_ns);
    let means = halves.map(|from| mean_between(&hearing.soundings, from, from + half_ns));
    means.map(f64::abs).fold(0.0, f64::max)
}

#[test]
fn pumps_stay_within_the_drift_limit() {
    println!(
        "lowest key at the start of pass 0 1 2 5 10 50; the largest held motion, error of a consonance, mean of a chord that stands, mean at any moment"
    );
    for (limit, intonation) in [
        (12.0, "chord-root"),
        (5.0, "{method: chord-root, drift_limit_cents: 5}"),
    ] {
        for chords in [&COMMA_PUMP, &BENEDETTI] {
            for tied in [true, false] {
                let (starts, far, scores) = played(intonation, chords, tied);
                assert!(
                    far <= limit + STEP_CENTS,
                    "{intonation}: a chord stands {far} cents away"
                );
                assert!(
                    scores.rest() <= limit,
                    "{intonation}: a pass is {} cents away",
                    scores.rest()
                );
                // It has settled, too: what is bounded might still creep.
                let creep = (starts[PASSES] - starts[10]).abs();
                assert!(creep <= 0.5, "{intonation}: {creep} cents in forty passes");
            }
        }
    }
}

#[test]
fn without_a_limit_pumps_walk_by_the_arithmetic() {
    for (chords, comma) in [(&COMMA_PUMP, -COMMA_CENTS), (&BENEDETTI, COMMA_CENTS)] {
        let (starts, _, scores) = played(
            "{method: chord-root, drift_limit_cents: none}",
            chords,
            true,
        );
        for (pass, pair) in starts.windows(2).enumerate() {
            let walked = pair[1] - pair[0];
            assert!(
                (walked - comma).abs() <= 0.1,
                "pass {pass}: {walked}, not {comma}"
            );
        }
        let all = (starts[PASSES] - starts[0]) / PASSES as f64;
        assert!((all - comma).abs() <= 0.01, "{all} a pass, not {comma}");
        assert!(scores.purity(Table::V5c).max <= 2.0 * STEP_CENTS);
    }
}
