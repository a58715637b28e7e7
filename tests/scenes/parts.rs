//! Parts: stretches of keyboard bound to synths, for the whole evening and for a song.

use crate::support::rig::Rig;
use crate::support::script::assert_heard;
use trued::time::Time;

const DEVICES: &str = "keyboards: {keys: {port: virtual}, pads: {port: virtual}}\n\
    synths: {organ: {port: virtual}, piano: {port: virtual}}\n";

/// Two keyboards, two plain synths, equal temperament; these parts.
fn with_parts(parts: &str) -> Rig {
    Rig::of(&format!(
        "{DEVICES}parts: {parts}\nset: [{{song: One, tuning: equal-12}}]\n"
    ))
}

/// Two songs, equal and in meantone, each with these parts; nothing stands for the parts of the evening.
fn two_songs(first: &str, second: &str) -> Rig {
    let parts = |parts: &str| match parts {
        "" => String::new(),
        parts => format!(", parts: {parts}"),
    };
    Rig::of(&format!(
        "{DEVICES}set:\n\
         - {{song: One, tuning: equal-12{}}}\n\
         - {{song: Two, tuning: quarter-comma-meantone{}}}\n",
        parts(first),
        parts(second)
    ))
}

/// Notes of a synth: number, and where it began, in cents.
fn notes(rig: &Rig, synth: usize) -> Vec<(u8, f64)> {
    let rounded = |cents: f64| (cents * 10.0).round() / 10.0;
    let notes = rig.receivers[synth].notes.iter();
    notes
        .map(|note| (note.number, rounded(note.onset_cents())))
        .collect()
}

#[test]
fn a_split_sends_the_left_hand_to_another_synth() {
    let mut rig = with_parts("[{keys: ..B3, to: piano}, {keys: C4.., to: organ}]");
    rig.play("10 chord B3 C4\n100 off B3\n100 off C4");
    assert_eq!(notes(&rig, 0), [(60, 6000.0)]);
    assert_eq!(notes(&rig, 1), [(59, 5900.0)]);
    assert!(rig.receivers.iter().all(|synth| synth.stuck().is_empty()));
}

#[test]
fn layers_sound_one_key_on_both_and_end_it_on_both() {
    let mut rig = with_parts("[{to: organ}, {to: piano, transpose: 12, offset: 7 c}]");
    rig.play("10 on A4 100\n500 off A4");
    assert_eq!(notes(&rig, 0), [(69, 6900.0)]);
    assert_eq!(notes(&rig, 1), [(81, 8107.0)]);
    assert!(
        rig.receivers
            .iter()
            .all(|synth| synth.sounding().is_empty())
    );
}

#[test]
fn each_keyboard_plays_its_own_synth_with_its_own_pedal_and_wheel() {
    let mut rig = with_parts("[{from: keys, to: organ}, {from: pads, to: piano}]");
    rig.play(
        "10 on C4 100
         10 second on E4 100
         20 second pedal down
         30 second wheel 16383
         40 off C4
         40 second off E4",
    );
    assert_eq!(notes(&rig, 0), [(60, 6000.0)]);
    assert_eq!(notes(&rig, 1), [(64, 6400.0)]);
    let [organ, piano] = &rig.receivers[..] else {
        panic!("two synths");
    };
    assert!(organ.sounding().is_empty() && organ.moves.is_empty());
    assert_eq!(piano.sounding().len(), 1, "under its player's pedal");
    assert!((piano.notes[0].cents() - 6600.0).abs() < 0.05);
}

#[test]
fn a_part_keeps_to_the_channel_it_asks_for() {
    let mut rig = with_parts("[{keys: ..B3, channel: 3}, {keys: C4.., channel: 5-6}]");
    rig.play("10 chord C3 C4\n100 off C3\n100 off C4\n200 on C5 100");
    let channels: Vec<u8> = rig
        .heard()
        .notes
        .iter()
        .map(|note| note.channel + 1)
        .collect();
    assert_eq!(channels, [3, 5, 5]);
}

#[test]
fn only_what_a_part_passes_reaches_its_synth() {
    let mut rig = with_parts("[{from: keys, pass: [pedals]}, {from: pads, pass: []}]");
    let mark = rig.sent.len();
    rig.play("10 wheel 0\n10 cc 1 50\n10 program 3\n10 send D0 40\n20 second pedal down");
    assert_eq!(rig.sent_since(mark), Vec::<String>::new());
    rig.play("30 pedal down\n40 on A4 100\n50 off A4\n60 second on D4 100\n70 second off D4");
    let heard = rig.heard();
    assert_eq!(heard.sounding().len(), 1);
    assert_eq!(heard.sounding()[0].number, 69);
}

#[test]
fn an_untuned_part_is_equal_at_440_whatever_the_song() {
    let mut rig = Rig::of(&format!(
        "{DEVICES}parts: [{{from: keys}}, {{from: pads, tune: no}}]\n\
         set: [{{song: Low, tuning: quarter-comma-meantone, pitch: A4 = 415 Hz}}]\n"
    ));
    rig.play("10 on E4 100\n10 second on E4 100");
    let heard = notes(&rig, 0);
    // A fifth of 696.578 below A4 at 415 Hz, which is 101.269 below 440 (1200 log2).
    assert_eq!(heard[1], (64, 6400.0));
    assert!(
        (heard[0].1 - (6900.0 - 101.269 + 696.578 - 1200.0)).abs() < 0.1,
        "{heard:?}"
    );
}

/// Where the last E of a synth stands above its first, held as a pure third by the other player.
fn octave_of_e(follow: &str) -> f64 {
    let mut rig = Rig::of(&format!(
        "{DEVICES}parts: [{{from: keys}}, {{from: pads, follow: {follow}}}]\n\
         set: [{{song: Pure, tuning: equal-12, intonation: chord-root}}]\n"
    ));
    rig.play("10 chord C4 E4 G4\n500 second on E5 100");
    let notes = &rig.heard().notes;
    notes[3].onset_cents() - notes[1].cents()
}

#[test]
fn a_second_player_may_have_a_harmony_of_one_s_own() {
    let step_cents = 200.0 / 8192.0;
    assert!((octave_of_e("yes") - 1200.0).abs() <= step_cents);
    // Alone, it stands at rest; the pure third of the first player is some 10 cents lower.
    assert!(octave_of_e("own") > 1206.0);
}

/// Two manuals a quarter-tone apart: 24 keys to the octave on two channels, however many keys are down.
#[test]
fn n15_two_keyboards_a_quarter_tone_apart_need_two_channels() {
    let mut rig = Rig::of(
        "keyboards: {lower: {port: virtual}, upper: {port: virtual}}\n\
         synths: {organ: {port: virtual, channels: 1-2}}\n\
         parts: [{from: lower}, {from: upper, offset: 50 c}]\n\
         set: [{song: Quarters, tuning: equal-12}]\n",
    );
    for key in 48..72 {
        rig.midi(0, &[0x90, key, 90]);
        rig.midi(1, &[0x90, key, 90]);
    }
    let heard = rig.heard();
    assert_eq!(heard.notes.len(), 48);
    for pair in heard.notes.chunks(2) {
        assert!((pair[1].onset_cents() - pair[0].onset_cents() - 50.0).abs() <= 200.0 / 8192.0);
    }
    assert!(heard.moves.is_empty() && heard.doubled.is_empty());
    assert_eq!(rig.engine.report().counters.stolen, 0);
    let bends = heard.bends;
    for key in 48..72 {
        rig.midi(0, &[0x80, key, 90]);
        rig.midi(1, &[0x80, key, 90]);
    }
    rig.midi(0, &[0x90, 60, 90]);
    rig.midi(1, &[0x90, 60, 90]);
    assert_eq!(rig.heard().bends, bends, "no bend is sent any more");
    assert_eq!(rig.heard().stuck().len(), 2);
}

/// Drums never move: whatever tuning, wheel, pedal and nudge do, and whatever songs do with their parts.
#[test]
fn n18_drums_never_move() {
    let mut rig = two_songs(
        "[{to: organ}]",
        "[{keys: C4.., to: organ}, {keys: ..B3, to: organ}]",
    );
    let mark = rig.sent.len();
    rig.play(
        "10 send 99 26 64
         20 wheel 16383
         30 tell pitch +30 c
         40 tell transpose +3
         50 next
         60 send 99 2A 64
         70 on C4 100
         80 send 89 26 40
         90 tell pitch -10 c now
         100 tell panic
         110 send 99 24 64
         120 send 89 24 40",
    );
    let drums = &rig.heard().notes;
    let drums: Vec<_> = drums.iter().filter(|note| note.channel == 9).collect();
    assert_eq!(
        drums.iter().map(|note| note.number).collect::<Vec<_>>(),
        [38, 42, 36]
    );
    for drum in &drums {
        assert_eq!(drum.onset_cents(), f64::from(drum.number) * 100.0);
        assert_eq!(drum.pitch.len(), 1, "it has not moved");
        assert!(drum.end.is_some());
    }
    let bent = |message: &String| message.starts_with("E9");
    assert!(!rig.sent_since(mark).iter().any(bent));
}

/// Three channels for the five bends of a pentatonic meantone scale: what gives way is told, and nothing sticks.
#[test]
fn n20_limited_voices_share_by_bend_and_give_way_in_turn() {
    let mut rig = Rig::of(
        "keyboards: {keys: {port: virtual}}\n\
         synths: {box: {port: virtual, channels: 1-3}}\n\
         set: [{song: Pentatonic, tuning: quarter-comma-meantone}]\n",
    );
    let advice = trued::stage::outlook::crowding(&rig.stage.as_ref().expect("a stage").plan(), 0);
    assert!(advice.is_some_and(|told| told.contains("12 different bends and 3 channels on box")));
    // Eight notes of three bends: all sound.
    rig.play("10 chord C2 G2 C3 G3 C4 D4 C5 G5");
    assert_eq!(rig.heard().sounding().len(), 8);
    assert_eq!(rig.engine.report().counters.stolen, 0);
    // A fourth bend: the channel whose youngest note is oldest gives way; all struck at once, so the lowest channel.
    rig.play("500 on E4 100");
    let sounding: Vec<u8> = rig
        .heard()
        .sounding()
        .iter()
        .map(|note| note.number)
        .collect();
    assert_eq!(sounding, [43, 55, 62, 79, 64]);
    assert_eq!(rig.engine.report().counters.stolen, 1, "one channel");
    for key in ["C2", "G2", "C3", "G3", "C4", "D4", "C5", "G5", "E4"] {
        rig.play(&format!("900 off {key}"));
    }
    assert!(rig.heard().stuck().is_empty() && rig.heard().orphans.is_empty());
}

#[test]
fn a_song_brings_its_own_parts_and_what_is_held_ends_where_it_began() {
    let mut rig = two_songs("[{to: organ}]", "[{to: piano, transpose: 12}]");
    rig.play(
        "10 on E4 100
         500 next
         600 on E5 100
         700 off E4
         800 off E5
         900 back
         1000 on E4 100",
    );
    assert_eq!(notes(&rig, 0), [(64, 6400.0), (64, 6400.0)]);
    // E6, a pure third and a fourth above A: meantone's E is 3.42 below equal from A.
    assert_eq!(notes(&rig, 1), [(88, 8796.6)]);
    let [organ, piano] = &rig.receivers[..] else {
        panic!("two synths");
    };
    assert_eq!(organ.notes[0].off.map(|off| off.as_millis()), Some(700));
    assert_eq!(organ.notes[0].pitch.len(), 1, "it kept its pitch");
    assert!(piano.stuck().is_empty() && piano.orphans.is_empty() && organ.orphans.is_empty());
}

#[test]
fn the_pedal_still_holds_what_rings_of_a_song_before_and_lets_it_go() {
    let mut rig = two_songs("[{to: organ}]", "[{from: keys, to: piano}]");
    let heard = rig.play(
        "10 pedal down
         20 on C4 100
         100 off C4
         500 next
         600 on G4 100
         900 off G4
         2000 pedal up",
    );
    assert_heard(
        &heard,
        "20 60 sounds 6000.0
         100 60 let go, held by a pedal
         2000 60 ends",
    );
    let piano = &rig.receivers[1].notes;
    assert_eq!(piano.len(), 1);
    // The pedal is down as the song begins, and the piano has been told before its first note.
    assert_eq!(piano[0].end.map(|end| end.as_millis()), Some(2000));
}

#[test]
fn the_wheel_moves_what_its_player_holds_over_a_song_change_and_nothing_else() {
    let split = "[{from: keys, to: organ, channel: 1-4}, {from: pads, to: organ, channel: 5-8}]";
    let other = "[{from: pads, to: organ, channel: 1-8}]";
    let mut rig = two_songs(split, other);
    let heard = rig.play(
        "10 on C4 100
         500 next
         600 second on A4 100
         700 wheel 12288
         800 second wheel 4096
         900 off C4
         900 second off A4",
    );
    assert_heard(
        &heard,
        "10 60 sounds 6000.0
         600 69 sounds 6900.0
         700 60 moves to 6100.0
         800 69 moves to 6800.0
         900 60 ends
         900 69 ends",
    );
}

#[test]
fn programs_and_controllers_stay_with_a_part_and_leave_its_channels() {
    let one = "[{from: keys, channel: 1-2}, {from: pads, channel: 3-4}]";
    let two = "[{from: pads, channel: 1-2}, {from: keys, channel: 3-4}]";
    let mut rig = two_songs(one, two);
    rig.play(
        "10 program 7
         10 cc 1 90
         20 on C4 100
         30 second on C4 100
         40 off C4
         50 second off C4
         5000 next
         6000 second on C4 100
         6000 on C4 100",
    );
    let heard = rig.heard();
    assert_eq!(heard.notes[2].channel, 0);
    assert_eq!(
        (heard.program(0), heard.controller(0, 1)),
        (Some(7), Some(0))
    );
    assert_eq!(heard.notes[3].channel, 2);
    assert_eq!(
        (heard.program(2), heard.controller(2, 1)),
        (Some(7), Some(90))
    );
}

#[test]
fn songs_with_the_same_parts_say_nothing_between_them() {
    let parts = "[{keys: ..B3, to: piano}, {keys: C4.., to: organ}]";
    let mut rig = two_songs(parts, parts);
    rig.play("10 on C4 100\n10 cc 1 90\n20 on C3 100");
    let mark = rig.sent.len();
    rig.play("500 next\n1000 back");
    assert_eq!(rig.sent_since(mark), Vec::<String>::new());
}

#[test]
fn songs_that_follow_each_other_fast_under_held_keys_leave_nothing_behind() {
    let layers = |low: u8| {
        let part = |n| format!("{{channel: {n}, transpose: {}}}", (n + low) % 13);
        let parts: Vec<String> = (1..=9).chain(11..=16).map(part).collect();
        format!("[{}]", parts.join(", "))
    };
    let songs: String = (0..6)
        .map(|n| format!("- {{song: S{n}, tuning: equal-12, parts: {}}}\n", layers(n)))
        .collect();
    let mut rig = Rig::of(&format!("{DEVICES}set:\n{songs}"));
    for place in 0..6u8 {
        rig.tell(&format!("song {}", place + 1));
        rig.midi(0, &[0x90, 40 + 5 * place, 100]);
        rig.midi(0, &[0xB0, 64, 127]);
        rig.until(rig.now + trued::time::Span::from_millis(50));
    }
    for place in 0..6u8 {
        rig.midi(0, &[0x80, 40 + 5 * place, 100]);
    }
    rig.midi(0, &[0xB0, 64, 0]);
    rig.until(Time::from_millis(9_000));
    let heard = rig.heard();
    assert_eq!(heard.notes.len(), 6 * 15);
    assert!(heard.stuck().is_empty() && heard.sounding().is_empty() && heard.orphans.is_empty());
}
