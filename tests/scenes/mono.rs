//! Parts of one voice: the newest key sounds, and the one before comes back.

use crate::support::dice::Dice;
use crate::support::rig::Rig;
use crate::support::script::assert_heard;
use trued::time::Span;

fn rig(synth: &str, song: &str) -> Rig {
    Rig::of(&format!(
        "keyboards: {{keys: {{port: virtual}}, pads: {{port: virtual}}}}\n\
         synths: {{lead: {{port: virtual{synth}}}}}\n\
         parts: [{{mono: yes}}]\n\
         set: [{{song: One, tuning: quarter-comma-meantone}}, {{song: Two, tuning: equal-12{song}}}]\n"
    ))
}

#[test]
fn the_newest_key_sounds_on_one_channel_and_the_one_before_comes_back() {
    let mut rig = rig(", tail_ms: 0", "");
    let heard = rig.play(
        "10 on A4 100
         100 on E5 90
         200 off E5
         300 off A4",
    );
    // Of quarter-comma meantone E5 is 696.6 cents above A4.
    assert_heard(
        &heard,
        "10 69 sounds 6900.0
         100 69 moves to 6896.6
         100 69 ends
         100 76 sounds 7596.6
         200 76 moves to 7600.0
         200 76 ends
         200 69 sounds 6900.0
         300 69 ends",
    );
    let heard = rig.heard();
    assert!(
        heard
            .notes
            .iter()
            .all(|note| note.channel == heard.notes[0].channel)
    );
    assert_eq!(heard.notes[2].velocity, 100, "as it was struck");
}

#[test]
fn the_new_note_begins_before_the_old_one_ends_as_legato_is_played() {
    let mut rig = rig("", "");
    rig.play("10 on A4 100");
    let mark = rig.sent.len();
    rig.play("100 on D5 90");
    let sent = rig.sent_since(mark);
    assert_eq!(sent[sent.len() - 2..], ["90 4A 5A", "80 45 40"]);
}

#[test]
fn a_key_that_came_up_meanwhile_does_not_come_back() {
    let mut rig = rig("", "");
    rig.play("10 on A4 100\n100 on C5 90\n200 on E5 80\n300 off C5\n400 off E5");
    let numbers: Vec<u8> = rig.heard().notes.iter().map(|note| note.number).collect();
    assert_eq!(numbers, [69, 72, 76, 69]);
    rig.play("500 off A4");
    assert!(rig.heard().sounding().is_empty() && rig.heard().stuck().is_empty());
    assert_eq!(rig.engine.report().counters.orphans, 0);
}

#[test]
fn one_key_on_two_keyboards_is_struck_anew() {
    let mut rig = rig("", "");
    let heard = rig.play("10 on A4 100\n100 second on A4 90\n200 second off A4\n300 off A4");
    assert_heard(
        &heard,
        "10 69 sounds 6900.0
         100 69 ends
         100 69 sounds 6900.0
         200 69 ends
         200 69 sounds 6900.0
         300 69 ends",
    );
    assert!(rig.heard().doubled.is_empty());
}

#[test]
fn a_lost_keyboard_gives_the_voice_back_to_the_other() {
    let mut rig = rig("", "");
    rig.play("10 second on A4 100\n100 on D5 90\n200 lost");
    let sounding: Vec<u8> = rig
        .heard()
        .sounding()
        .iter()
        .map(|note| note.number)
        .collect();
    assert_eq!(sounding, [69]);
    rig.play("300 panic\n400 second off A4\n500 on D4 90\n600 off D4");
    assert!(rig.heard().stuck().is_empty() && rig.heard().sounding().is_empty());
}

#[test]
fn a_mono_part_leaves_the_other_channels_to_the_others() {
    let mut rig = Rig::of(
        "synths: {lead: {port: virtual, channels: 1-4}}\n\
         parts: [{keys: ..B3}, {keys: C4.., mono: yes}]\n\
         set: [{song: One, tuning: equal-12}]\n",
    );
    rig.play("10 on C5 100\n20 on D5 100\n30 on C3 100");
    let channels: Vec<u8> = rig.heard().notes.iter().map(|note| note.channel).collect();
    let plan = rig.stage.as_ref().expect("a stage").plan();
    let pools: Vec<u32> = plan.parts.iter().map(|part| part.pool.count()).collect();
    assert_eq!((channels, pools), (vec![3, 3, 0], vec![3, 1]));
}

/// Whatever hands do, over song changes, pedals, panics and losses: one voice at most, on one channel, and in the end none.
#[test]
fn random_play_on_one_voice_never_sticks() {
    for (seed, synth, song) in [
        (1, "", ""),
        (2, ", dialect: mpe", ""),
        (3, "", ", intonation: chord-root"),
        (4, "", ", parts: [{mono: yes, transpose: 5}]"),
        (
            5,
            ", dialect: mpe",
            ", parts: [{keys: ..B3, mono: yes}, {keys: C4..}]",
        ),
    ] {
        let mut dice = Dice::new(seed);
        let mut rig = rig(synth, song);
        for _ in 0..4_000 {
            rig.until(rig.now + Span::from_millis(dice.pick(&[0, 3, 40])));
            let (keyboard, key) = (dice.below(2) as usize, dice.between(50, 72) as u8);
            match dice.below(100) {
                0..=45 => rig.midi(keyboard, &[0x90, key, 90]),
                46..=91 => rig.midi(keyboard, &[0x80, key, 64]),
                92..=94 => rig.midi(keyboard, &[0xB0, 64, dice.pick(&[0, 127])]),
                95 => rig.midi(keyboard, &[0xB0, 123, 0]),
                96 => rig
                    .play(&format!("{} lost", rig.now.nanos() / 1_000_000))
                    .clear(),
                97 => rig.tell("panic"),
                _ => rig.tell(&format!("song {}", dice.between(1, 2))),
            }
            let only_one = synth.is_empty() && !song.contains("parts");
            let open = rig.heard().stuck().len();
            assert!(
                !only_one || open <= 1,
                "seed {seed}: {open} voices at {:?}",
                rig.now
            );
        }
        for key in 50..73 {
            for keyboard in 0..2 {
                rig.midi(keyboard, &[0x80, key, 64]);
                rig.midi(keyboard, &[0xB0, 64, 0]);
            }
        }
        rig.until(rig.now + Span::from_millis(3_000));
        let heard = rig.heard();
        assert!(heard.notes.len() > 500, "seed {seed}: it played");
        assert!(
            heard.stuck().is_empty() && heard.sounding().is_empty(),
            "seed {seed}: {:?}",
            heard.stuck()
        );
        assert!(heard.orphans.is_empty(), "seed {seed}: {:?}", heard.orphans);
    }
}
