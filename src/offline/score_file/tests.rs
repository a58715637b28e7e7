//! MIDI files as the standard describes them, whole and broken.

use super::*;

fn file(format: u8, tracks: &[&[u8]], division: [u8; 2]) -> Vec<u8> {
    let mut bytes = b"MThd\0\0\0\x06\0".to_vec();
    bytes.extend([format, 0, tracks.len() as u8, division[0], division[1]]);
    for track in tracks {
        bytes.extend(b"MTrk");
        bytes.extend((track.len() as u32).to_be_bytes());
        bytes.extend(*track);
    }
    bytes
}

const END: [u8; 4] = [0, 0xFF, 0x2F, 0];
const DIVISION: [u8; 2] = [0x01, 0xE0];

fn one(events: &[u8]) -> Vec<u8> {
    file(0, &[&[events, &END].concat()], DIVISION)
}

#[test]
fn tracks_are_merged_by_time_then_by_their_order() {
    let first = [&[0x10, 0x90, 60, 1, 0x10, 60, 0][..], &END].concat();
    let second = [&[0x10, 0x91, 64, 1, 0x08, 64, 0][..], &END].concat();
    let bytes = file(1, &[&first, &second], DIVISION);
    let score = Score::read(&bytes).unwrap();
    let seen: Vec<_> = score
        .events
        .iter()
        .map(|e| (e.tick, e.track, e.bytes.clone()))
        .collect();
    assert_eq!(
        seen,
        [
            (16, 0, vec![0x90, 60, 1]),
            (16, 1, vec![0x91, 64, 1]),
            (24, 1, vec![0x91, 64, 0]),
            (32, 0, vec![0x90, 60, 0]),
        ]
    );
}

// Standard MIDI Files 1.0: "Sysex events and meta-events cancel any running status which was in effect."
#[test]
fn running_status_ends_at_a_meta_event() {
    let good = one(&[0, 0x90, 60, 1, 0, 62, 1]);
    assert_eq!(Score::read(&good).unwrap().events.len(), 2);
    let bad = one(&[0, 0x90, 60, 1, 0, 0xFF, 1, 1, b'x', 0, 62, 1]);
    assert!(Score::read(&bad).unwrap_err().contains("track 1"));
}

#[test]
fn every_refusal_says_what_would_be_right() {
    let whole = one(&[0, 0x90, 60, 1]);
    for (name, bytes, words) in [
        ("text", b"hello there".to_vec(), "format 0 or 1"),
        ("empty", Vec::new(), "format 0 or 1"),
        (
            "format 2",
            file(2, &[&END], DIVISION),
            "save it as format 0 or 1",
        ),
        ("cut off", whole[..whole.len() - 3].to_vec(), "breaks off"),
        (
            "no end",
            file(0, &[&[0, 0x90, 60, 1]], DIVISION),
            "breaks off",
        ),
        ("no tracks", file(1, &[], DIVISION), "holds 0"),
        ("no ticks", file(0, &[&END], [0, 0]), "480 ticks"),
        ("no ticks a frame", file(0, &[&END], [0xE7, 0]), "480 ticks"),
        ("tempo 0", one(&[0, 0xFF, 0x51, 3, 0, 0, 0]), "tempo"),
        ("data byte over 127", one(&[0, 0x90, 60, 200]), "damaged"),
    ] {
        let error = Score::read(&bytes).expect_err(name);
        assert!(error.contains(words), "{name}: {error}");
    }
    let mut short = file(1, &[&END], DIVISION);
    short[11] = 3;
    assert!(Score::read(&short).unwrap_err().contains("3 tracks"));
}

#[test]
fn bytes_after_the_last_track_are_let_be() {
    let mut padded = one(&[0, 0x90, 60, 1]);
    padded.extend([0, 0, 0]);
    assert_eq!(Score::read(&padded).unwrap().events.len(), 1);
}

// Standard MIDI Files 1.0, the printed packets of one sysex (SMF-sxp in common test lists).
#[test]
fn sysex_packets_come_through_in_portions() {
    let bytes = one(&[
        0, 0xF0, 3, 0x43, 0x12, 0, 0x81, 0x48, 0xF7, 6, 0x43, 0x12, 0, 0x43, 0x12, 0, 0x64, 0xF7,
        4, 0x43, 0x12, 0, 0xF7,
    ]);
    let score = Score::read(&bytes).unwrap();
    let stream: Vec<u8> = score.events.iter().flat_map(|e| e.bytes.clone()).collect();
    assert_eq!(stream[0], 0xF0);
    assert_eq!(*stream.last().unwrap(), 0xF7);
    assert_eq!(stream.len(), 1 + 3 + 6 + 4);
    assert_eq!(score.events[1].tick, 200);
}

#[test]
fn division_tempo_text_and_length_survive_writing() {
    let conductor = [
        &[0, 0xFF, 3, 2, b'h', b'i', 0, 0xFF, 0x51, 3, 0x0A, 0, 0][..],
        &[0x83, 0x60, 0xFF, 0x51, 3, 0x05, 0, 0][..],
        &[0x00, 0xFF, 0x60, 1, 7, 0xBC, 0x00, 0xFF, 0x2F, 0][..],
    ]
    .concat();
    let notes = [&[0, 0xFF, 3, 1, b'n', 0, 0x90, 60, 1][..], &END].concat();
    for division in [DIVISION, [0xE7, 0x28]] {
        let bytes = file(1, &[&conductor, &notes], division);
        let score = Score::read(&bytes).unwrap();
        assert_eq!(score.end_tick, 480 + 60 * 128);
        let written = score
            .write(&[Track {
                name: "organ",
                messages: vec![(5, &[0x91, 61, 2, 0x91, 62, 2]), (6, &[0xF0, 1, 0xF7])],
            }])
            .unwrap();
        assert_eq!(written[12..14], division);
        let again = Score::read(&written).unwrap();
        assert_eq!(again.clock, score.clock);
        assert_eq!(again.end_tick, score.end_tick);
        let names: Vec<_> = score
            .meta
            .iter()
            .filter(|(_, m)| matches!(m, MetaMessage::TrackName(b"hi")))
            .collect();
        assert_eq!(names.len(), 1);
        assert_eq!(again.meta, score.meta);
        let sent: Vec<_> = again
            .events
            .iter()
            .map(|e| (e.tick, &e.bytes[..]))
            .collect();
        assert_eq!(
            sent,
            [
                (5, &[0x91, 61, 2][..]),
                (5, &[0x91, 62, 2][..]),
                (6, &[0xF0, 1, 0xF7][..])
            ]
        );
    }
}

// Standard MIDI Files 1.0: F0 43 12 00 07 F7 is stored as F0 05 43 12 00 07 F7.
#[test]
fn sysex_is_written_with_its_length_and_real_time_as_an_escape() {
    let bytes = one(&[]);
    let score = Score::read(&bytes).unwrap();
    let written = score
        .write(&[Track {
            name: "",
            messages: vec![(0, &[0xF0, 0x43, 0x12, 0, 7, 0xF7]), (0, &[0xFA])],
        }])
        .unwrap();
    let holds = |part: &[u8]| written.windows(part.len()).any(|w| w == part);
    assert!(holds(&[0, 0xF0, 5, 0x43, 0x12, 0, 7, 0xF7]));
    assert!(holds(&[0, 0xF7, 1, 0xFA]));
}

#[test]
fn no_damage_makes_it_panic_and_what_is_read_can_be_written() {
    let whole = crate::offline::demo::score();
    let mut seed = 0x2545_F491_4F6C_DD1D_u64;
    let mut roll = |below: usize| {
        seed ^= seed << 13;
        seed ^= seed >> 7;
        seed ^= seed << 17;
        (seed >> 16) as usize % below
    };
    let mut good = 0;
    for _ in 0..20_000 {
        let mut bytes = whole.clone();
        for _ in 0..1 + roll(4) {
            let at = if roll(3) == 0 {
                roll(30)
            } else {
                roll(bytes.len())
            };
            bytes[at] = roll(256) as u8;
        }
        if roll(4) == 0 {
            bytes.truncate(roll(bytes.len()));
        }
        if let Ok(score) = Score::read(&bytes) {
            good += 1;
            let end = score.clock.time(score.end_tick);
            assert!(score.clock.tick_not_before(end) <= score.end_tick);
            assert!(score.write(&[]).is_ok());
        }
    }
    assert!(good > 1000, "only {good} were read at all");
}
