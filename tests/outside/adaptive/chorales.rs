//! The table: chorales in fixed tunings, whose figures are published, and in any intonation that one asks for.

use super::corpus::{Manner, Piece, Take, chorales};
use super::peers::peer;
use super::played::{CHANNEL_BEND, MPE, hear, plan};
use super::score::{Scores, Table};
use super::table;
use std::env;

const MANNERS: [Manner; 2] = [Manner::Together, Manner::Performed];
/// Half a unit of the published figure's last digit, and a bend step (0.0244 cents), half for each of two keys.
const STEP_CENTS: f64 = 0.0245;
const SLACK_MEAN_CENTS: f64 = 0.005 + STEP_CENTS;
const SLACK_CENTS: f64 = 0.05 + STEP_CENTS;
const SLACK_PERCENT: f64 = 0.05;

/// Every piece, tuned as `song` says of it.
pub fn score(
    pieces: &[Piece],
    manner: Manner,
    synth: &str,
    song: impl Fn(&Piece) -> String,
) -> Scores {
    let mut scores = Scores::new();
    let mut planned: Option<(String, trued::engine::Plan)> = None;
    for piece in pieces {
        let song = song(piece);
        if planned.as_ref().is_none_or(|(before, _)| *before != song) {
            planned = Some((song.clone(), plan(&song, synth)));
        }
        let (_, plan) = planned.as_ref().expect("just planned");
        scores.add(&hear(plan, &piece.music(manner)));
    }
    scores
}

#[test]
fn fixed_tunings_score_as_published() {
    let pieces = chorales(Take::Test);
    assert_eq!(pieces.len(), 40);
    let by_letter = |tuning: &'static str| move |_: &Piece| format!("tuning: {tuning}");
    for manner in MANNERS {
        table::print_head(&format!("Fixed tunings, {manner:?}"));
        check(
            manner,
            "A ",
            &score(&pieces, manner, CHANNEL_BEND, by_letter("equal-12")),
        );
        let five_limit =
            |piece: &Piece| format!("tuning: five-limit-scale, tonic: {}", piece.tonic);
        check(
            manner,
            "D ",
            &score(&pieces, manner, CHANNEL_BEND, five_limit),
        );
        if manner == Manner::Together {
            for (row, tuning) in [("B ", "quarter-comma-meantone"), ("C ", "werckmeister-3")] {
                check(
                    manner,
                    row,
                    &score(&pieces, manner, CHANNEL_BEND, by_letter(tuning)),
                );
            }
        }
    }
}

/// Against the published row of that name.
fn check(manner: Manner, row: &str, scores: &Scores) {
    let peer = peer(manner, row);
    table::print_ours(peer.method, scores);
    table::print_peer(&peer);
    let near = |what: &str, ours: f64, theirs: f64, slack: f64| {
        assert!(
            (ours - theirs).abs() <= slack,
            "{} {manner:?}: {what} is {ours}, published is {theirs}",
            peer.method
        );
    };
    for (heading, kind) in [
        ("V5c", Table::V5c),
        ("V5a", Table::V5a),
        ("V7a", Table::V7a),
    ] {
        if peer.cell(heading).is_some() {
            let (ours, theirs) = (scores.purity(kind), peer.figures(heading));
            near(heading, ours.mean, theirs[0], SLACK_MEAN_CENTS);
            near(heading, ours.p95, theirs[1], SLACK_CENTS);
            near(heading, ours.max, theirs[2], SLACK_CENTS);
        }
    }
    let pure = peer.figures("triads pure")[0];
    near(
        "pure triads",
        scores.pure_triads_percent(),
        pure,
        SLACK_PERCENT,
    );
    for (what, cents) in [
        ("held motion", scores.held().max),
        ("late motion", scores.late().max),
        ("fastest motion", scores.fastest()),
        ("drift", scores.drift_peak()),
    ] {
        near(what, cents, 0.0, 1e-9);
    }
    assert_nothing_lost(scores);
}

pub fn assert_nothing_lost(scores: &Scores) {
    assert!(scores.notes > 0);
    let lost = [scores.missing, scores.extra, scores.stuck, scores.cut];
    assert_eq!(
        lost, [0; 4],
        "notes missing, extra, stuck, or ended at a wrong time"
    );
}

/// `TAKE` is `test` or `dev`, `INTONATION` and `TUNING` are as in a stage file, `SYNTH` is `bend` or `mpe`. What is promised
/// is promised of what is played when nothing is asked for.
#[test]
fn table_of_chorales() {
    let (take, take_name) = match asked("TAKE", "test").as_str() {
        "test" => (Take::Test, "those judged by"),
        "dev" => (Take::Dev, "others, to tune by"),
        other => panic!("TAKE={other}; it is test or dev"),
    };
    let synth = match asked("SYNTH", "bend").as_str() {
        "bend" => CHANNEL_BEND,
        "mpe" => MPE,
        other => panic!("SYNTH={other}; it is bend or mpe"),
    };
    let intonation = asked("INTONATION", "chord-root");
    let song = format!(
        "tuning: {}, intonation: {intonation}",
        asked("TUNING", "equal-12")
    );
    let is_default = ["TAKE", "SYNTH", "INTONATION", "TUNING"]
        .iter()
        .all(|name| env::var(name).is_err());
    let pieces = chorales(take);
    for manner in MANNERS {
        table::print_head(&format!(
            "{} chorales ({take_name}), {manner:?}",
            pieces.len()
        ));
        let scores = score(&pieces, manner, synth, |_| song.clone());
        table::print_ours(&intonation, &scores);
        table::print_peers(manner);
        assert_nothing_lost(&scores);
        if is_default {
            assert_promises(manner, &scores);
        }
    }
}

/// What the environment asks for.
pub fn asked(name: &str, default: &str) -> String {
    env::var(name).unwrap_or_else(|_| default.into())
}

fn assert_promises(manner: Manner, scores: &Scores) {
    for (what, ours, most) in [
        ("V5c mean", scores.purity(Table::V5c).mean, 0.35),
        ("V5a mean", scores.purity(Table::V5a).mean, 0.95),
        (
            "impure triads, %",
            100.0 - scores.pure_triads_percent(),
            3.0,
        ),
        ("late motion, 95 %", scores.late().p95, 2.8),
        ("late motion", scores.late().max, 6.05),
        ("motion in 20 ms", scores.fastest(), 1.2),
        ("from rest over 8 quarters", scores.rest(), 12.0),
        ("drift", scores.drift_peak(), 14.0),
    ] {
        assert!(
            ours <= most,
            "{manner:?}: {what} is {ours}, at most {most} is promised"
        );
    }
}
