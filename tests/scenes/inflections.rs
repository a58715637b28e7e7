//! Other places of keys, flipped while playing (needs N01, N11, N14), by line (N12).
//!
//! Cents of ratios: 9/8 is 203.910, 4/3 498.045, 10/9 182.404, 27/16 905.865 (Ptolemy and the just scales, as printed in
//! every table; the 10/9 below 9/8 by 21.506, the syntonic comma).

use crate::support::rig::Rig;
use crate::support::script::assert_heard;

const BAYATI: &str = "
keyboards: {keys: {port: virtual}, pads: {port: virtual}}
synths: {synth: {port: virtual, tail_ms: 0}}
tunings:
  bayati:
    tonic: D
    notes: {D: 1/1, E: 145 c, F: 32/27, G: 4/3, A: 3/2, Bb: 792 c, B: 850 c, C: 16/9}
    also: {E: {natural: 9/8, flat: 90 c}, G: {flat: 400 c}, B: {natural: 27/16}}
    turns: {saba: {G: flat, E: home}, wide: {E: natural, B: natural}}
";

/// D is the reference here, so that every place is its ratio above a D of equal temperament.
fn samai(song: &str, cues: &str) -> Rig {
    Rig::of(&format!(
        "{BAYATI}pitch: D4 = 293.664768 Hz\n\
         set: [{{song: Samai, tuning: bayati{song}}}, {{song: Longa, tuning: bayati}}, {{song: Plain}}]\n\
         cues: [{cues}]\n"
    ))
}

#[test]
fn n01_a_key_is_flipped_from_the_next_note_on_and_held_notes_stay() {
    let mut rig = samai("", "");
    assert_heard(
        &rig.play(
            "0 on E4 90
             10 tell inflect E natural
             20 on E5 90
             30 off E4
             40 off E5
             50 on E4 90
             60 off E4
             70 tell inflect E home
             80 on E3 90
             90 off E3",
        ),
        "0 63 sounds 6345.0
         20 76 sounds 7603.9
         30 63 ends
         40 76 ends
         50 64 sounds 6403.9
         60 64 ends
         80 51 sounds 5145.0
         90 51 ends",
    );
}

#[test]
fn n01_momentary_under_a_pad_while_others_stay_latched() {
    let mut rig = samai(
        "",
        "{when: {note: D2, from: pads}, do: inflect B natural, while: held},\
         {when: {note: E2, from: pads}, do: turn saba},\
         {when: {controller: 67}, do: inflect G home, while: held}",
    );
    assert_heard(
        &rig.play(
            "0 second on E2 90
             10 second off E2
             20 second on D2 90
             30 on G4 90
             40 on B4 90
             50 second off D2
             60 off B4
             70 on B4 90
             80 off B4
             90 off G4
             100 cc 67 127
             110 on G4 90
             120 off G4
             130 cc 67 0
             140 on G4 90
             150 off G4",
        ),
        "30 66 sounds 6600.0
         40 71 sounds 7105.9
         60 71 ends
         70 71 sounds 7050.0
         80 71 ends
         90 66 ends
         110 67 sounds 6698.0
         120 67 ends
         140 66 sounds 6600.0
         150 66 ends",
    );
}

#[test]
fn a_lost_keyboard_lets_go_what_its_pads_held() {
    let mut rig = samai(
        "",
        "{when: {note: D2, from: pads}, do: inflect B natural, while: held}",
    );
    assert_heard(
        &rig.play(
            "0 second on D2 90
             10 second lost
             20 on B4 90
             30 off B4",
        ),
        "20 71 sounds 7050.0
         30 71 ends",
    );
}

#[test]
fn one_key_alone_several_at_once_and_all_home() {
    let mut rig = samai("", "");
    assert_heard(
        &rig.play(
            "0 tell inflect B4 natural
             10 on B4 90
             20 on B5 90
             30 off B4
             40 off B5
             50 tell turn wide
             60 on E4 90
             70 on B5 90
             80 off E4
             90 off B5
             100 tell inflect home
             110 on E4 90
             120 on B4 90
             130 off E4
             140 off B4",
        ),
        "10 71 sounds 7105.9
         20 83 sounds 8250.0
         30 71 ends
         40 83 ends
         60 64 sounds 6403.9
         70 83 sounds 8305.9
         80 64 ends
         90 83 ends
         110 63 sounds 6345.0
         120 71 sounds 7050.0
         130 63 ends
         140 71 ends",
    );
}

#[test]
fn n11_a_place_is_nudged_by_ear_and_the_song_begins_as_it_says() {
    let mut rig = samai(", begin_with: {B: natural}", "");
    assert_heard(
        &rig.play(
            "0 on B4 90
             10 off B4
             20 tell inflect B home
             30 tell inflect B +5 c
             40 tell inflect B -1.5 c
             50 on B4 90
             60 off B4
             70 tell inflect B natural
             80 on B4 90
             90 off B4
             100 tell inflect B home
             110 on B4 90
             120 off B4
             130 next
             140 on B4 90
             150 off B4
             600 back
             610 on B4 90
             620 off B4",
        ),
        "0 71 sounds 7105.9
         10 71 ends
         50 71 sounds 7053.5
         60 71 ends
         80 71 sounds 7109.4
         90 71 ends
         110 71 sounds 7050.0
         120 71 ends
         140 71 sounds 7050.0
         150 71 ends
         610 71 sounds 7105.9
         620 71 ends",
    );
}

/// What stands on E in a tuning on D stands on F# once it is turned to E, in the song or in the tuning.
#[test]
fn a_tuning_that_is_turned_takes_its_other_places_along() {
    for (tuning, song) in [
        ("", "tuning: bayati, turned_to: E"),
        ("  on-e: {like: bayati, turned_to: E}\n", "tuning: on-e"),
        (
            "  on-e: {like: bayati, turned_to: E}\n  on-a: {like: on-e, turned_to: A}\n",
            "tuning: on-a, turned_to: E",
        ),
    ] {
        let mut rig = Rig::of(&format!(
            "{BAYATI}{tuning}pitch: E4 = 329.627557 Hz\nset: [{{song: Samai, {song}, begin_with: {{C#: natural}}}}]\n"
        ));
        rig.play("0 tell inflect F# natural\n10 on F#4 90\n20 on C#5 90\n30 tell turn saba\n40 on A4 90\n50 on F#4 90");
        let cents: Vec<i64> = rig
            .onsets
            .iter()
            .map(|(_, o)| o.target.cents().round() as i64)
            .collect();
        assert_eq!(cents, [6604, 7306, 6800, 6545], "{song}");
    }
}

#[test]
fn a_song_without_the_place_counts_it_and_plays_on() {
    let mut rig = samai("", "");
    rig.play("0 song 3\n10 tell inflect E natural\n20 tell turn saba\n30 on E4 90\n40 off E4");
    assert_eq!(rig.engine.report().counters.ignored, 2);
    assert_eq!(
        rig.heard().notes.last().map(|n| n.onset_cents().round()),
        Some(6400.0)
    );
}

#[test]
fn a_key_is_nudged_a_semitone_at_most() {
    let mut rig = samai("", "");
    rig.play("0 tell inflect B +90 c\n10 tell inflect B +20 c\n20 on B4 90");
    assert_eq!(rig.engine.report().counters.ignored, 1);
    assert_eq!(rig.onsets[0].1.target.cents().round(), 7140.0);
}

/// D minor wants A a fifth above D, F major wants it a third above F: the fixed just scale cannot have both.
#[test]
fn n14_the_comma_note_of_a_just_scale_is_chosen_at_once_and_goes_with_the_tonic() {
    let text = |tonic: &str| {
        format!(
            "keyboards: {{keys: {{port: virtual}}}}\n\
             synths: {{synth: {{port: virtual, tail_ms: 0}}}}\n\
             tunings: {{just: {{like: five-limit-scale, also: {{D: {{low: 10/9}}}}, turns: {{minor: {{D: low}}}}}}}}\n\
             set: [{{song: Motet, tuning: just, tonic: {tonic}, pitch: {{key: A4, hz: 440, pin: tonic}}}}]\n"
        )
    };
    let mut rig = Rig::of(&text("C"));
    let heard = rig.play("0 on D4 90\n10 off D4\n20 tell turn minor\n30 on D4 90\n40 off D4");
    assert_heard(
        &heard,
        "0 62 sounds 6203.9\n10 62 ends\n30 62 sounds 6182.4\n40 62 ends",
    );
    // Under another tonic the same degree has it: the second of G is A, and D is the plain fifth.
    let mut rig = Rig::of(&text("G"));
    let heard = rig.play("0 tell turn minor\n10 on A4 90\n20 on D4 90\n30 off A4\n40 off D4");
    assert_heard(
        &heard,
        "10 69 sounds 6882.4\n20 62 sounds 6202.0\n30 69 ends\n40 62 ends",
    );
}

/// The lines of a transcript that tell how E4 sounds.
fn of_e(heard: &str) -> Vec<&str> {
    let sounds = heard.lines().filter(|line| line.contains("sounds"));
    sounds
        .filter(|line| line.contains(" 63 ") || line.contains(" 64 "))
        .collect()
}

#[test]
fn n12_a_key_takes_one_place_upwards_and_another_downwards() {
    let mut rig = samai(", by_line: {E: {up: natural, down: home}}", "");
    let heard = rig.play(
        "0 on D4 90\n90 off D4
         100 on E4 90\n190 off E4
         200 on E4 90\n290 off E4
         300 on F4 90\n390 off F4
         400 on E4 90\n490 off E4
         500 on E4 90\n590 off E4
         600 on D4 90\n650 on E4 90\n690 off D4\n700 off E4
         710 on D2 90\n720 on E4 90\n790 off D2\n791 off E4",
    );
    let onsets = of_e(&heard);
    assert_eq!(
        onsets,
        [
            "100 64 sounds 6403.9", // from below
            "200 64 sounds 6403.9", // repeated
            "400 63 sounds 6345.0", // from above
            "500 63 sounds 6345.0",
            "650 64 sounds 6403.9",
            "720 64 sounds 6403.9", // what is further than an octave away is no melody with it
        ]
    );
}

#[test]
fn n12_a_cue_overrides_the_line_until_the_next_rest() {
    let mut rig = samai(", by_line: {E: {up: natural, down: home}}", "");
    let heard = rig.play(
        "0 on D4 90\n90 off D4
         100 tell inflect E flat
         110 on E4 90\n190 off E4
         200 on F4 90\n290 off F4
         300 on E4 90\n390 off E4
         400 on D4 90\n490 off D4
         1500 on D4 90\n1590 off D4
         1600 on E4 90\n1690 off E4
         3000 on E4 90\n3090 off E4",
    );
    let onsets = of_e(&heard);
    assert_eq!(
        onsets,
        [
            "110 63 sounds 6290.0", // the cue
            "300 63 sounds 6290.0",
            "1600 64 sounds 6403.9", // after a rest the line again
            "3000 63 sounds 6290.0", // after another one it comes from nowhere: as was told
        ]
    );
}
