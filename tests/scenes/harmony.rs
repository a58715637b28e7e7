//! Just intonation that follows the chord, as it is heard.

use crate::support::rig::Rig;
use crate::support::script::assert_heard;

/// A rig for a song with this intonation, in a tuning; the second song is plainly equal.
fn following(tuning: &str, intonation: &str) -> Rig {
    with_parts(tuning, intonation, "")
}

fn with_parts(tuning: &str, intonation: &str, parts: &str) -> Rig {
    Rig::of(&format!(
        "keyboards: {{keys: {{port: virtual}}, pads: {{port: virtual}}}}\n\
         synths: {{organ: {{port: virtual, bend_range: 2}}}}\n\
         {parts}\n\
         tunings: {{crooked: {{like: equal-12, change: {{E: -50 c}}}}}}\n\
         set:\n\
         - {{song: First, tuning: {tuning}, intonation: {intonation}}}\n\
         - {{song: Second, tuning: equal-12, intonation: chord-root}}\n"
    ))
}

/// Where the notes that still sound stand now, in cents, from the lowest number up.
fn sounding(rig: &Rig) -> Vec<(u8, f64)> {
    let mut notes: Vec<(u8, f64)> = rig
        .heard()
        .sounding()
        .iter()
        .map(|note| (note.number, note.pitch.last().expect("it sounds").1))
        .collect();
    notes.sort_by_key(|(number, _)| *number);
    notes
}

/// Cents between two of the notes that sound.
fn interval(rig: &Rig, low: usize, high: usize) -> f64 {
    let notes = sounding(rig);
    notes[high].1 - notes[low].1
}

fn just(over: f64, under: f64) -> f64 {
    1200.0 * (over / under).log2()
}

/// Half a step of a bend range of two semitones, for each of two notes.
const STEP_CENTS: f64 = 2.0 * 200.0 / 8192.0 / 2.0 + 1e-6;

fn assert_just(rig: &Rig, low: usize, high: usize, over: f64, under: f64) {
    let heard = interval(rig, low, high);
    let wanted = just(over, under);
    assert!(
        (heard - wanted).abs() <= STEP_CENTS,
        "{heard} is not {over}/{under} ({wanted})"
    );
}

#[test]
fn a_chord_is_pure_from_its_first_sample() {
    assert_heard(
        &following("equal-12", "chord-root").play("10 chord C4 E4 G4\n900 off C4\n900 off E4"),
        "10 60 sounds 6003.9
         10 64 sounds 6390.2
         10 67 sounds 6705.9
         900 60 ends
         900 64 ends",
    );
}

#[test]
fn a_chord_that_is_spread_by_hands_is_as_pure_once_it_is_whole() {
    let mut rig = following("equal-12", "chord-root");
    rig.play("10 on E4 100\n25 on G4 100\n40 on C4 100\n41 wait");
    assert_just(&rig, 0, 1, 5.0, 4.0);
    assert_just(&rig, 0, 2, 3.0, 2.0);
    let moved = rig.heard().notes.iter().flat_map(|note| &note.pitch[1..]);
    assert!(
        moved.into_iter().all(|(at, _)| at.as_millis() <= 40),
        "jumped, nothing glides"
    );
}

#[test]
fn a_held_note_glides_a_little_and_the_newcomers_come_to_it() {
    let mut rig = following("equal-12", "chord-root");
    // C E G, then A under the held C and E.
    rig.play("10 chord C4 E4 G4\n1000 off G4\n1000 on A3 100\n1900 wait");
    let held: Vec<_> = rig
        .heard()
        .notes
        .iter()
        .filter(|n| n.number == 60)
        .collect();
    let path = &held[0].pitch;
    let far = (path.last().expect("it sounds").1 - path[0].1).abs();
    assert!(far <= 6.01, "{path:?}");
    for pair in path.windows(2) {
        assert!(
            (pair[1].1 - pair[0].1).abs() <= 1.03,
            "a step of a cent at most: {path:?}"
        );
    }
    // A minor, pure within the dead band.
    assert!((interval(&rig, 0, 1) - just(6.0, 5.0)).abs() < 1.1);
    assert!((interval(&rig, 0, 2) - just(3.0, 2.0)).abs() < 1.1);
}

#[test]
fn every_triad_on_every_root_is_pure_in_a_scale_that_has_wolves() {
    for root in 48..60u8 {
        for third in [3u8, 4] {
            let mut rig = following("five-limit-scale", "chord-root");
            let keys = [root, root + third, root + 7];
            let chord: Vec<u8> = keys.iter().flat_map(|key| [0x90, *key, 100]).collect();
            rig.until(trued::time::Time::from_millis(10));
            rig.midi(0, &chord);
            let (over, under) = if third == 4 { (5.0, 4.0) } else { (6.0, 5.0) };
            assert_just(&rig, 0, 1, over, under);
            assert_just(&rig, 0, 2, 3.0, 2.0);
        }
    }
}

#[test]
fn the_same_scale_at_rest_has_its_wolf() {
    let mut rig = following("five-limit-scale", "fixed");
    rig.play("10 chord E4 G#4 B4\n20 wait");
    assert_just(&rig, 0, 1, 32.0, 25.0);
    let mut rig = following("five-limit-scale", "fixed");
    rig.play("10 chord C4 E4 G4\n20 wait");
    assert_just(&rig, 0, 1, 5.0, 4.0);
}

#[test]
fn a_neutral_key_is_left_alone_and_not_counted() {
    let mut rig = following("crooked", "chord-root");
    rig.play("10 chord C4 E4 G4\n20 wait");
    let notes = sounding(&rig);
    assert!((notes[1].1 - 6350.0).abs() < STEP_CENTS, "{notes:?}");
    assert_just(&rig, 0, 2, 3.0, 2.0);
    assert_eq!(rig.engine.report().standing.chord.root, Some(0));
}

#[test]
fn notes_of_the_last_song_are_no_harmony_for_the_next() {
    let mut rig = following("five-limit-scale", "fixed");
    rig.play("10 on E4 100\n500 next\n600 chord C4 G4\n700 wait");
    let notes = sounding(&rig);
    // As C and G alone would stand: their mean at rest.
    assert!((notes[0].1 - 6000.0 + 0.98).abs() < STEP_CENTS, "{notes:?}");
    assert_just(&rig, 0, 2, 3.0, 2.0);
}

#[test]
fn a_tag_ends_on_four_five_six_seven() {
    let mut rig = following("equal-12", "{method: chord-root, ratios: pure-with-7}");
    rig.play("10 chord G3 B3 D4 F4\n20 wait");
    assert_just(&rig, 0, 1, 5.0, 4.0);
    assert_just(&rig, 0, 2, 3.0, 2.0);
    assert_just(&rig, 0, 3, 7.0, 4.0);
    let shape: Vec<u32> = rig.engine.report().standing.chord.ratio().collect();
    assert_eq!(shape, [4, 5, 6, 7]);
}

/// Thirds and sevenths as singers want them, and the pitch where it was: C, Am, Dm and G7, eight times round. Pure, they
/// sink by 81/80 each time, 21.506 cents; the usual leash keeps them.
#[test]
fn n13_pure_thirds_and_sevenths_without_drift() {
    // Each with its root below, and how far its third is above that.
    const CHORDS: [([u8; 4], (f64, f64)); 4] = [
        ([48, 64, 67, 72], (5.0, 2.0)),
        ([45, 60, 64, 69], (12.0, 5.0)),
        ([50, 65, 69, 74], (12.0, 5.0)),
        ([43, 59, 62, 65], (5.0, 2.0)),
    ];
    let farthest_c = |leash: &str| {
        let mut rig = following(
            "equal-12",
            &format!("{{method: chord-root, ratios: pure-with-7, drift_limit_cents: {leash}}}"),
        );
        let mut went: f64 = 0.0;
        for chord in 0..32 {
            let (keys, (over, under)) = CHORDS[chord % 4];
            rig.midi(0, &keys.map(|key| [0x90, key, 90]).concat());
            assert_just(&rig, 0, 1, over, under);
            if chord % 4 == 0 {
                went = went.max((sounding(&rig)[0].1 - 4800.0).abs());
            }
            rig.until(rig.now + trued::time::Span::from_millis(400));
            rig.midi(0, &keys.map(|key| [0x80, key, 64]).concat());
        }
        // The tag, after a breath.
        rig.until(rig.now + trued::time::Span::from_millis(4_000));
        rig.midi(0, &[48, 64, 67, 70].map(|key| [0x90, key, 90]).concat());
        assert_just(&rig, 0, 1, 5.0, 2.0);
        assert_just(&rig, 0, 3, 7.0, 2.0);
        went
    };
    let (leashed, free) = (farthest_c("12"), farthest_c("none"));
    assert!(leashed <= 12.0 && free > 40.0, "{leashed} and {free}");
}

#[test]
fn a_seventh_that_is_held_or_struck_again_keeps_its_size() {
    for again in ["", "1000 off F4\n1000 on F4 100\n"] {
        let mut rig = following("equal-12", "{method: chord-root, ratios: pure-with-7}");
        rig.play(&format!(
            "10 chord D4 F4 A4\n1000 off D4\n1000 off A4\n{again}1000 chord G3 B3 D4\n1900 wait"
        ));
        let notes = sounding(&rig);
        let seventh = notes[3].1 - notes[0].1;
        assert!(
            seventh > 990.0,
            "{again:?}: {seventh} is no 7/4 (968.8): {notes:?}"
        );
    }
}

#[test]
fn a_pedal_point_is_the_rock_the_others_tune_to() {
    let mut rig = following("equal-12", "chord-root");
    rig.play(
        "10 on C3 100
         4000 chord E4 G4
         5000 off E4
         5000 off G4
         5000 chord F4 A4
         6000 off F4
         6000 off A4
         6000 chord E4 G4
         6900 wait",
    );
    let rock = &rig.heard().notes[0].pitch;
    let spread = rock.iter().map(|(_, cents)| (cents - rock[0].1).abs());
    assert!(spread.fold(0.0, f64::max) < 2.5, "{rock:?}");
    assert!((interval(&rig, 0, 1) - 1200.0 - just(5.0, 4.0)).abs() < 1.1);
}

#[test]
fn a_drone_stands_at_rest_and_a_melody_may_follow_uncounted() {
    let parts = |follow: &str| {
        format!(
            "parts:\n- {{from: keys, to: organ}}\n- {{from: pads, to: organ, follow: {follow}}}"
        )
    };
    let mut rig = with_parts("equal-12", "chord-root", &parts("no"));
    rig.play("10 second on E4 100\n20 chord C4 G4\n30 wait");
    assert!((sounding(&rig)[1].1 - 6400.0).abs() < STEP_CENTS);
    assert_eq!(
        rig.engine
            .report()
            .standing
            .chord
            .ratio()
            .collect::<Vec<_>>(),
        [2, 3]
    );

    let mut rig = with_parts("equal-12", "chord-root", &parts("uncounted"));
    rig.play("10 chord C4 G4\n20 second on E4 100\n30 wait");
    assert_just(&rig, 0, 1, 5.0, 4.0);
    assert_eq!(
        rig.engine
            .report()
            .standing
            .chord
            .ratio()
            .collect::<Vec<_>>(),
        [2, 3]
    );
}

#[test]
fn where_no_channel_is_free_a_note_goes_along_and_is_counted() {
    // Two channels for three pitch classes.
    let text = "synths: {organ: {port: virtual, channels: 1-2, bend_range: 2}}\n\
                set: [{song: First, tuning: equal-12, intonation: chord-root}]\n";
    let mut rig = Rig::of(text);
    rig.play("10 chord C4 E4\n500 on G4 100\n600 wait");
    let counters = rig.engine.report().counters;
    assert_eq!(counters.stolen + counters.moved_along, 1, "{counters:?}");
}

#[test]
fn the_root_outlasts_a_note_off() {
    let mut rig = following("equal-12", "chord-root");
    rig.play("10 chord C4 E4 G4\n500 off C4\n600 wait");
    assert_eq!(rig.engine.report().standing.chord.root, Some(0));
}

#[test]
fn where_limits_collide_drift_holds_first_then_held_notes_and_purity_gives_way() {
    let mut rig = following(
        "equal-12",
        "{method: chord-root, drift_limit_cents: 3, hold_limit_cents: 4}",
    );
    // Common tones held: every round would sink by a comma, 21.5 cents.
    let changes: [(&[u8], &[u8]); 4] = [
        (&[50, 65, 69], &[43, 59, 67]),
        (&[43, 59, 62], &[48, 60, 64]),
        (&[48, 67], &[45, 69]),
        (&[45, 60, 64], &[50, 62, 65]),
    ];
    let mut impure: f64 = 0.0;
    rig.play("10 chord D3 D4 F4 A4\n900 wait");
    for n in 0..24 {
        let (offs, ons) = changes[n % 4];
        let before = sounding(&rig);
        let offs = offs.iter().flat_map(|key| [0x80, *key, 64]);
        let ons = ons.iter().flat_map(|key| [0x90, *key, 100]);
        rig.midi(0, &offs.chain(ons).collect::<Vec<u8>>());
        impure = impure.max(impurity(&rig));
        rig.until(rig.now + trued::time::Span::from_millis(900));
        // While held notes glide the mean may be a little over for a moment.
        let drift = rig.engine.report().standing.drift.cents();
        assert!(drift.abs() <= 3.1, "{drift} in chord {n}");
        for (number, stands) in sounding(&rig) {
            let held = before.iter().find(|(held, _)| *held == number);
            let moved = held.map_or(0.0, |(_, stood)| (stands - stood).abs());
            assert!(moved <= 4.1, "{number} moved by {moved} in chord {n}");
        }
    }
    assert!(impure > 2.0, "it was never put to the test: {impure}");
}

/// How far the worst third or fifth of a triad that sounds is from just.
fn impurity(rig: &Rig) -> f64 {
    let notes = sounding(rig);
    let mut worst: f64 = 0.0;
    for (place, low) in notes.iter().enumerate() {
        for high in &notes[place + 1..] {
            let (over, under) = match (high.0 - low.0) % 12 {
                0 => (1.0, 1.0),
                3 => (6.0, 5.0),
                4 => (5.0, 4.0),
                5 => (4.0, 3.0),
                7 => (3.0, 2.0),
                8 => (8.0, 5.0),
                9 => (5.0, 3.0),
                _ => continue,
            };
            let octaves = ((high.0 - low.0) / 12) as f64 * 1200.0;
            worst = worst.max((high.1 - low.1 - octaves - just(over, under)).abs());
        }
    }
    worst
}
