//! Lamps: what a controller is told while something lasts, when, and how often.

use crate::support::rig::Rig;
use trued::engine::Link;
use trued::stage::Stage;

const TUNINGS: &str = "\
tunings:
  quay:
    tonic: D
    notes: {D: 1/1, E: 145 c, F: 32/27, G: 4/3, A: 3/2, Bb: 792 c, B: 850 c, C: 16/9}
    also: {E: {natural: 9/8}, G: {flat: 400 c}, B: {natural: 27/16}}
    turns: {saba: {G: flat, B: natural}}
  just: {pitches: [1/1, 16/15, 9/8, 6/5, 5/4, 4/3, 45/32, 3/2, 8/5, 5/3, 9/5, 15/8]}
  split: {fifths: {chain: [Ab, Eb, Bb, F, C, G, D, A, E, B, F#, C#, G#], each: narrow 1/4 syntonic}}
songs:
  Samai: {tuning: quay, by_line: {E: {up: natural, down: home}}}
set:
  - Samai
  - {song: Motet, tuning: just}
  - {song: Canzona, tuning: split, black_keys: [G# or Ab], transpose: 2}
  - {song: Tag, intonation: {method: chord-root, ratios: pure-with-7}}
  - Samai
";

/// The lamps' port is the one behind the synth's.
const PORT: usize = 1;

fn text(lamps: &str, cues: &str) -> String {
    format!(
        "keyboards: {{keys: {{port: virtual}}, pads: {{port: virtual, channel: 10}}}}\n\
         synths: {{synth: {{port: virtual, tail_ms: 0}}}}\n{TUNINGS}lamps: [{lamps}]\ncues: [{cues}]\n"
    )
}

fn lamp(show: &str, note: &str) -> String {
    format!("{{show: {show}, send: {{note: {note}, to: pads}}}}")
}

/// What the lamps were told since `mark`.
fn told(rig: &Rig, mark: usize) -> Vec<String> {
    let spelt = |bytes: &[u8]| {
        let bytes: Vec<String> = bytes.iter().map(|b| format!("{b:02X}")).collect();
        bytes.join(" ")
    };
    let lamps = rig.lamps[mark..].iter();
    lamps.map(|sent| spelt(&sent.bytes)).collect()
}

/// Plays, and gives what the lamps were told meanwhile.
fn after(rig: &mut Rig, script: &str) -> Vec<String> {
    let mark = rig.lamps.len();
    rig.play(script);
    told(rig, mark)
}

#[test]
fn a_lamp_is_lit_while_it_lasts_and_told_once() {
    let mut rig = Rig::of(&text(
        &format!("{}, {}", lamp("turn saba", "E2"), lamp("song Samai", "F2")),
        "{when: {note: C2}, do: turn saba}, {when: {note: D2}, do: turn saba, while: held}",
    ));
    // All are said when the port comes, on the keyboard's own channel, the tenth.
    assert_eq!(told(&rig, 0), ["89 28 00", "99 29 7F"]);
    assert_eq!(after(&mut rig, "10 on C2 90\n20 off C2"), ["99 28 7F"]);
    assert_eq!(
        after(&mut rig, "30 on C2 90\n40 off C2\n50 on C4 90\n60 off C4"),
        [""; 0]
    );
    assert_eq!(after(&mut rig, "70 tell inflect G home"), ["89 28 00"]);
    assert_eq!(
        after(&mut rig, "80 tell inflect G flat"),
        ["99 28 7F"],
        "all of it, one by one"
    );
    assert_eq!(after(&mut rig, "90 tell inflect home"), ["89 28 00"]);
    assert_eq!(after(&mut rig, "100 on D2 90"), ["99 28 7F"]);
    assert_eq!(after(&mut rig, "110 off D2"), ["89 28 00"]);
    // At a song change they follow; the last song has the title of the first.
    assert_eq!(
        after(&mut rig, "120 on C2 90\n130 off C2\n140 song 2"),
        ["99 28 7F", "89 28 00", "89 29 00"]
    );
    assert_eq!(after(&mut rig, "150 song 5"), ["99 29 7F"]);
    assert_eq!(after(&mut rig, "160 song 1"), [""; 0]);
}

/// What is shown, in which song of the set; words that light it; words that put it out again.
const SHOWN: [(&str, u8, &str, &str); 28] = [
    ("song 2", 1, "song 2", "song 3"),
    (
        "song Canzona",
        1,
        "next from Samai\nnext from Motet",
        "back",
    ),
    ("plain", 1, "plain", "plain"),
    ("pitch +5 c", 1, "pitch +3 c\npitch +2 c", "pitch +1 c"),
    ("pitch 441 Hz", 1, "pitch 441 Hz", "pitch home"),
    ("pitch home", 1, "", "pitch +1 c"),
    ("transpose +2", 1, "transpose +2", "transpose home"),
    ("transpose +2", 3, "", "transpose home\ntranspose 0"),
    ("transpose home", 3, "", "transpose 0"),
    (
        "inflect E natural",
        1,
        "inflect E natural",
        "inflect E home",
    ),
    (
        "inflect E4 natural",
        1,
        "inflect E4 natural",
        "inflect E home",
    ),
    (
        "inflect E4 natural",
        1,
        "inflect E natural",
        "inflect E4 home",
    ),
    ("inflect E home", 1, "", "inflect E +2 c"),
    ("inflect E home", 1, "", "inflect E natural"),
    ("inflect E +4 c", 1, "inflect E +4 c", "inflect E -1 c"),
    ("inflect home", 1, "", "inflect B4 natural"),
    ("inflect home", 1, "", "turn saba"),
    ("turn saba", 1, "turn saba", "inflect B home"),
    ("black-key Ab", 3, "black-key Ab", "black-key G#"),
    ("black-key G#", 3, "", "black-key Ab"),
    ("tonic D", 2, "tonic D", "tonic home"),
    ("tonic D", 2, "tonic D pivot", "tonic E"),
    ("tonic home", 2, "", "tonic E equal"),
    ("tonic next-key", 2, "tonic next-key pivot", "tonic home"),
    ("root hold", 4, "root hold", "root free"),
    ("root free", 4, "", "root hold"),
    ("sevenths harmonic", 4, "", "sevenths plain"),
    ("home", 1, "pitch +3 c", "turn saba"),
];

#[test]
fn everything_that_lasts_can_be_shown() {
    for (show, song, lights, puts_out) in SHOWN {
        let mut rig = Rig::of(&text(&lamp(show, "E2"), ""));
        let lit = |rig: &Rig| rig.lamps.last().is_some_and(|sent| sent.bytes[0] == 0x99);
        let tell = |rig: &mut Rig, words: &str| {
            words.lines().for_each(|words| {
                // Beyond the deafness to a bounce.
                rig.play(&format!(
                    "{} tell {words}",
                    rig.now.nanos() / 1_000_000 + 500
                ));
            })
        };
        tell(&mut rig, &format!("song {song}"));
        let begun = lit(&rig);
        tell(&mut rig, lights);
        assert!(lit(&rig), "{show} after {lights:?}");
        assert!(
            begun == lights.is_empty() || show == "home",
            "{show} as song {song} begins"
        );
        tell(&mut rig, puts_out);
        assert!(!lit(&rig), "{show} after {puts_out:?}");
        // Never the same twice.
        assert!(
            rig.lamps.windows(2).all(|two| two[0].bytes != two[1].bytes),
            "{show}"
        );
    }
}

#[test]
fn the_line_and_a_key_that_is_waited_for_are_shown_too() {
    let mut rig = Rig::of(&text(
        &format!(
            "{}, {}",
            lamp("inflect E natural", "E2"),
            lamp("root next-key", "F2")
        ),
        "",
    ));
    assert_eq!(
        after(&mut rig, "10 on D4 90\n20 off D4\n30 on E4 90\n40 off E4"),
        ["99 28 7F"]
    );
    assert_eq!(
        after(&mut rig, "50 on F4 90\n60 off F4\n70 on E4 90\n80 off E4"),
        ["89 28 00"]
    );
    assert_eq!(
        after(&mut rig, "1000 song 4\n1010 tell root next-key"),
        ["99 29 7F"]
    );
    assert_eq!(after(&mut rig, "1020 on C4 90"), ["89 29 00"]);
}

#[test]
fn a_lamp_may_have_a_channel_and_a_colour() {
    let rig = Rig::of(&text(
        "{show: song 1, send: {controller: 20, to: pads, value: 5, channel: 3}}, \
         {show: song 2, send: {controller: 20, to: pads, channel: 4}}, \
         {show: pitch home, send: {note: C1, to: keys, value: 9}}",
        "",
    ));
    let mut by_port: Vec<(usize, Vec<u8>)> = Vec::new();
    by_port.extend(
        rig.lamps
            .iter()
            .map(|sent| (sent.synth, sent.bytes.clone())),
    );
    // `keys` is heard on every channel, so its lamps are on the first.
    assert_eq!(
        by_port,
        [
            (PORT, vec![0xB2, 20, 5]),
            (PORT, vec![0xB3, 20, 0]),
            (PORT + 1, vec![0x90, 24, 9])
        ]
    );
}

#[test]
fn a_device_that_comes_back_is_told_all_again_and_one_that_is_away_nothing() {
    let mut rig = Rig::of(&text(
        &format!("{}, {}", lamp("plain", "E2"), lamp("song 1", "F2")),
        "",
    ));
    let mark = rig.lamps.len();
    rig.link(PORT, Link::Down);
    assert_eq!(
        after(&mut rig, "10 tell plain\n20 on C4 90\n30 off C4"),
        [""; 0]
    );
    rig.link(PORT, Link::Back);
    assert_eq!(told(&rig, mark), ["99 28 7F", "99 29 7F"]);
    assert_eq!(after(&mut rig, "5000 wait"), [""; 0], "once is enough");
    assert!(
        rig.heard().stuck().is_empty(),
        "the synth has noticed nothing"
    );
}

#[test]
fn when_trued_stops_all_lamps_go_out_after_the_notes() {
    let mut rig = Rig::of(&text(
        &format!("{}, {}", lamp("plain", "E2"), lamp("song 1", "F2")),
        "",
    ));
    rig.play("10 on C4 90\n20 pedal down");
    let (mark, before) = (rig.lamps.len(), rig.order.len());
    rig.play("30 stop");
    assert_eq!(told(&rig, mark), ["89 29 00"]);
    assert_eq!(
        rig.order[before..].last(),
        Some(&PORT),
        "{:?}",
        &rig.order[before..]
    );
    rig.play("5000 wait");
    assert!(rig.engine.report().stopped);
    assert_eq!(told(&rig, mark).len(), 1);
}

#[test]
fn an_edit_puts_out_what_is_no_lamp_any_more_and_leaves_the_others() {
    let lamps = |all: &[String]| {
        let stage = Stage::parse(std::path::Path::new("x.yaml"), &text(&all.join(", "), ""));
        stage.expect("it loads").plan_offline()
    };
    let (one, two) = (lamp("song 1", "E2"), lamp("pitch home", "F2"));
    let mut rig = Rig::of(&text(&format!("{one}, {two}"), ""));
    let mark = rig.lamps.len();
    rig.plan(&lamps(&[lamp("plain", "G2"), two.clone()]));
    assert_eq!(told(&rig, mark), ["89 28 00", "89 2B 00"]);
    let mark = rig.lamps.len();
    // Another thing shown by the same light.
    rig.plan(&lamps(&[lamp("song 2", "F2")]));
    assert_eq!(told(&rig, mark), ["89 29 00"]);
    rig.plan(&lamps(&[]));
    assert_eq!(told(&rig, mark).len(), 1);
}
