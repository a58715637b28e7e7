//! Piano and jazz of our own beside the chorales, by the same metrics.

use super::chorales::{asked, assert_nothing_lost, score};
use super::compose::{jazz, piano};
use super::corpus::{Manner, Take, chorales};
use super::keyboard::Music;
use super::played::{CHANNEL_BEND, hear, plan};
use super::score::Scores;
use super::table;

fn scored(pieces: &[Music], intonation: &str) -> Scores {
    let plan = plan(
        &format!("tuning: equal-12, intonation: {intonation}"),
        CHANNEL_BEND,
    );
    let mut scores = Scores::new();
    for music in pieces {
        scores.add(&hear(&plan, music));
    }
    scores
}

#[test]
fn piano_and_jazz_beside_the_chorales() {
    let (piano, jazz, bach) = (piano(), jazz(), chorales(Take::Test));
    let mut played_s = 0.0;
    for intonation in ["fixed", &asked("INTONATION", "chord-root")] {
        table::print_head(&format!("intonation {intonation}, performed"));
        let song = format!("tuning: equal-12, intonation: {intonation}");
        let chorales = score(&bach, Manner::Performed, CHANNEL_BEND, |_| song.clone());
        table::print_ours("chorales", &chorales);
        for (name, pieces) in [("piano", &piano), ("jazz", &jazz)] {
            let scores = scored(pieces, intonation);
            table::print_ours(&format!("{name}, {:.0} s", scores.played_s), &scores);
            played_s += scores.played_s;
            assert_nothing_lost(&scores);
            if intonation == "chord-root" {
                assert!(scores.late().max <= 6.05, "{name}: {:?}", scores.late());
                assert!(scores.fastest() <= 1.2, "{name}: {}", scores.fastest());
                assert!(scores.rest() <= 12.0, "{name}: {}", scores.rest());
            }
        }
    }
    assert!(played_s / 2.0 >= 300.0, "five minutes: {played_s}");
}
