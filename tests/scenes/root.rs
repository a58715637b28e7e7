//! Root and sevenths by hand, as they are heard.

use crate::support::rig::Rig;

/// The five-limit scale, counted from the root: C-G is pure over C, D-A over D, and otherwise a comma narrow.
const SCALE: &str = "{method: chord-root, ratios: [1/1, 16/15, 9/8, 6/5, 5/4, 4/3, 45/32, 3/2, 8/5, 5/3, 9/5, 15/8]}";
const NARROW: (f64, f64) = (40.0, 27.0);
const PURE: (f64, f64) = (3.0, 2.0);

fn evening(intonation: &str, cues: &str) -> Rig {
    Rig::of(&format!(
        "keyboards: {{keys: {{port: virtual}}}}\n\
         synths: {{organ: {{port: virtual, bend_range: 2}}}}\n\
         cues: [{cues}]\n\
         set: [{{song: Tag, intonation: {intonation}}}, {{song: Next, intonation: {intonation}}}]\n"
    ))
}

/// The outer interval of what sounds, in cents.
fn outer(rig: &Rig) -> f64 {
    let sounding = rig.heard().sounding();
    let pitches = sounding
        .iter()
        .map(|n| n.pitch.last().expect("it sounds").1);
    let (low, high) = pitches.fold((f64::MAX, f64::MIN), |(low, high), cents| {
        (low.min(cents), high.max(cents))
    });
    high - low
}

#[track_caller]
fn assert_outer(rig: &Rig, (over, under): (f64, f64)) {
    // Half a step of a bend range of two semitones, for each of two notes.
    let within = 2.0 * 200.0 / 8192.0 / 2.0 + 1e-6;
    let (heard, wanted) = (outer(rig), 1200.0 * (over / under).log2());
    assert!(
        (heard - wanted).abs() <= within,
        "{heard} is not {over}/{under} ({wanted})"
    );
}

#[test]
fn a_root_is_held_while_the_pedal_is_down() {
    let mut rig = evening(
        SCALE,
        "{when: {controller: 67}, do: root hold, while: held}",
    );
    rig.play("10 chord C4 E4 G4\n20 wait");
    assert_outer(&rig, PURE);
    rig.play("500 cc 67 127\n600 off C4\n600 off E4\n600 off G4\n700 chord D4 F4 A4\n710 wait");
    assert_outer(&rig, NARROW);
    let report = rig.engine.report();
    assert_eq!(
        (report.standing.chord.root, report.root_held),
        (Some(0), true)
    );
    rig.play("1000 cc 67 0\n1100 off D4\n1100 off F4\n1100 off A4\n1200 chord D4 F4 A4\n1210 wait");
    assert_outer(&rig, PURE);
    assert_eq!(rig.engine.report().standing.chord.root, Some(2));
}

#[test]
fn a_root_held_in_silence_is_that_of_the_next_chord() {
    let mut rig = evening(SCALE, "");
    rig.play("10 tell root hold\n20 chord D4 F4 A4\n30 wait");
    assert_outer(&rig, PURE);
    rig.play("500 off D4\n500 off F4\n500 off A4\n600 chord C4 E4 G4\n610 wait");
    assert_outer(&rig, NARROW);
    assert_eq!(rig.engine.report().standing.chord.root, Some(2));
}

#[test]
fn the_next_key_names_the_root_and_is_silent() {
    let mut rig = evening(SCALE, "{when: {controller: 81}, do: root next-key}");
    rig.play("10 cc 81 127\n20 on D2 100\n30 off D2\n40 cc 81 0\n50 chord C4 E4 G4\n60 wait");
    assert_eq!(rig.heard().notes.len(), 3, "D2 sounds nothing");
    assert_outer(&rig, NARROW);
    assert_eq!(rig.engine.report().standing.chord.root, Some(2));
    rig.play(
        "500 tell root free\n600 off C4\n600 off E4\n600 off G4\n700 chord C4 E4 G4\n710 wait",
    );
    assert_outer(&rig, PURE);
}

#[test]
fn a_held_root_ends_with_its_song() {
    let mut rig = evening(SCALE, "");
    rig.play("10 chord D4 F4 A4\n100 tell root hold\n200 off D4\n200 off F4\n200 off A4\n300 next");
    rig.play("900 chord C4 E4 G4\n910 wait");
    assert_outer(&rig, PURE);
    assert!(!rig.engine.report().root_held);
}

#[test]
fn sevenths_are_harmonic_while_the_pedal_is_down_and_one_that_sounds_stays() {
    let pedal = "{when: {controller: 67}, do: sevenths harmonic, while: held}";
    let mut rig = evening("chord-root", pedal);
    rig.play("10 cc 67 127\n20 chord G3 B3 D4 F4\n30 wait");
    assert_outer(&rig, (7.0, 4.0));
    rig.play("500 cc 67 0\n900 wait");
    assert_outer(&rig, (7.0, 4.0));
    let chord = ["G3", "B3", "D4", "F4"];
    let ends: String = chord.map(|key| format!("1000 off {key}\n")).concat();
    rig.play(&format!("{ends}1500 chord G3 B3 D4 F4\n1510 wait"));
    assert_outer(&rig, (9.0, 5.0));
    // The other way round: a plain one under the fingers is not pulled down by the pedal.
    rig.play("2000 cc 67 127\n2100 on G2 100\n2110 off G2\n2500 wait");
    assert_outer(&rig, (9.0, 5.0));
}
