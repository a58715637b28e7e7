//! Words on the wire against printed examples.

use trued::pitch::word::{Bend, BendRange, from_tuning_bytes, tuning_bytes};
use trued::pitch::{Hertz, Interval, Log, Pitch};

/// MIDI Tuning Standard, the table of frequency data with the hertz printed there. The row `00 00 01` is a known
/// misprint (8.2104 is a whole 7.3 cents off); beside it stands the exact value, 8.175828.
const TUNING_TABLE: [([u8; 3], f64); 14] = [
    ([0x00, 0x00, 0x00], 8.1758),
    ([0x00, 0x00, 0x01], 8.175828), // printed: 8.2104
    ([0x01, 0x00, 0x00], 8.6620),
    ([0x0C, 0x00, 0x00], 16.3516),
    ([0x3C, 0x00, 0x00], 261.6256),
    ([0x3D, 0x00, 0x00], 277.1827),
    ([0x44, 0x7F, 0x7F], 439.9984),
    ([0x45, 0x00, 0x00], 440.0),
    ([0x45, 0x00, 0x01], 440.0016),
    ([0x78, 0x00, 0x00], 8372.0190),
    ([0x78, 0x00, 0x01], 8372.0630),
    ([0x7F, 0x00, 0x00], 12543.8800),
    ([0x7F, 0x00, 0x01], 12543.9200),
    ([0x7F, 0x7F, 0x7E], 13289.7300),
];

/// The corrected column of the same table, from the MIDI Association's forum; four decimals, so half a unit of the last.
const TUNING_TABLE_CORRECTED: [([u8; 3], f64); 13] = [
    ([0x00, 0x00, 0x00], 8.1758),
    ([0x00, 0x00, 0x01], 8.1758),
    ([0x01, 0x00, 0x00], 8.6620),
    ([0x0C, 0x00, 0x00], 16.3516),
    ([0x3C, 0x00, 0x00], 261.6256),
    ([0x3D, 0x00, 0x00], 277.1826),
    ([0x44, 0x7F, 0x7F], 439.9984),
    ([0x45, 0x00, 0x00], 440.0),
    ([0x78, 0x00, 0x00], 8372.0181),
    ([0x78, 0x00, 0x01], 8372.0476),
    ([0x7F, 0x00, 0x00], 12543.8540),
    ([0x7F, 0x00, 0x01], 12543.8982),
    ([0x7F, 0x7F, 0x7E], 13289.6566),
];

fn word(bytes: [u8; 3]) -> i64 {
    (bytes[0] as i64) << 14 | (bytes[1] as i64) << 7 | bytes[2] as i64
}

#[test]
fn tuning_words_read_as_printed() {
    let mut worst = 0f64;
    for (bytes, printed) in TUNING_TABLE {
        let hertz = from_tuning_bytes(bytes).expect("a frequency").hertz();
        let off = 1200.0 * (hertz / printed).log2();
        worst = worst.max(off.abs());
        assert!(off.abs() < 0.01, "{bytes:02X?}: {hertz} against {printed}");
    }
    println!("MIDI Tuning words against the printed table: worst {worst:.4} c");
    for (bytes, corrected) in TUNING_TABLE_CORRECTED {
        let hertz = from_tuning_bytes(bytes).expect("a frequency").hertz();
        assert!(
            (hertz - corrected).abs() <= 0.00006,
            "{bytes:02X?}: {hertz} against {corrected}"
        );
    }
    // The misprint is one: as printed it is over seven cents away.
    let misprint = 1200.0 * (8.2104 / 8.175828f64).log2();
    assert!(misprint > 7.0);
}

#[test]
fn tuning_words_are_written_from_exact_keys() {
    // Not from the printed hertz, whose rounding gives other words.
    for (bytes, _) in TUNING_TABLE {
        // A word in microcents, to the nearest.
        let pitch = Pitch::from_microcents((word(bytes) * 100_000_000 + 8192).div_euclid(16384));
        assert_eq!(tuning_bytes(pitch), Some(bytes));
        assert_eq!(from_tuning_bytes(bytes), Some(pitch));
    }
    assert_eq!(
        from_tuning_bytes([0x7F; 3]),
        None,
        "reserved for `no change`"
    );
    let top = Pitch::from_microcents(12_799_997_000);
    assert_eq!(
        tuning_bytes(top),
        Some([0x7F, 0x7F, 0x7E]),
        "never the reserved word"
    );
}

// Computed by the formula of the MIDI Tuning Standard: nearest word of 100/16384 cent.
#[test]
fn tuning_words_of_frequencies_and_intervals() {
    let hertz = |hertz: u64| {
        Hertz::from_micro(hertz * 1_000_000)
            .expect("not zero")
            .pitch()
    };
    let above_c4 = |log: Log| Pitch::of_key(60) + log.interval();
    for (pitch, bytes) in [
        (Pitch::from_microcents(6_950_000_000), [0x45, 0x40, 0x00]),
        (hertz(660), [0x4C, 0x02, 0x40]),
        (hertz(550), [0x48, 0x6E, 0x3E]),
        (hertz(256), [0x3B, 0x4F, 0x6A]),
        (hertz(415), [0x43, 0x7E, 0x30]),
        (hertz(432), [0x44, 0x57, 0x2B]),
        (above_c4(Log::of_ratio(7, 4)), [0x45, 0x58, 0x0C]),
        (above_c4(Log::OCTAVE.part(1, 31)), [0x3C, 0x31, 0x46]),
        (above_c4(Log::OCTAVE.part(1, 19)), [0x3C, 0x50, 0x6C]),
    ] {
        assert_eq!(tuning_bytes(pitch), Some(bytes), "{pitch:?}");
    }
}

fn bend(millicents: i64, semitones: u8) -> u16 {
    let range = BendRange::new(semitones).expect("a range");
    Bend::encode(Interval::from_microcents(millicents * 1000), range)
        .0
        .value()
}

#[test]
fn bend_words() {
    for (millicents, semitones, value) in [
        // Printed: MIDI 1.0 p. 19 (E0 00 40, E0 00 00, E0 7F 7F) and MPE 1.1, C.3 and C.4 (16383, 9387).
        (0, 2, 8192),
        (-200_000, 2, 0),
        (200_000, 2, 16383),
        (700_000, 48, 9387),
        // Computed by round(interval x 8192 / range) + 8192, MPE 1.1, C.3.
        (50_000, 2, 10240),
        (50_000, 24, 8363),
        (50_000, 48, 8277),
        (100_000, 48, 8363),
        (1_955, 2, 8272),
        (1_955, 48, 8195),
        (-13_686, 2, 7631),
        (-13_686, 12, 8099),
        (-13_686, 48, 8169),
        (-31_174, 2, 6915),
        (-31_174, 48, 8139),
        (38_710, 2, 9778),
        (38_710, 48, 8258),
        (-50_000, 1, 4096),
        (-4_800_000, 48, 0),
        (4_800_000, 48, 16383),
    ] {
        assert_eq!(
            bend(millicents, semitones),
            value,
            "{millicents} in {semitones}"
        );
    }
}

#[test]
fn bend_words_are_heard_as_computed() {
    for (value, semitones, cents) in [
        (9387, 48, 700.1953),
        (8363, 48, 100.1953),
        (8363, 24, 50.0977),
        (8272, 2, 1.9531),
    ] {
        let range = BendRange::new(semitones).expect("a range");
        let heard = Bend::new(value).expect("14 bits").decode(range).cents();
        assert!((heard - cents).abs() < 0.0001, "{value}: {heard}");
    }
}
