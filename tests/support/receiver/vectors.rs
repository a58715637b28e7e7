//! The receiver against printed examples and rules of the standards, so that it may judge others.
//! Sources: M1 = MIDI 1.0 detailed specification 4.2.1, MPE = MPE 1.1 (2.1.2 examples: MPE 1.0), GM2 = General MIDI 2
//! 1.2a, RP15 = RP-015. "Computed" is arithmetic from the formula named.

use super::*;
use crate::support::hex;

const TAIL: Duration = Duration::from_millis(1000);

fn ms(millis: u64) -> Duration {
    Duration::from_millis(millis)
}

/// Plain synths power on at GM's range of 2 (GM1 p. 3) here, as the vectors assume.
fn after(kind: Kind, steps: &[(u64, &str)]) -> Receiver {
    let mut receiver = Receiver::new(kind, TAIL, 2);
    for (at, bytes) in steps {
        receiver.hear(ms(*at), &hex(bytes));
    }
    receiver
}

fn close(heard: f64, wanted: f64) {
    assert!((heard - wanted).abs() < 1e-3, "{heard}, not {wanted}");
}

const LOWER_7: &str = "B0 79 00 64 06 65 00 06 07"; // MPE 1.0, 2.1.2.1 printed

#[test]
fn bends_decode_as_printed() {
    // M1 p. 19 (ends and centre), MPE C.4 (9387 at 48); the rest computed from MPE C.3 turned round.
    for (semitones, bend, cents) in [
        (2, "00 40", 0.0),
        (2, "00 00", -200.0),
        (2, "7F 7F", 199.97559),
        (48, "2B 49", 700.1953),
        (2, "00 50", 50.0),
        (24, "2B 41", 50.0977),
        (48, "55 40", 49.8047),
        (2, "50 40", 1.9531),
        (12, "23 3F", -13.6230),
        (1, "00 20", -50.0),
    ] {
        let range = format!("B0 65 00 64 00 06 {semitones:02X}");
        let r = after(
            Kind::Plain,
            &[(0, &range), (0, &format!("E0 {bend}")), (0, "90 45 64")],
        );
        close(r.notes[0].onset_cents(), 6900.0 + cents);
    }
}

#[test]
fn registered_parameters_set_what_they_name() {
    // M1 p. 17-18.
    let r = after(
        Kind::Plain,
        &[(0, "B1 65 00 64 00 06 30 26 00 65 7F 64 7F")],
    );
    close(r.range_cents(1), 4800.0);
    close(r.range_cents(0), 200.0);
    let fine = |data: &str| {
        let r = after(
            Kind::Plain,
            &[(0, &format!("B0 65 00 64 01 {data}")), (0, "90 45 64")],
        );
        r.notes[0].onset_cents() - 6900.0
    };
    close(fine("06 60 26 00"), 50.0);
    close(fine("06 2B 26 56"), -31.7627); // 432 Hz is -31.767, to the nearest word
    close(fine("06 00 26 00"), -100.0);
    close(fine("06 7F 26 7F"), 99.98779);
    let r = after(Kind::Plain, &[(0, "B0 65 00 64 02 06 43 90 45 64")]);
    close(r.notes[0].onset_cents(), 7200.0);
}

#[test]
fn null_and_non_registered_parameters_keep_data_entry_away() {
    // RPN-null: GM2 3.4.5. RPN-nrpn: M1 p. 17.
    let set = "B0 65 00 64 00 06 02";
    let r = after(Kind::Plain, &[(0, set), (0, "B0 65 7F 64 7F 06 0C")]);
    close(r.range_cents(0), 200.0);
    let r = after(Kind::Plain, &[(0, set), (0, "B0 63 01 62 08 06 0C")]);
    close(r.range_cents(0), 200.0);
}

#[test]
fn the_upper_half_zeroes_the_lower() {
    // RPN-msbzero: M1 p. 12.
    let mut r = after(Kind::Plain, &[(0, "B0 65 00 64 00 06 02 26 32")]);
    close(r.range_cents(0), 250.0);
    r.hear(ms(0), &hex("B0 06 02"));
    close(r.range_cents(0), 200.0);
}

#[test]
fn zones_come_out_as_printed() {
    let zones = |steps: &[(u64, &str)]| after(Kind::Mpe, steps).zones();
    let upper_off = "BF 79 00 64 06 65 00 06 00";
    let upper_7 = "BF 79 00 64 06 65 00 06 07";
    let upper_15 = "BF 79 00 64 06 65 00 06 0F";
    assert_eq!(zones(&[(0, LOWER_7), (0, upper_off)]), [7, 0]); // MPE 1.0, 2.1.2.1
    assert_eq!(zones(&[(0, LOWER_7), (0, upper_7)]), [7, 7]); // 2.1.2.2
    assert_eq!(zones(&[(0, upper_15)]), [0, 15]); // 2.1.2.3
    let lower_15 = "B0 65 00 64 06 06 0F";
    assert_eq!(zones(&[(0, lower_15), (0, upper_7)]), [7, 7]); // MPE 2.2.1, computed
    assert_eq!(zones(&[(0, "B4 65 00 64 06 06 05")]), [0, 0]); // no manager: ignored, 2.2.1
    assert_eq!(after(Kind::Plain, &[(0, LOWER_7)]).zones(), [0, 0]);
}

#[test]
fn a_zone_sets_ranges_and_members_share_theirs() {
    // MPE 2.2.5: manager 2, members 48, whatever was told before; the last range told to a member is that of all.
    let mut r = after(Kind::Mpe, &[(0, "B1 65 00 64 00 06 0C"), (0, LOWER_7)]);
    close(r.range_cents(0), 200.0);
    close(r.range_cents(1), 4800.0);
    r.hear(ms(0), &hex("B3 65 00 64 00 06 0C"));
    for member in 1..=7 {
        close(r.range_cents(member), 1200.0);
    }
    close(r.range_cents(0), 200.0);
    close(r.range_cents(8), 200.0);
}

#[test]
fn a_zone_stops_what_sounds_on_channels_that_change_sides() {
    // MPE 2.2.3.
    let r = after(Kind::Mpe, &[(0, "91 3C 64 99 40 64"), (5, LOWER_7)]);
    assert_eq!(r.notes[0].end, Some(ms(5)));
    assert_eq!(r.notes[1].end, None);
    assert_eq!(r.zones_while_sounding, 1);
}

#[test]
fn manager_and_member_bends_add() {
    // MPE C.6 printed: 2 of 2 and 7 of 48 make 9 semitones (900.171 cents by /8192).
    let r = after(
        Kind::Mpe,
        &[(0, LOWER_7), (0, "E0 7F 7F E1 2B 49 91 3C 64")],
    );
    close(r.notes[0].onset_cents(), 6000.0 + 900.1709);
}

#[test]
fn a_released_mpe_note_follows_only_its_manager() {
    // MPE-tail: MPE 2.2.6, also under a pedal.
    let mut r = after(
        Kind::Mpe,
        &[
            (0, LOWER_7),
            (0, "B0 40 7F 91 3C 64"),
            (10, "81 3C 40"),
            (20, "E1 00 50"),
        ],
    );
    assert!(r.moves.is_empty());
    r.hear(ms(30), &hex("E0 00 60"));
    assert_eq!((r.moves.len(), r.moves[0].hold), (1, Hold::Held));
    close(r.notes[0].cents(), 6100.0);
}

#[test]
fn on_a_plain_synth_pedal_and_tail_are_bent_with_their_channel() {
    let mut r = after(
        Kind::Plain,
        &[(0, "B1 40 7F 91 3C 64"), (10, "81 3C 40"), (20, "E1 00 50")],
    );
    assert_eq!(r.moves[0].hold, Hold::Held);
    r.hear(ms(30), &hex("B1 40 00 E1 00 40"));
    assert_eq!(r.moves[1].hold, Hold::Ringing);
    r.hear(ms(30) + TAIL, &hex("E1 00 50"));
    assert_eq!(r.moves.len(), 2, "the tail has died");
}

#[test]
fn a_manager_s_pedal_holds_its_zone_and_a_member_s_does_nothing() {
    // MPE 2.3.1.
    let r = after(
        Kind::Mpe,
        &[(0, LOWER_7), (0, "B0 40 7F 91 3C 64 81 3C 40")],
    );
    assert_eq!(r.notes[0].end, None);
    let r = after(
        Kind::Mpe,
        &[(0, LOWER_7), (3, "B1 40 7F 91 3C 64 81 3C 40")],
    );
    assert_eq!(r.notes[0].end, Some(ms(3)));
    assert_eq!(r.prohibited.len(), 1);
}

#[test]
fn sostenuto_latches_what_is_down() {
    // SOST: GM2 3.3.9.
    let r = after(
        Kind::Plain,
        &[
            (0, "90 3C 64"),
            (1, "B0 42 7F"),
            (2, "90 40 64"),
            (3, "80 3C 40"),
            (4, "80 40 40"),
            (5, "B0 42 00"),
        ],
    );
    assert_eq!(r.notes[0].end, Some(ms(5)));
    assert_eq!(r.notes[1].end, Some(ms(4)));
}

#[test]
fn the_damper_turns_at_64() {
    // PED-thr: M1 p. 12.
    for (value, end) in [("3F", Some(ms(1))), ("40", None)] {
        let r = after(
            Kind::Plain,
            &[(0, &format!("B0 40 {value} 90 3C 64")), (1, "80 3C 40")],
        );
        assert_eq!(r.notes[0].end, end);
    }
}

#[test]
fn all_notes_off_waits_for_the_pedal_and_replaces_no_note_off() {
    // HOLD-ANO: M1 p. A-5; p. 25: never a substitute for note-offs.
    let mut r = after(Kind::Plain, &[(0, "90 3C 64 B0 40 7F"), (1, "B0 7B 00")]);
    assert_eq!(r.notes[0].end, None);
    r.hear(ms(2), &hex("B0 40 00"));
    assert_eq!(r.notes[0].end, Some(ms(2)));
    assert_eq!(r.stuck().len(), 1);
    r.hear(ms(3), &hex("80 3C 40"));
    assert!(r.stuck().is_empty() && r.orphans.is_empty());
}

#[test]
fn all_sound_off_is_at_once_and_leaves_no_tail() {
    // M1 p. 25.
    let r = after(
        Kind::Plain,
        &[(0, "90 3C 64 B0 40 7F"), (1, "B0 78 00"), (2, "E0 00 50")],
    );
    assert_eq!(r.notes[0].end, Some(ms(1)));
    assert!(r.moves.is_empty());
}

#[test]
fn reset_all_controllers_is_that_of_rp_015() {
    let r = after(
        Kind::Plain,
        &[
            (0, "B0 65 00 64 00 06 30 07 50 0A 20 4A 11 0B 30 E0 2B 49"),
            (1, "90 3C 64 B0 79 00"),
        ],
    );
    close(r.notes[0].cents(), 6000.0);
    close(r.range_cents(0), 4800.0);
    let kept = [7, 10, 74, 11].map(|number| r.controller(0, number));
    assert_eq!(kept, [Some(0x50), Some(0x20), Some(0x11), Some(127)]);
    // The pointer is null again: data entry falls on nothing.
    let r = after(Kind::Plain, &[(0, "B0 65 00 64 00 06 02 79 00 06 0C")]);
    close(r.range_cents(0), 200.0);
}

#[test]
fn every_note_on_wants_its_own_note_off() {
    // DUP: M1 p. A-4. VEL0: p. 10.
    let r = after(
        Kind::Plain,
        &[
            (0, "90 3C 64 90 3C 64"),
            (1, "90 3C 00"),
            (2, "80 3C 40 80 3C 40"),
        ],
    );
    assert_eq!(r.doubled.len(), 1);
    assert_eq!([r.notes[0].off, r.notes[1].off], [Some(ms(1)), Some(ms(2))]);
    assert_eq!(r.orphans.len(), 1);
}

#[test]
fn what_is_said_twice_is_counted_but_for_set_ups() {
    let r = after(
        Kind::Plain,
        &[
            (0, "E0 00 50 C0 05 B0 07 64 D0 10"),
            (1, "E0 00 50 C0 05 B0 07 64 D0 10"),
        ],
    );
    assert_eq!(r.repeats.len(), 4);
    let r = after(
        Kind::Plain,
        &[
            (0, "E0 00 50 C0 05 B0 07 64"),
            (1, "B0 65 00 64 00 06 02 E0 00 50 C0 05 B0 07 64"),
            (2, "E0 00 50"),
        ],
    );
    assert_eq!((r.repeats.len(), r.repeats[0].at), (1, ms(2)));
    // After a reset the centre is known: saying it is saying it twice; saying another is not.
    let r = after(Kind::Plain, &[(0, "E0 00 50 B0 79 00 E0 00 40 E0 00 50")]);
    assert_eq!(r.repeats.len(), 1);
}

#[test]
fn power_and_general_midi_resets_forget_everything() {
    // GM1 p. 6; M1 p. 33.
    for reset in ["F0 7E 7F 09 01 F7", "F0 7E 10 09 03 F7", "FF"] {
        let r = after(
            Kind::Plain,
            &[(0, "B0 65 00 64 00 06 30 E0 00 50 90 3C 64"), (1, reset)],
        );
        close(r.range_cents(0), 200.0);
        close(r.bend_cents(0), 0.0);
        assert_eq!(r.notes[0].end, Some(ms(1)));
    }
    let mut r = after(Kind::Plain, &[(0, "90 3C 64")]);
    r.power_cycle(ms(1));
    assert!(r.stuck().is_empty());
}

#[test]
fn polyphonic_pressure_has_no_place_on_a_member() {
    // MPE 2.2.7.
    let r = after(Kind::Mpe, &[(0, LOWER_7), (0, "A3 3C 40")]);
    assert_eq!(r.prohibited.len(), 1);
}
