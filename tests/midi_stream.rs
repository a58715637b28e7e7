//! The byte stream and the parameter sequences, against printed examples and rules.
//!
//! Sources: M1 = MIDI 1.0 detailed specification 4.2.1 (A = additional explanations, T = tables), GM2 = General MIDI 2
//! 1.2a, MPE = MPE 1.1 (zone examples: MPE 1.0, 2.1.2), MTU = MIDI Tuning updated specification.

use crate::support::hex;
use proptest::prelude::*;
use std::fmt::Write;
use trued::midi::{Message, Splitter, parameter};

/// What comes out of a stream, in words.
fn heard(text: &str) -> String {
    let mut splitter = Splitter::new();
    let out: Vec<String> = hex(text)
        .into_iter()
        .filter_map(|byte| splitter.push(byte).map(written))
        .collect();
    out.join(" · ")
}

fn written(message: Message<'_>) -> String {
    match message {
        Message::NoteOn {
            channel,
            key,
            velocity,
        } => format!("on {channel} {key:02X} {velocity:02X}"),
        Message::NoteOff {
            channel,
            key,
            velocity,
        } => format!("off {channel} {key:02X} {velocity:02X}"),
        Message::PolyPressure {
            channel,
            key,
            value,
        } => format!("poly {channel} {key:02X} {value:02X}"),
        Message::Controller {
            channel,
            number,
            value,
        } => format!("cc {channel} {number} {value:02X}"),
        Message::Program { channel, number } => format!("program {channel} {number:02X}"),
        Message::Pressure { channel, value } => format!("pressure {channel} {value:02X}"),
        Message::PitchBend { channel, bend } => format!("bend {channel} {}", bend.value()),
        Message::Sysex(bytes) => format!("sysex{}", spelt(bytes)),
        Message::Common(bytes) => format!("common{}", spelt(bytes)),
        Message::RealTime(byte) => format!("{byte:02X}"),
    }
}

fn spelt(bytes: &[u8]) -> String {
    bytes.iter().fold(String::new(), |mut out, byte| {
        let _ = write!(out, " {byte:02X}");
        out
    })
}

#[test]
fn printed_streams_come_apart_as_printed() {
    for (name, stream, messages) in [
        (
            "M1 A-1",
            "90 3C 27 40 2B 43 25",
            "on 0 3C 27 · on 0 40 2B · on 0 43 25",
        ),
        (
            "M1 A-1",
            "90 3C 27 3C 00 3E 29",
            "on 0 3C 27 · off 0 3C 40 · on 0 3E 29",
        ),
        ("M1 A-2", "B0 7C 00 01 37", "cc 0 124 00 · cc 0 1 37"),
        (
            "M1 A-2",
            "90 3C F8 64 40 F8 50",
            "F8 · on 0 3C 64 · F8 · on 0 40 50",
        ),
        (
            "M1 A-2 rule 3",
            "90 3C 64 F1 10 3E 64",
            "on 0 3C 64 · common F1 10",
        ),
        (
            "M1 A-2, undefined common",
            "90 3C 64 F4 3E 64",
            "on 0 3C 64",
        ),
        (
            "M1 A-2, undefined common",
            "90 3C 64 F5 3E 64",
            "on 0 3C 64",
        ),
        (
            "M1 A-2, undefined real-time",
            "90 3C 64 F9 3E 64",
            "on 0 3C 64 · on 0 3E 64",
        ),
        (
            "M1 A-2, undefined real-time",
            "90 3C 64 FD 3E 64",
            "on 0 3C 64 · on 0 3E 64",
        ),
        ("M1 T-2", "C0 05 06", "program 0 05 · program 0 06"),
        ("M1 T-2", "D3 05 06", "pressure 3 05 · pressure 3 06"),
        ("M1 A-2 rule 5", "3C 64 90 3C 64", "on 0 3C 64"),
        ("M1 p. 5", "90 3C 80 3C 40", "off 0 3C 40"),
        (
            "M1 p. 29",
            "F0 7E F8 7F 06 01 F7",
            "F8 · sysex F0 7E 7F 06 01 F7",
        ),
        ("M1 p. 29, T-8", "F0 7E 7F 90 3C 64", "on 0 3C 64"),
        (
            "M1 A-2",
            "90 3C 64 F0 7E 7F 06 01 F7 3E 64",
            "on 0 3C 64 · sysex F0 7E 7F 06 01 F7",
        ),
        ("M1 p. 10", "90 3C 00", "off 0 3C 40"),
        (
            "M1 p. 19",
            "E0 00 40 E1 00 00 E2 7F 7F",
            "bend 0 8192 · bend 1 0 · bend 2 16383",
        ),
        (
            "M1 T-6",
            "F2 10 20 F3 05 F6 F1 7F",
            "common F2 10 20 · common F3 05 · common F6 · common F1 7F",
        ),
        ("M1 T-6", "F6 3C 64", "common F6"),
        ("M1 p. 30-33", "FA FB FC FE FF", "FA · FB · FC · FE · FF"),
        (
            "M1 p. 32, 29",
            "F0 7D FE 01 FF F7",
            "FE · FF · sysex F0 7D 01 F7",
        ),
        ("M1 T-2", "A5 3C 40 3D 41", "poly 5 3C 40 · poly 5 3D 41"),
        (
            "M1 p. 5, an end without a beginning",
            "90 3C F7 64 90 3C 64",
            "on 0 3C 64",
        ),
        (
            "M1 p. 29, sysex upon sysex",
            "F0 01 F0 02 F7",
            "sysex F0 02 F7",
        ),
    ] {
        assert_eq!(heard(stream), messages, "{name}: {stream}");
    }
}

#[test]
fn what_makes_no_message_is_counted() {
    for (stream, bad_bytes, sysex_lost) in [
        ("90 3C 64 3E 64", 0, 0),
        ("3C 64", 2, 0),
        ("90 3C 80 3C 40", 1, 0),
        ("90 3C 64 F4 3E 64", 3, 0),
        ("F7", 1, 0),
        ("F0 7E 7F 90 3C 64", 0, 1),
        ("F0 01 F0 02 F7", 0, 1),
        ("F9", 1, 0),
    ] {
        let mut splitter = Splitter::new();
        for byte in hex(stream) {
            let _ = splitter.push(byte);
        }
        assert_eq!(splitter.take_bad_bytes(), bad_bytes, "{stream}");
        assert_eq!(splitter.take_sysex_lost(), sysex_lost, "{stream}");
        assert_eq!(splitter.take_bad_bytes() + splitter.take_sysex_lost(), 0);
    }
}

#[test]
fn the_longest_sysex_passes_and_a_longer_one_is_lost() {
    let limit = trued::limits::SYSEX_BYTES_MAX;
    for (length, passes) in [(limit, true), (limit + 1, false)] {
        let mut splitter = Splitter::new();
        let mut stream = vec![0x11; length];
        stream[0] = 0xF0;
        stream[length - 1] = 0xF7;
        stream.extend([0x90, 0x3C, 0x64]);
        let lengths: Vec<usize> = stream
            .into_iter()
            .filter_map(|byte| match splitter.push(byte)? {
                Message::Sysex(bytes) => Some(bytes.len()),
                _ => Some(3),
            })
            .collect();
        assert_eq!(lengths, if passes { vec![limit, 3] } else { vec![3] });
        assert_eq!(splitter.take_sysex_lost(), !passes as u64);
    }
}

/// Printed sequences lean on running status; here every status stands.
fn expanded(printed: &str) -> Vec<u8> {
    let mut splitter = Splitter::new();
    let mut out = Vec::new();
    for byte in hex(printed) {
        if let Some(Message::Controller {
            channel,
            number,
            value,
        }) = splitter.push(byte)
        {
            out.extend([0xB0 | channel, number, value]);
        }
    }
    out
}

#[test]
fn parameter_sequences_are_the_printed_ones_with_every_status() {
    // Each of ours ends with the null parameter (GM2 3.4.5) and says both halves of the data, upper first (M1 p. 12).
    let full = |printed: &str| expanded(&format!("{printed} 65 7F 64 7F"));
    let ours = parameter::bend_range(1, 48).to_vec();
    assert_eq!(ours, full("B1 65 00 64 00 06 30 26 00")); // M1 p. 17-18
    assert_eq!(
        parameter::bend_range(0, 1).to_vec(),
        full("B0 65 00 64 00 06 01 26 00") // M1 p. 18: 01 00 is a semitone each way
    );
    // MPE 1.1, 2.2.1: `Bn 65 00 64 06 06 mm`, the lower half of the data has no function.
    assert_eq!(
        parameter::zone(0, 7).to_vec(),
        full("B0 65 00 64 06 06 07 26 00")
    );
    assert_eq!(
        parameter::zone(15, 15).to_vec(),
        full("BF 65 00 64 06 06 0F 26 00")
    );
    assert_eq!(
        parameter::zone(0, 0).to_vec(),
        full("B0 65 00 64 06 06 00 26 00")
    );
    // M1 p. 18: fine tuning up 50 cents, coarse tuning up three semitones.
    let fine = parameter::registered(0, [0, 1], [0x60, 0]).to_vec();
    assert_eq!(fine, full("B0 65 00 64 01 06 60 26 00"));
    let coarse = parameter::registered(0, [0, 2], [0x43, 0]).to_vec();
    assert_eq!(coarse, full("B0 65 00 64 02 06 43 26 00"));
    // MTU, "Changing Tuning Programs": select program 0.
    let program = parameter::registered(0, [0, 3], [0, 0]).to_vec();
    assert_eq!(program, full("B0 65 00 64 03 06 00 26 00"));
    let own = parameter::non_registered(0, [1, 8], [12, 0]).to_vec();
    assert_eq!(own, full("B0 63 01 62 08 06 0C 26 00")); // M1 p. 17
}

#[test]
fn a_splitter_reset_forgets_the_message_under_way() {
    let mut splitter = Splitter::new();
    for byte in hex("90 3C") {
        assert_eq!(splitter.push(byte), None);
    }
    splitter.reset();
    for byte in hex("64 3C 64") {
        assert_eq!(splitter.push(byte), None);
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(500))]

    #[test]
    fn random_bytes_never_panic_and_every_message_is_whole(stream in proptest::collection::vec(any::<u8>(), 0..400)) {
        let mut splitter = Splitter::new();
        for byte in &stream {
            if let Some(message) = splitter.push(*byte) {
                let data_is_seven_bits = match message {
                    Message::Sysex(b) => b[0] == 0xF0 && b[b.len() - 1] == 0xF7 && b[1..b.len() - 1].iter().all(|d| *d < 0x80),
                    Message::Common(b) => matches!(b[0], 0xF1 | 0xF2 | 0xF3 | 0xF6) && b[1..].iter().all(|d| *d < 0x80),
                    Message::NoteOn { channel, key, velocity } => channel < 16 && key < 128 && (1..128).contains(&velocity),
                    Message::NoteOff { channel, key, velocity } => channel < 16 && key < 128 && velocity < 128,
                    _ => true,
                };
                prop_assert!(data_is_seven_bits);
            }
        }
    }

    #[test]
    fn our_splitter_and_the_receiver_s_agree(stream in proptest::collection::vec(any::<u8>(), 0..400)) {
        // Two implementations, written apart, cut any stream alike.
        let mut ours = Splitter::new();
        let mut theirs = crate::support::receiver::Stream::default();
        for byte in &stream {
            let a = ours.push(*byte).map(written);
            let b = theirs.cut(&[*byte]);
            let b = b.iter().find_map(|m| Message::read(m)).map(written);
            prop_assert_eq!(a, b);
        }
    }
}
