//! MIDI bytes and sequencer events, both ways. Nothing is lost on the way but what no MIDI message says.

use alsa::seq::{EvCtrl, EvNote, EvQueueControl, Event, EventType};

/// Bytes of one sysex event; the kernel's own size for what comes in from a cable.
pub const SYSEX_PIECE: usize = 256;

/// Room for what one event can mean: a parameter with its value is four controllers.
pub type Buffer = [u8; 12];

/// An event's pitch bend lies around 0; the wire's around this.
const BEND_CENTRE: i32 = 8192;

/// The event for the first message in `bytes`, or for a first piece of a long sysex, and how many bytes it is.
///
/// `bytes` starts with a status byte, or goes on with a sysex. `None` if it does neither.
pub fn to_event(bytes: &[u8]) -> Option<(Event<'_>, usize)> {
    let first = *bytes.first()?;
    let event = match first {
        0xF0 | 0xF7 | 0x00..=0x7F => {
            let end = bytes.iter().position(|byte| *byte == 0xF7);
            let length = end.map_or(bytes.len(), |end| end + 1).min(SYSEX_PIECE);
            return Some((Event::new_ext(EventType::Sysex, &bytes[..length]), length));
        }
        0x80..=0xEF => return channel_event(first, bytes),
        0xF1 => control(EventType::Qframe, 0, 0, i32::from(*bytes.get(1)?)),
        0xF2 => control(EventType::Songpos, 0, 0, fourteen(bytes)?),
        0xF3 => control(EventType::Songsel, 0, 0, i32::from(*bytes.get(1)?)),
        0xF6 => Event::new(EventType::TuneRequest, &()),
        0xF8 => real_time(EventType::Clock),
        0xFA => real_time(EventType::Start),
        0xFB => real_time(EventType::Continue),
        0xFC => real_time(EventType::Stop),
        0xFE => Event::new(EventType::Sensing, &()),
        0xFF => Event::new(EventType::Reset, &()),
        0xF4 | 0xF5 | 0xF9 | 0xFD => return None,
    };
    let length = match first {
        0xF2 => 3,
        0xF1 | 0xF3 => 2,
        _ => 1,
    };
    Some((event, length))
}

fn channel_event(status: u8, bytes: &[u8]) -> Option<(Event<'_>, usize)> {
    let channel = status & 0x0F;
    let one = *bytes.get(1)?;
    let two = bytes.get(2).copied();
    let event = match status & 0xF0 {
        0xC0 => control(EventType::Pgmchange, channel, 0, i32::from(one)),
        0xD0 => control(EventType::Chanpress, channel, 0, i32::from(one)),
        0x80 => note(EventType::Noteoff, channel, one, two?),
        0x90 => note(EventType::Noteon, channel, one, two?),
        0xA0 => note(EventType::Keypress, channel, one, two?),
        0xB0 => {
            let (number, value) = (u32::from(one), i32::from(two?));
            control(EventType::Controller, channel, number, value)
        }
        _ => {
            let bend = fourteen(bytes)? - BEND_CENTRE;
            control(EventType::Pitchbend, channel, 0, bend)
        }
    };
    let length = if matches!(status & 0xF0, 0xC0 | 0xD0) {
        2
    } else {
        3
    };
    Some((event, length))
}

fn note(kind: EventType, channel: u8, note: u8, velocity: u8) -> Event<'static> {
    let data = EvNote {
        channel,
        note,
        velocity,
        ..EvNote::default()
    };
    Event::new(kind, &data)
}

fn control(kind: EventType, channel: u8, param: u32, value: i32) -> Event<'static> {
    let data = EvCtrl {
        channel,
        param,
        value,
    };
    Event::new(kind, &data)
}

fn real_time(kind: EventType) -> Event<'static> {
    let data = EvQueueControl {
        queue: 0,
        value: (),
    };
    Event::new(kind, &data)
}

/// The two data bytes of a message as one number, low one first on the wire.
fn fourteen(bytes: &[u8]) -> Option<i32> {
    Some(i32::from(*bytes.get(1)?) | i32::from(*bytes.get(2)?) << 7)
}

/// The bytes that an event stands for, each message with its status byte; empty for what is no MIDI.
pub fn to_bytes<'a>(event: &'a Event<'_>, buffer: &'a mut Buffer) -> &'a [u8] {
    if event.get_type() == EventType::Sysex {
        return event.get_ext().unwrap_or_default();
    }
    let length = if let Some(data) = event.get_data::<EvNote>() {
        note_bytes(event.get_type(), data, buffer)
    } else if let Some(data) = event.get_data::<EvCtrl>() {
        control_bytes(event.get_type(), data, buffer)
    } else {
        let status = match event.get_type() {
            EventType::TuneRequest => 0xF6,
            EventType::Clock => 0xF8,
            EventType::Start => 0xFA,
            EventType::Continue => 0xFB,
            EventType::Stop => 0xFC,
            EventType::Sensing => 0xFE,
            EventType::Reset => 0xFF,
            _ => return &[],
        };
        put(buffer, &[[status, 0, 0]], 1)
    };
    &buffer[..length]
}

fn note_bytes(kind: EventType, data: EvNote, buffer: &mut Buffer) -> usize {
    let status = match kind {
        EventType::Noteoff => 0x80,
        EventType::Noteon => 0x90,
        EventType::Keypress => 0xA0,
        // A note with a length is split by the sequencer before it gets here.
        _ => return 0,
    };
    let message = [
        status | data.channel & 0x0F,
        data.note & 0x7F,
        data.velocity & 0x7F,
    ];
    put(buffer, &[message], 3)
}

fn control_bytes(kind: EventType, data: EvCtrl, buffer: &mut Buffer) -> usize {
    let channel = data.channel & 0x0F;
    let low = |value: i32| (value & 0x7F) as u8;
    let high = |value: i32| (value >> 7 & 0x7F) as u8;
    let (number, value) = (data.param as i32, data.value);
    let controller = |number: u8, value: u8| [0xB0 | channel, number, value];
    let parameter = |select_high: u8, select_low: u8| {
        [
            controller(select_high, high(number)),
            controller(select_low, low(number)),
            controller(6, high(value)),
            controller(38, low(value)),
        ]
    };
    match kind {
        EventType::Controller => put(buffer, &[controller(low(number), low(value))], 3),
        EventType::Control14 if number < 32 => {
            let number = low(number);
            let pair = [
                controller(number, high(value)),
                controller(number + 32, low(value)),
            ];
            put(buffer, &pair, 3)
        }
        EventType::Control14 => put(buffer, &[controller(low(number), low(value))], 3),
        EventType::Regparam => put(buffer, &parameter(101, 100), 3),
        EventType::Nonregparam => put(buffer, &parameter(99, 98), 3),
        EventType::Pgmchange => put(buffer, &[[0xC0 | channel, low(value), 0]], 2),
        EventType::Chanpress => put(buffer, &[[0xD0 | channel, low(value), 0]], 2),
        EventType::Pitchbend => {
            let bend = (value + BEND_CENTRE).clamp(0, 0x3FFF);
            put(buffer, &[[0xE0 | channel, low(bend), high(bend)]], 3)
        }
        EventType::Qframe => put(buffer, &[[0xF1, low(value), 0]], 2),
        EventType::Songpos => put(buffer, &[[0xF2, low(value), high(value)]], 3),
        EventType::Songsel => put(buffer, &[[0xF3, low(value), 0]], 2),
        _ => 0,
    }
}

/// Puts the first `length` bytes of each message into the buffer.
fn put(buffer: &mut Buffer, messages: &[[u8; 3]], length: usize) -> usize {
    let mut end = 0;
    for message in messages {
        buffer[end..end + length].copy_from_slice(&message[..length]);
        end += length;
    }
    end
}

#[cfg(test)]
mod tests {
    use super::*;

    fn there_and_back(bytes: &[u8]) -> Vec<u8> {
        let (event, length) = to_event(bytes).unwrap();
        assert_eq!(length, bytes.len().min(SYSEX_PIECE));
        to_bytes(&event, &mut [0; 12]).to_vec()
    }

    #[test]
    fn every_message_comes_back_as_it_went() {
        for status in 0x80..=0xEFu8 {
            for data in [[0, 0], [1, 127], [64, 1], [127, 127]] {
                let length = if matches!(status & 0xF0, 0xC0 | 0xD0) {
                    2
                } else {
                    3
                };
                let message = [status, data[0], data[1]];
                assert_eq!(there_and_back(&message[..length]), message[..length]);
            }
        }
        for message in [
            &[0xF1, 0x35][..],
            &[0xF2, 0x7F, 0x01],
            &[0xF3, 9],
            &[0xF6],
            &[0xF8],
            &[0xFA],
            &[0xFB],
            &[0xFC],
            &[0xFE],
            &[0xFF],
            &[0xF0, 0x7E, 0x7F, 9, 1, 0xF7],
        ] {
            assert_eq!(there_and_back(message), message);
        }
    }

    #[test]
    fn a_centred_bend_is_zero_in_an_event() {
        // alsa-lib, seq_event.h: pitchbend values run from -8192 to 8191.
        for (bytes, value) in [
            ([0xE0, 0x00, 0x40], 0),
            ([0xE0, 0x00, 0x00], -8192),
            ([0xE0, 0x7F, 0x7F], 8191),
        ] {
            let (event, _) = to_event(&bytes).unwrap();
            assert_eq!(event.get_data::<EvCtrl>().unwrap().value, value);
        }
    }

    #[test]
    fn long_sysex_goes_in_pieces_and_is_whole_again() {
        let mut sysex = vec![0xF0];
        sysex.extend((0..1000).map(|n| (n % 128) as u8));
        sysex.push(0xF7);
        let mut rest = &sysex[..];
        let mut back = Vec::new();
        let mut pieces = 0;
        while let Some((event, length)) = to_event(rest) {
            back.extend_from_slice(to_bytes(&event, &mut [0; 12]));
            rest = &rest[length..];
            pieces += 1;
        }
        assert_eq!((back, pieces), (sysex, 4));
    }

    #[test]
    fn events_of_programs_that_mean_several_messages() {
        let bytes = |kind, param, value| {
            let event = control(kind, 2, param, value);
            to_bytes(&event, &mut [0; 12]).to_vec()
        };
        assert_eq!(
            bytes(EventType::Control14, 1, 0x81),
            [0xB2, 1, 1, 0xB2, 33, 1]
        );
        assert_eq!(
            bytes(EventType::Regparam, 0, 12 << 7),
            [0xB2, 101, 0, 0xB2, 100, 0, 0xB2, 6, 12, 0xB2, 38, 0]
        );
        assert_eq!(
            bytes(EventType::Nonregparam, 0x181, 1),
            [0xB2, 99, 3, 0xB2, 98, 1, 0xB2, 6, 0, 0xB2, 38, 1]
        );
        assert_eq!(bytes(EventType::Pitchbend, 0, 99_999), [0xE2, 127, 127]);
    }
}
