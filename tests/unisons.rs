//! Two keyboards that keep meeting on the same keys: a unison is parted where a channel is to spare, and doubled rather
//! than taking a channel from another pitch.

use crate::support::dice::Dice;
use crate::support::plans;
use crate::support::rig::Rig;
use trued::engine::plan::Dialect;
use trued::time::Span;

/// Twelve different offsets, in cents; invented.
const TWELVE: [f64; 12] = [
    10.0, -14.0, 3.0, 21.0, -3.0, 14.0, -10.0, 7.0, -17.0, 0.0, 17.0, -7.0,
];

fn play(seed: u64, dialect: Dialect, range: u8) -> (Rig, u64) {
    let mut dice = Dice::new(seed);
    let set = vec![plans::song("Unisons", plans::offsets(TWELVE))];
    let mut rig = Rig::ready(&plans::plan(plans::synth("organ", dialect, range), set));
    let mut held: Vec<(usize, u8)> = Vec::new();
    let mut bends_at_first = 0;
    for note in 0..3_000 {
        rig.until(rig.now + Span::from_millis(dice.below(60)));
        let (keyboard, key) = (dice.below(2) as usize, dice.between(48, 72) as u8);
        rig.midi(keyboard, &[0x90, key, 80]);
        held.push((keyboard, key));
        while held.len() > dice.between(1, 8) as usize {
            let (keyboard, key) = held.remove(dice.below(held.len() as u64) as usize);
            rig.midi(keyboard, &[0x80, key, 64]);
        }
        if note == 100 {
            bends_at_first = rig.heard().bends;
        }
    }
    for (keyboard, key) in held {
        rig.midi(keyboard, &[0x80, key, 64]);
    }
    (rig, bends_at_first)
}

#[test]
fn unisons_bend_nobody_and_cost_no_bends() {
    for (dialect, range) in [(Dialect::ChannelBend, 2), (Dialect::Mpe { manager: 0 }, 48)] {
        for seed in 1..=5 {
            let (rig, bends_at_first) = play(seed, dialect, range);
            let heard = rig.heard();
            assert!(heard.notes.len() == 3_000, "seed {seed}");
            assert_eq!(heard.moves, [], "seed {seed}: nobody is bent");
            assert!(
                heard.stuck().is_empty() && heard.orphans.is_empty(),
                "seed {seed}"
            );
            assert!(!heard.doubled.is_empty(), "seed {seed}: it came to unisons");
            let later = heard.bends - bends_at_first;
            assert!(later <= 29, "seed {seed}: {later} bends in 2,900 notes");
            assert_eq!(rig.engine.report().counters.stolen, 0, "seed {seed}");
        }
    }
}

#[test]
fn a_unison_is_parted_while_channels_are_to_spare() {
    let set = vec![plans::song("Plain", plans::equal())];
    let mut rig = Rig::ready(&plans::plan(
        plans::synth("organ", Dialect::ChannelBend, 2),
        set,
    ));
    rig.midi(0, &[0x90, 60, 80]);
    rig.midi(1, &[0x90, 60, 80]);
    let channels: Vec<u8> = rig.heard().notes.iter().map(|note| note.channel).collect();
    assert_eq!(channels, [0, 1]);
}
