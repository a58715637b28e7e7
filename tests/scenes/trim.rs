//! The reference trimmed in rehearsal and concert, by tenths of a hertz and by cents (need N05).

use crate::support::rig::Rig;

const STAGE: &str = "\
keyboards: {keys: {port: virtual}}
synths: {synth: {port: virtual, tail_ms: 0}}
tunings:
  quay:
    tonic: D
    notes: {D: 1/1, E: 145 c, F: 32/27, G: 4/3, A: 3/2, Bb: 792 c, B: 850 c, C: 16/9}
    also: {E: {natural: 9/8}, B: {natural: 27/16}}
  just: {pitches: [1/1, 16/15, 9/8, 6/5, 5/4, 4/3, 45/32, 3/2, 8/5, 5/3, 9/5, 15/8]}
set:
  - {song: Motet, tuning: just, pitch: A4 = 443 Hz}
  - {song: Samai, tuning: quay, begin_with: {B: natural}}
cues:
  - {when: {controller: 82}, do: pitch +0.1 Hz}
  - {when: {controller: 83}, do: pitch -0.1 Hz now}
  - {when: {controller: 84}, do: pitch +1 c}
  - {when: {controller: 85}, do: pitch home}
";

/// The last note's frequency: A4 = 440 Hz is 6900 cents (MIDI Tuning Standard).
fn hertz(rig: &Rig) -> f64 {
    let (_, onset) = rig.onsets.last().expect("a note");
    440.0 * ((onset.target.cents() - 6900.0) / 1200.0).exp2()
}

fn struck(rig: &mut Rig, script: &str) -> f64 {
    let at_ms = rig.now.nanos() / 1_000_000;
    rig.play(&format!(
        "{script}\n{} on A4 90\n{} off A4",
        at_ms + 900,
        at_ms + 950
    ));
    hertz(rig)
}

#[test]
fn n05_the_reference_goes_by_a_tenth_of_a_hertz_or_by_a_cent() {
    let mut rig = Rig::of(STAGE);
    assert!((struck(&mut rig, "0 wait") - 443.0).abs() < 1e-4);
    // An orchestra has warmed up: half a hertz more, in five steps.
    let warm = struck(
        &mut rig,
        "1000 cc 82 127\n1001 cc 82 0\n1010 cc 82 127\n1011 cc 82 0\n1020 cc 82 127\n1021 cc 82 0\n\
         1030 cc 82 127\n1031 cc 82 0\n1040 cc 82 127\n1041 cc 82 0",
    );
    // Five equal ratios, each a tenth at 443: a ten-thousandth of a hertz over.
    assert!((warm - 443.5).abs() < 3e-4, "{warm}");
    let cents = rig.engine.report().nudge.cents();
    assert!(
        (cents - 1200.0 * (443.5f64 / 443.0).log2()).abs() < 1e-3,
        "{cents}"
    );
    // A step down is as large as one up, and `now` takes what is held along.
    let heard = rig.play("3000 on A4 90\n3010 cc 83 127\n3020 cc 83 0");
    assert!(heard.contains("3010 69 moves to"), "{heard}");
    let back = struck(&mut rig, "3100 off A4\n3110 cc 82 127\n3120 cc 82 0");
    assert_eq!(back, warm);
    let cent = struck(&mut rig, "5000 cc 84 127");
    assert!((1200.0 * (cent / warm).log2() - 1.0).abs() < 1e-6, "{cent}");
    assert!(
        (struck(&mut rig, "6000 cc 85 127") - 443.0).abs() < 1e-4,
        "and home"
    );
}

#[test]
fn n05_the_trim_is_a_ratio_over_all_keys_and_songs_apart_from_the_scale() {
    let every_key = |rig: &mut Rig| -> Vec<i64> {
        let (first, at_ms) = (rig.onsets.len(), rig.now.nanos() / 1_000_000);
        for (count, key) in ["C4", "D4", "E4", "F4", "G4", "A4", "B4"]
            .iter()
            .enumerate()
        {
            let at_ms = at_ms + 20 * count as u64;
            rig.play(&format!(
                "{} on {key} 90\n{} off {key}",
                at_ms + 5,
                at_ms + 15
            ));
        }
        let played = rig.onsets[first..].iter();
        played.map(|(_, onset)| onset.target.microcents()).collect()
    };
    let mut rig = Rig::of(STAGE);
    let motet = every_key(&mut rig);
    rig.play("1000 next");
    let samai = every_key(&mut rig);
    rig.play("2000 tell pitch +0.1 Hz");
    let step = rig.engine.report().nudge.microcents();
    let moved = |all: &[i64]| -> Vec<i64> { all.iter().map(|key| key + step).collect() };
    assert_eq!(every_key(&mut rig), moved(&samai));
    rig.play("3000 back");
    assert_eq!(
        every_key(&mut rig),
        moved(&motet),
        "it stays at a song change"
    );
}
