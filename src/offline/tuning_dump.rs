//! A tuning as a bulk dump, for synths that load tunings from a file (MIDI Tuning Standard, "Bulk Tuning Dump" and "Key-Based
//! Tuning Dump").

use super::chart::Chart;
use crate::pitch::word::tuning_bytes;
use crate::tuning::Key;

/// To whoever listens.
const ALL_DEVICES: u8 = 0x7F;
const TUNING_STANDARD: u8 = 0x08;
const BULK_DUMP: u8 = 0x01;
const KEY_BASED_DUMP: u8 = 0x04;
const NAME_BYTES: usize = 16;
/// "No change": what a silent key is.
const LEFT_ALONE: [u8; 3] = [0x7F; 3];

/// Where a receiver is to keep it, each 0-127 as on the wire. Without a bank it is the older kind of dump, which receivers
/// without banks understand.
#[derive(Clone, Copy, Debug)]
pub struct Slot {
    pub bank: Option<u8>,
    pub program: u8,
}

/// One whole system exclusive message: 408 bytes, 409 with a bank.
pub fn tuning_dump(chart: &Chart, slot: Slot) -> Vec<u8> {
    let mut bytes = vec![0x7E, ALL_DEVICES, TUNING_STANDARD];
    match slot.bank {
        None => bytes.extend([BULK_DUMP, slot.program & 0x7F]),
        Some(bank) => bytes.extend([KEY_BASED_DUMP, bank & 0x7F, slot.program & 0x7F]),
    }
    bytes.extend(name_bytes(
        chart.song.as_deref().unwrap_or(&chart.tuning_name),
    ));
    for key in Key::all() {
        let pitch = chart.tuning.pitch(key);
        bytes.extend(pitch.and_then(tuning_bytes).unwrap_or(LEFT_ALONE));
    }
    // Of all that stands between F0 and itself. For the older kind the standard's text counts otherwise, and bids receivers
    // not to mind.
    let checksum = bytes.iter().fold(0, |sum, byte| sum ^ byte);
    bytes.insert(0, 0xF0);
    bytes.extend([checksum & 0x7F, 0xF7]);
    bytes
}

/// What of it is printable ASCII, filled up with spaces.
fn name_bytes(name: &str) -> [u8; NAME_BYTES] {
    let mut bytes = [b' '; NAME_BYTES];
    let printable = name.bytes().filter(|byte| (b' '..=b'~').contains(byte));
    for (slot, byte) in bytes.iter_mut().zip(printable) {
        *slot = byte;
    }
    bytes
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::stage::Stage;
    use std::path::Path;

    fn chart(song: &str) -> Chart {
        let text = format!(
            "tunings: {{lone: {{tonic: C, notes: {{C: 1/1}}, others: silent}}}}\n\
             set: [{song}]\n"
        );
        let stage = Stage::parse(Path::new("a.yaml"), &text).expect("a stage");
        Chart::of_song(&stage.set[0])
    }

    // Checksums worked out from the layouts of the standard for a name of "12-TET" and equal temperament.
    #[test]
    fn equal_temperament_as_both_kinds_of_dump() {
        let chart = chart("{song: 12-TET, tuning: equal-12}");
        let bulk = tuning_dump(
            &chart,
            Slot {
                bank: None,
                program: 0,
            },
        );
        assert_eq!(bulk.len(), 408);
        assert_eq!(bulk[..6], [0xF0, 0x7E, 0x7F, 0x08, 0x01, 0x00]);
        assert_eq!(&bulk[6..22], b"12-TET          ");
        assert_eq!(bulk[22 + 3 * 69..][..3], [0x45, 0x00, 0x00]);
        assert_eq!(bulk[406..], [0x63, 0xF7]);
        let key_based = tuning_dump(
            &chart,
            Slot {
                bank: Some(0),
                program: 0,
            },
        );
        assert_eq!(key_based.len(), 409);
        assert_eq!(key_based[..7], [0xF0, 0x7E, 0x7F, 0x08, 0x04, 0x00, 0x00]);
        assert_eq!(key_based[407..], [0x66, 0xF7]);
    }

    // 415 Hz is 43 7E 30 in that coding, 256 Hz is 3B 4F 6A (computed from the standard's formula).
    #[test]
    fn a_reference_is_in_it_and_silent_keys_are_left_alone() {
        let slot = Slot {
            bank: Some(2),
            program: 4,
        };
        let tuned = chart("{song: \"Lämp\", tuning: quarter-comma-meantone, pitch: A4 = 415 Hz}");
        let dump = tuning_dump(&tuned, slot);
        assert_eq!(dump[5..7], [2, 4]);
        assert_eq!(&dump[7..23], b"Lmp             ");
        assert_eq!(dump[23 + 3 * 69..][..3], [0x43, 0x7E, 0x30]);
        let lone = tuning_dump(
            &chart("{song: Lone, tuning: lone, pitch: C4 = 256 Hz}"),
            slot,
        );
        assert_eq!(lone[23 + 3 * 60..][..3], [0x3B, 0x4F, 0x6A]);
        assert_eq!(lone[23 + 3 * 61..][..3], LEFT_ALONE);
        assert!(lone[1..408].iter().all(|byte| *byte < 0x80));
    }
}
