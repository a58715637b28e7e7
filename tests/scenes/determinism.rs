//! The same history gives the same bytes, and how a stream was cut into portions is no part of it.

use super::{mpe, plain};
use crate::support::dice::Dice;
use crate::support::rig::Rig;
use proptest::prelude::*;
use trued::engine::Plan;
use trued::time::Time;

/// A stream of mostly sensible bytes, with running status and some rubbish.
fn stream(seed: u64, length: usize) -> Vec<u8> {
    let mut dice = Dice::new(seed);
    let mut out = Vec::new();
    while out.len() < length {
        match dice.below(20) {
            0 => out.push(dice.below(256) as u8),
            1 => out.extend([0xF0, 0x7D, dice.below(128) as u8, 0xF7]),
            2 => out.push(dice.pick(&[0xF8, 0xFA, 0xFC])),
            3..=5 => out.extend([
                0xB0,
                dice.pick(&[1, 6, 64, 66, 88, 100, 101, 121, 123]),
                dice.below(128) as u8,
            ]),
            6 => out.extend([0xE0, dice.below(128) as u8, dice.below(128) as u8]),
            7 => out.extend([0xC0, dice.below(4) as u8]),
            8..=12 => out.extend([dice.between(30, 90) as u8, dice.below(128) as u8]),
            _ => out.extend([
                dice.pick(&[0x80, 0x90, 0x90]),
                dice.between(30, 90) as u8,
                dice.below(128) as u8,
            ]),
        }
    }
    out
}

/// Plays a stream, so many bytes each ten milliseconds, each of those in the given portions.
fn played(plan: &Plan, stream: &[u8], portions: &[usize]) -> String {
    let mut rig = Rig::ready(plan);
    let mut portions = portions.iter().cycle();
    for (count, moment) in stream.chunks(40).enumerate() {
        rig.until(Time::from_millis(10 * count as u64));
        let mut rest = moment;
        while !rest.is_empty() {
            let size = portions
                .next()
                .copied()
                .unwrap_or(rest.len())
                .clamp(1, rest.len());
            rig.midi(0, &rest[..size]);
            rest = &rest[size..];
        }
    }
    rig.transcript_of_bytes()
}

#[test]
fn the_same_history_gives_the_same_bytes() {
    for plan in [plain(), mpe()] {
        let bytes = stream(1, 8000);
        let first = played(&plan, &bytes, &[]);
        assert!(first.lines().count() > 2000);
        assert_eq!(first, played(&plan, &bytes, &[]));
        assert_ne!(first, played(&plan, &stream(2, 8000), &[]));
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(40))]

    #[test]
    fn portions_of_a_stream_do_not_matter(seed in 1u64..10_000, portions in proptest::collection::vec(1usize..9, 1..20)) {
        let bytes = stream(seed, 1200);
        let plan = if seed % 2 == 0 { plain() } else { mpe() };
        prop_assert_eq!(played(&plan, &bytes, &[]), played(&plan, &bytes, &portions));
    }
}
