//! Words of `tell`: what each changes, and what it leaves alone.

use crate::support::rig::Rig;
use crate::support::script::assert_heard;
use trued::engine::Ask;
use trued::stage::Stage;
use trued::stage::words::Words;

/// C is 10 cents high in the first song; the second is equal and two keys up; both at A4 = 415 Hz. The first comes again.
fn evening(dialect: &str) -> Rig {
    Rig::of(&format!(
        "pitch: A4 = 415 Hz\n\
         keyboards: {{keys: {{port: virtual}}, pads: {{port: virtual}}}}\n\
         synths: {{synth: {{port: virtual, dialect: {dialect}}}}}\n\
         tunings: {{crooked: {{offsets: {{C: +10, E: -14}}}}}}\n\
         songs: {{Crooked: {{tuning: crooked}}, Up: {{tuning: equal-12, transpose: 2}}}}\n\
         set: [Crooked, Up, Crooked]\n"
    ))
}

/// Where A4 = 415 Hz puts keys that are equal, from A4 = 440 Hz: 1200 log2(415/440).
const AT_415: f64 = -101.2705;

/// A line of a transcript.
fn sounds(at_ms: u64, number: u8, cents: f64) -> String {
    format!("{at_ms} {number} sounds {:.1}\n", cents + AT_415)
}

fn moves(at_ms: u64, number: u8, cents: f64) -> String {
    format!("{at_ms} {number} moves to {:.1}\n", cents + AT_415)
}

#[test]
fn n05_a_nudge_moves_what_comes_and_now_moves_what_is_held_as_well() {
    let mut rig = evening("channel-bend");
    let heard = rig.play(
        "10 on C4 100
         20 tell pitch +10 c
         30 on F4 100
         40 tell pitch +5 c now
         50 tell pitch home
         60 on G4 100
         70 tell pitch home now",
    );
    let wanted = [
        sounds(10, 59, 6010.0),
        sounds(30, 64, 6510.0),
        moves(40, 59, 6025.0),
        moves(40, 64, 6515.0),
        sounds(60, 66, 6700.0),
        moves(70, 59, 6010.0),
        moves(70, 64, 6500.0),
    ];
    assert_heard(&heard, &wanted.concat());
    assert_eq!(rig.moved.len(), 4, "each move is told for records");
    assert!(rig.heard().repeats.is_empty());
}

#[test]
fn notes_of_one_channel_move_with_one_bend() {
    for dialect in ["channel-bend", "mpe"] {
        let mut rig = evening(dialect);
        rig.play("10 on C4 100\n10 on C5 100\n10 on C3 100");
        let mark = rig.sent.len();
        rig.play("20 tell pitch +7 c now");
        let sent = rig.sent_since(mark);
        assert!(sent.len() == 1 && sent[0].starts_with('E'), "{sent:?}");
        let mark = rig.sent.len();
        rig.play("30 tell pitch home\n40 tell pitch +7 c now");
        assert_eq!(
            rig.sent_since(mark),
            Vec::<String>::new(),
            "they are there already"
        );
    }
}

#[test]
fn what_a_pedal_holds_on_a_plain_synth_moves_too_and_a_tail_does_not() {
    let heard = evening("channel-bend").play(
        "10 on D4 100
         20 pedal down
         30 off D4
         40 tell pitch +20 c now
         50 pedal up
         60 tell pitch +20 c now",
    );
    let end = heard.lines().filter(|line| line.contains("moves")).count();
    assert_eq!(end, 1, "{heard}");
    assert!(heard.contains(&moves(40, 61, 6220.0)), "{heard}");
}

#[test]
fn n05_a_nudge_to_a_frequency_goes_by_the_song_s_own_reference() {
    let mut rig = evening("channel-bend");
    let heard = rig.play("10 tell pitch 416 Hz\n20 on A4 100\n30 off A4\n500 next\n600 on G4 100");
    // 1200 log2(416/440); in the second song two keys up, so G4 sounds the same.
    let at_416 = 1200.0 * (416f64 / 440.0).log2();
    let line = |at_ms: u64| format!("{at_ms} 68 sounds {:.1}\n", 6900.0 + at_416);
    let wanted = [line(20), String::from("30 68 ends\n"), line(600)];
    assert_heard(&heard, &wanted.concat());
}

#[test]
fn a_held_note_out_of_reach_stops_at_the_end_of_the_range_and_is_counted() {
    let mut rig = evening("channel-bend");
    let heard = rig.play("10 on D4 100\n20 tell pitch +400 c now\n30 tell pitch home now");
    // 8191 of 8192 steps of 200 cents above note 61.
    let end = 6100.0 + 200.0 * 8191.0 / 8192.0;
    let wanted = [
        sounds(10, 61, 6200.0),
        format!("20 61 moves to {end:.1}\n"),
        moves(30, 61, 6200.0),
    ];
    assert_heard(&heard, &wanted.concat());
    assert_eq!(rig.engine.report().counters.clipped, 1);
}

#[test]
fn a_nudge_beyond_an_octave_is_refused() {
    let mut rig = evening("mpe");
    rig.play("10 tell pitch +1000 c\n20 tell pitch +1000 c");
    let report = rig.engine.report();
    assert_eq!(report.nudge.cents(), 1000.0);
    assert_eq!(report.counters.ignored, 1);
}

#[test]
fn transposition_leaves_held_notes_and_goes_home_to_the_song_s_own() {
    let mut rig = evening("channel-bend");
    let heard = rig.play(
        "10 on D4 100
         20 tell transpose +3
         30 on G4 100
         40 off D4
         50 off G4
         60 tell transpose home
         70 on D4 100
         80 off D4
         500 next
         510 tell transpose -1
         520 on D4 100
         530 off D4
         540 tell transpose home
         550 on D4 100",
    );
    for line in [
        sounds(10, 61, 6200.0),
        sounds(30, 69, 7000.0),
        sounds(70, 61, 6200.0),
        sounds(520, 60, 6100.0),
        sounds(550, 63, 6400.0),
    ] {
        assert!(heard.contains(&line), "{line} in\n{heard}");
    }
    assert!(!heard.contains("moves"), "{heard}");
}

#[test]
fn plain_is_equal_at_the_evening_s_reference_until_it_is_told_again() {
    let mut rig = evening("channel-bend");
    let heard = rig.play(
        "10 on C4 100
         20 tell plain
         30 on E4 100
         500 tell song 3
         510 on C5 100
         520 tell plain
         530 on E5 100",
    );
    let wanted = [
        sounds(10, 59, 6010.0),
        sounds(30, 63, 6400.0),
        sounds(510, 71, 7200.0),
        sounds(530, 75, 7586.0),
    ];
    assert_heard(&heard, &wanted.concat());
}

#[test]
fn home_is_the_song_as_it_begins_and_keeps_the_nudge() {
    let mut rig = evening("channel-bend");
    rig.play(
        "10 tell song 2\n20 tell transpose +5\n30 tell plain\n40 tell pitch +3 c\n50 tell home",
    );
    let report = rig.engine.report();
    assert_eq!(
        (
            report.song,
            report.transpose_keys,
            report.plain,
            report.nudge.cents()
        ),
        (1, 2, false, 3.0)
    );
}

#[test]
fn fresh_is_as_if_started_anew_and_leaves_what_sounds() {
    let mut rig = evening("channel-bend");
    let heard = rig.play(
        "10 tell song 2
         20 tell transpose +5
         30 tell plain
         40 tell pitch +3 c
         50 on C4 100
         60 tell fresh
         70 on C5 100",
    );
    let wanted = [sounds(50, 64, 6503.0), sounds(70, 71, 7210.0)];
    assert_heard(&heard, &wanted.concat());
    let report = rig.engine.report();
    assert_eq!(
        (
            report.song,
            report.transpose_keys,
            report.plain,
            report.nudge.cents()
        ),
        (0, 0, false, 0.0)
    );
}

#[test]
fn next_from_a_song_that_is_over_is_refused() {
    let mut rig = evening("channel-bend");
    rig.play("10 tell next from Up");
    assert_eq!(
        (
            rig.engine.report().song,
            rig.engine.report().counters.ignored
        ),
        (0, 1)
    );
    rig.play("20 tell next from Crooked");
    assert_eq!(rig.engine.report().song, 1);
    rig.play("500 tell next from Crooked");
    assert_eq!(
        (
            rig.engine.report().song,
            rig.engine.report().counters.ignored
        ),
        (1, 2)
    );
    // It stands in the set twice, and the second time it is the last.
    rig.play("1000 tell song 3\n1500 tell next from Crooked");
    assert_eq!(
        (
            rig.engine.report().song,
            rig.engine.report().counters.ignored
        ),
        (2, 3)
    );
}

#[test]
fn what_is_for_the_desk_is_handed_on_and_nothing_is_sent() {
    let mut rig = evening("channel-bend");
    let mark = rig.sent.len();
    rig.play("10 tell reload\n20 tell stop");
    let asked: Vec<Ask> = rig.asked.iter().map(|(_, ask)| *ask).collect();
    assert_eq!(asked, [Ask::Reload, Ask::Stop]);
    assert_eq!(rig.sent.len(), mark);
}

/// Note-offs, then pedals, then All Notes Off and All Sound Off, on every channel that trued uses there.
#[test]
fn panic_is_said_in_order_and_changes_no_state() {
    for (dialect, channels) in [("channel-bend", 0..16), ("mpe", 0..1)] {
        let mut rig = evening(dialect);
        rig.play("10 tell song 2\n20 tell transpose +5\n30 tell pitch +3 c\n40 pedal down\n50 on C4 100\n50 on D4 90");
        let before = rig.engine.report();
        let mark = rig.sent.len();
        rig.play("100 panic");
        let after = rig.engine.report();
        assert_eq!(
            (after.song, after.transpose_keys, after.nudge, after.plain),
            (
                before.song,
                before.transpose_keys,
                before.nudge,
                before.plain
            )
        );
        let sent = rig.sent_since(mark);
        let place = |wanted: String| {
            let found = sent.iter().position(|message| message.starts_with(&wanted));
            found.unwrap_or_else(|| panic!("{dialect}: no {wanted} in {sent:?}"))
        };
        let offs: Vec<usize> = (0..sent.len())
            .filter(|at| sent[*at].starts_with('8'))
            .collect();
        assert_eq!(offs.len(), 2, "{dialect}");
        for channel in channels {
            for pedal in ["40", "42", "43", "45"] {
                let lifted = place(format!("B{channel:X} {pedal} 00"));
                assert!(offs.iter().all(|off| *off < lifted), "{dialect}: {sent:?}");
                let silent = place(format!("B{channel:X} 7B 00"));
                assert!(lifted < silent && silent < place(format!("B{channel:X} 78 00")));
            }
        }
        assert!(rig.heard().sounding().is_empty());
        // The two last go to every channel, whatever MPE thinks of it.
        let last = |message: &[u8]| [123, 120].contains(&message[1]);
        let prohibited = &rig.heard().prohibited;
        assert!(
            prohibited.iter().all(|fault| last(&fault.message)),
            "{prohibited:02X?}"
        );
        assert!(rig.heard().setups > 0);
    }
}

#[test]
fn words_that_cannot_be_followed_say_why() {
    let stage = evening("mpe").stage.expect("of a stage file");
    for (words, wrong, right) in [
        (
            "song Croked",
            "no song of the set is called `Croked`",
            "did you mean `Crooked`?",
        ),
        (
            "next from Upp",
            "no song of the set is called `Upp`",
            "did you mean `Up`?",
        ),
        (
            "song 4",
            "there is no song 4",
            "the songs of the set are 1 to 3",
        ),
        (
            "song",
            "`song` alone takes its number from a program change",
            "write `song 3`, `song TITLE`, or `when: {program: any}`",
        ),
        (
            "resend harp",
            "no synth is called `harp`",
            "write `resend` for all, or synth",
        ),
        (
            "pitch 44 Hz",
            "44 Hz is more than an octave from every song's reference",
            "name the frequency of the reference key, as in `pitch 416 Hz`",
        ),
        (
            "pitch +1300 c",
            "this nudge is more than an octave",
            "a nudge goes an octave up or down at most, as in `pitch +1 c`",
        ),
        (
            "keep",
            "these words are understood but not played by this version",
            "it plays next, back, song, pitch, transpose, tonic, inflect, turn, black-key, root, sevenths, plain, home, resend, panic, fresh, reload and stop",
        ),
    ] {
        let parsed = Words::parse(words).expect(words);
        let mistake = Stage::resolve(&stage, &parsed).expect_err(words);
        assert_eq!(
            (mistake.wrong.as_str(), mistake.right.as_str()),
            (wrong, right),
            "{words}"
        );
    }
}
