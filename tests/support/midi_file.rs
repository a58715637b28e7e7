//! The smallest MIDI file: one track. (Standard MIDI Files 1.0: header, variable length, tempo, end of track.)

use super::receiver::Stream;

/// One or several whole channel messages at each time in milliseconds; times must not fall.
pub fn midi_file(sent: &[(u64, Vec<u8>)], end_ms: u64) -> Vec<u8> {
    midi_file_at(500, 500_000, sent, end_ms)
}

/// The same in ticks, so many to a quarter note that lasts so many microseconds.
pub fn midi_file_at(
    ticks_per_quarter: u16,
    quarter_us: u32,
    sent: &[(u64, Vec<u8>)],
    end: u64,
) -> Vec<u8> {
    let mut track = vec![0x00, 0xFF, 0x51, 0x03];
    track.extend(&quarter_us.to_be_bytes()[1..]);
    let mut before = 0;
    for (at, bytes) in sent {
        for message in Stream::default().cut(bytes) {
            track.extend(variable_length(at - before));
            track.extend(message);
            before = *at;
        }
    }
    track.extend(variable_length(end - before));
    track.extend([0xFF, 0x2F, 0x00]);
    let mut out = b"MThd\0\0\0\x06\0\0\0\x01".to_vec();
    out.extend(ticks_per_quarter.to_be_bytes());
    out.extend(b"MTrk");
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
