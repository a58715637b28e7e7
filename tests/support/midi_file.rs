//! The smallest MIDI file: one track, a tick a millisecond. (Standard MIDI Files 1.0: header, variable length, end of
//! track.)

use super::receiver::Stream;

/// One or several whole channel messages at each time in milliseconds; times must not fall.
pub fn midi_file(sent: &[(u64, Vec<u8>)], end_ms: u64) -> Vec<u8> {
    let mut track = Vec::new();
    let mut before_ms = 0;
    for (at_ms, bytes) in sent {
        for message in Stream::default().cut(bytes) {
            track.extend(variable_length(at_ms - before_ms));
            track.extend(message);
            before_ms = *at_ms;
        }
    }
    track.extend(variable_length(end_ms - before_ms));
    track.extend([0xFF, 0x2F, 0x00]);
    // 500 ticks to the quarter at 120 quarters a minute, the tempo where none is given.
    let mut out = b"MThd\0\0\0\x06\0\0\0\x01\x01\xF4MTrk".to_vec();
    out.extend((track.len() as u32).to_be_bytes());
    out.extend(track);
    out
}

fn variable_length(value: u64) -> Vec<u8> {
    let mut out = vec![(value & 0x7F) as u8];
    let mut rest = value >> 7;
    while rest > 0 {
        out.insert(0, 0x80 | (rest & 0x7F) as u8);
        rest >>= 7;
    }
    out
}

#[test]
fn variable_lengths_are_the_printed_ones() {
    // Standard MIDI Files 1.0, table of examples.
    for (value, bytes) in [
        (0x00, vec![0x00]),
        (0x40, vec![0x40]),
        (0x7F, vec![0x7F]),
        (0x80, vec![0x81, 0x00]),
        (0x2000, vec![0xC0, 0x00]),
        (0x3FFF, vec![0xFF, 0x7F]),
        (0x4000, vec![0x81, 0x80, 0x00]),
        (0x1FFFFF, vec![0xFF, 0xFF, 0x7F]),
        (0x0FFF_FFFF, vec![0xFF, 0xFF, 0xFF, 0x7F]),
    ] {
        assert_eq!(variable_length(value), bytes);
    }
}
