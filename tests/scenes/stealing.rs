//! More pitches than channels: who gives way is set, predictable and counted, and nothing held is ever bent.

use super::few_channels;
use crate::support::plans;
use crate::support::rig::Rig;
use crate::support::script::assert_heard;
use trued::engine::Plan;
use trued::engine::plan::{ChannelSet, Dialect, Steal};

/// Two channels, and C, E and G each at another bend.
fn two_channels(steal: Steal) -> Plan {
    let mut plan = few_channels(2);
    plan.synths[0].steal = steal;
    plan
}

const THREE: &str = "10 on C4 40\n20 on E4 90\n30 on G4 90\n40 off C4\n50 off E4\n60 off G4";

#[test]
fn the_oldest_gives_way() {
    let mut rig = Rig::ready(&two_channels(Steal::Oldest));
    let heard = rig.play("10 on E4 90\n20 on C4 40\n30 on G4 90\n40 off C4\n50 off E4\n60 off G4");
    assert_heard(
        &heard,
        "10 64 sounds 6386.0
         20 60 sounds 6010.0
         30 64 cut off
         30 67 sounds 6702.0
         40 60 ends
         60 67 ends",
    );
    assert_eq!(rig.engine.report().counters.stolen, 1);
    assert!(
        rig.heard().moves.is_empty()
            && rig.heard().orphans.is_empty()
            && rig.heard().stuck().is_empty()
    );
}

#[test]
fn the_quietest_gives_way() {
    let mut rig = Rig::ready(&two_channels(Steal::Quietest));
    let heard = rig.play("10 on E4 90\n20 on C4 40\n30 on G4 90\n40 off C4\n50 off E4\n60 off G4");
    assert_heard(
        &heard,
        "10 64 sounds 6386.0
         20 60 sounds 6010.0
         30 60 cut off
         30 67 sounds 6702.0
         50 64 ends
         60 67 ends",
    );
    assert!(rig.heard().moves.is_empty() && rig.heard().orphans.is_empty());
}

#[test]
fn nothing_gives_way_and_the_new_note_is_refused() {
    let mut rig = Rig::ready(&two_channels(Steal::Nothing));
    let heard = rig.play(THREE);
    assert_heard(
        &heard,
        "10 60 sounds 6010.0
         20 64 sounds 6386.0
         40 60 ends
         50 64 ends",
    );
    assert_eq!(rig.engine.report().counters.refused, 1);
    assert!(rig.heard().orphans.is_empty());
}

#[test]
fn the_longest_released_tail_is_bent_before_anything_is_stolen() {
    let mut rig = Rig::ready(&two_channels(Steal::Oldest));
    let heard = rig.play("10 on C4 90\n20 on E4 90\n30 off E4\n40 off C4\n50 on G4 90");
    assert_heard(
        &heard,
        "10 60 sounds 6010.0
         20 64 sounds 6386.0
         30 64 ends
         40 60 ends
         50 64 moves to 6402.0
         50 67 sounds 6702.0",
    );
    let counters = rig.engine.report().counters;
    assert_eq!((counters.tails_cut, counters.stolen), (1, 0));
}

#[test]
fn a_tail_that_has_died_is_nobody_s() {
    let mut rig = Rig::ready(&two_channels(Steal::Oldest));
    rig.play("10 on C4 90\n20 on E4 90\n30 off E4\n40 off C4\n1600 on G4 90");
    assert!(rig.heard().moves.is_empty());
    assert_eq!(rig.engine.report().counters.tails_cut, 0);
}

#[test]
fn equal_pitches_share_whatever_their_number() {
    let mut rig = Rig::ready(&few_channels(1));
    let heard = rig.play("10 on C3 90\n10 on C4 90\n10 on C5 90\n20 off C4\n30 off C3\n40 off C5");
    assert_heard(
        &heard,
        "10 48 sounds 4810.0
         10 60 sounds 6010.0
         10 72 sounds 7210.0
         20 60 ends
         30 48 ends
         40 72 ends",
    );
    assert_eq!(rig.engine.report().counters.stolen, 0);
}

#[test]
fn sharing_can_be_switched_off() {
    let mut plan = few_channels(3);
    plan.synths[0].share = false;
    let mut rig = Rig::ready(&plan);
    rig.play("10 on C3 90\n10 on C4 90\n10 on C5 90");
    let mut channels: Vec<u8> = rig.heard().notes.iter().map(|n| n.channel).collect();
    channels.sort();
    assert_eq!(channels, [0, 1, 2]);
}

#[test]
fn quarter_tones_on_twelve_keys_need_two_channels() {
    let halves = plans::tuning(|key| Some(key as f64 * 50.0 + 3000.0));
    let mut plan = plans::plan(
        plans::synth("synth", Dialect::ChannelBend, 2),
        vec![plans::song("Halves", halves)],
    );
    plan.synths[0].members = ChannelSet(0b11);
    plan.parts[0].pool = ChannelSet(0b11);
    let mut rig = Rig::ready(&plan);
    for key in 40..80 {
        rig.midi(0, &[0x90, key, 64]);
    }
    assert_eq!(rig.heard().notes.len(), 40);
    assert!(rig.heard().moves.is_empty() && rig.heard().stuck().len() == 40);
}

#[test]
fn silent_keys_and_pitches_out_of_reach_stay_silent_and_are_counted() {
    let odd = plans::tuning(|key| match key {
        60 => None,
        61 => Some(-200.0),
        62 => Some(12_900.0),
        _ => Some(key as f64 * 100.0),
    });
    let plan = plans::plan(
        plans::synth("synth", Dialect::ChannelBend, 2),
        vec![plans::song("Odd", odd)],
    );
    let mut rig = Rig::ready(&plan);
    for key in 60..64 {
        rig.midi(0, &[0x90, key, 64]);
        rig.midi(0, &[0x80, key, 64]);
    }
    assert_eq!(rig.heard().notes.len(), 1);
    assert_eq!(rig.engine.report().counters.silent, 3);
    assert!(rig.heard().orphans.is_empty());
}

/// A chord dies away while another in another tuning is played over it: channels that ring are left alone as long as there
/// are others, and after that the one released longest ago goes first.
#[test]
fn n19_ringing_releases_are_not_retuned() {
    let mut rig = Rig::of(
        "keyboards: {keys: {port: virtual}}\nsynths: {synth: {port: virtual, channels: 1-6, tail_ms: 1500}}\n\
         set: [{song: Mean, tuning: quarter-comma-meantone}, {song: Well, tuning: werckmeister-3}]\n",
    );
    rig.play(
        "10 on C4 90\n20 on E4 90\n30 on G4 90
         100 off E4\n110 off C4\n120 off G4
         130 next
         200 on C4 90\n210 on E4 90\n220 on G4 90\n300 off C4\n310 off E4\n320 off G4",
    );
    assert_eq!(rig.heard().notes.len(), 6);
    assert!(
        rig.heard().moves.is_empty(),
        "six channels, six pitches: {:?}",
        rig.heard().moves
    );
    assert_eq!(rig.engine.report().counters.tails_cut, 0);
    // A seventh pitch while all six ring: E of the first chord has been released longest, and it is counted.
    rig.play("400 on F#4 90");
    let moved: Vec<usize> = rig.heard().moves.iter().map(|moved| moved.note).collect();
    assert_eq!(moved, [1]);
    assert_eq!(rig.engine.report().counters.tails_cut, 1);
    // When the tails are over, nobody is disturbed by whatever comes.
    rig.play("500 off F#4\n3000 on D4 90\n3010 on A4 90\n3020 on B4 90\n3030 on Bb4 90");
    assert_eq!(rig.heard().moves.len(), 1);
}
