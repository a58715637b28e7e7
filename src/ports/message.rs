//! Cuts what the engine sends (whole messages, each with its status byte) into its messages.

/// The first whole message and what follows it; `None` at the end, or if what follows is no whole message.
pub fn cut(bytes: &[u8]) -> Option<(&[u8], &[u8])> {
    let length = match *bytes.first()? {
        0xF0 => bytes.iter().position(|byte| *byte == 0xF7)? + 1,
        0x80..=0xBF | 0xE0..=0xEF | 0xF2 => 3,
        0xC0..=0xDF | 0xF1 | 0xF3 => 2,
        0xF4..=0xFF => 1,
        0x00..=0x7F => return None,
    };
    bytes.split_at_checked(length)
}

/// The channels that a bundle speaks to, bit 0 = channel 1. Sysex may mean any of them, so it stands for all;
/// real-time and song position stand for none.
pub fn channels(mut bytes: &[u8]) -> u16 {
    let mut mask = 0;
    while let Some((message, rest)) = cut(bytes) {
        mask |= match message[0] {
            status @ 0x80..=0xEF => 1 << (status & 0x0F),
            0xF0 => u16::MAX,
            _ => 0,
        };
        bytes = rest;
    }
    mask
}

/// What a control message sets, if a newer one of its kind makes it void: status, and number where there is one.
///
/// Not for controllers that mean something only together with others: banks, data entry, parameter numbers, pedals
/// (a damper that goes up and down again is two things done) and mode messages.
pub fn replaceable(bytes: &[u8]) -> Option<(u8, u8)> {
    let (message, []) = cut(bytes)? else {
        return None;
    };
    match message[0] {
        status @ 0xA0..=0xAF => Some((status, message[1])),
        status @ 0xB0..=0xBF => match message[1] {
            0 | 6 | 32 | 38 | 64..=69 | 84 | 88 | 96..=101 | 120..=127 => None,
            number => Some((status, number)),
        },
        status @ 0xD0..=0xEF => Some((status, 0)),
        _ => None,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn bundles_fall_into_messages() {
        let bundle = [0xE1, 0, 0x40, 0xC2, 5, 0xF8, 0xF0, 1, 2, 0xF7, 0x91, 60, 9];
        let mut rest = &bundle[..];
        let mut lengths = Vec::new();
        while let Some((message, more)) = cut(rest) {
            lengths.push(message.len());
            rest = more;
        }
        assert_eq!(lengths, [3, 2, 1, 4, 3]);
        assert!(rest.is_empty());
        assert_eq!(channels(&bundle), u16::MAX);
        assert_eq!(channels(&[0xE1, 0, 0x40, 0x92, 60, 9]), 0b110);
        assert_eq!(channels(&[0xF8]), 0);
    }

    #[test]
    fn cut_off_messages_are_no_messages() {
        assert_eq!(cut(&[0x90, 60]), None);
        assert_eq!(cut(&[0xF0, 1, 2]), None);
        assert_eq!(cut(&[60, 90]), None);
        assert_eq!(cut(&[]), None);
    }

    #[test]
    fn what_a_newer_value_makes_void() {
        assert_eq!(replaceable(&[0xE3, 1, 2]), Some((0xE3, 0)));
        assert_eq!(replaceable(&[0xB3, 1, 2]), Some((0xB3, 1)));
        assert_eq!(replaceable(&[0xA3, 60, 2]), Some((0xA3, 60)));
        assert_eq!(replaceable(&[0xB3, 64, 127]), None);
        assert_eq!(replaceable(&[0xB3, 6, 2]), None);
        assert_eq!(replaceable(&[0xE3, 1, 2, 0x93, 60, 9]), None);
        assert_eq!(replaceable(&[0x93, 60, 9]), None);
    }
}
