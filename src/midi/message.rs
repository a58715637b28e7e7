//! One whole message, looked at.

use crate::pitch::word::Bend;
use wmidi::MidiMessage;

/// A whole message. Channels are 0-15 here and only here; people count from 1.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Message<'a> {
    /// Also a note-on with velocity 0, which means the same (MIDI 1.0, p. 10): its release velocity is then 64.
    NoteOff {
        channel: u8,
        key: u8,
        velocity: u8,
    },
    /// Velocity 1-127.
    NoteOn {
        channel: u8,
        key: u8,
        velocity: u8,
    },
    PolyPressure {
        channel: u8,
        key: u8,
        value: u8,
    },
    /// Also the channel mode messages, numbers 120-127.
    Controller {
        channel: u8,
        number: u8,
        value: u8,
    },
    Program {
        channel: u8,
        number: u8,
    },
    Pressure {
        channel: u8,
        value: u8,
    },
    PitchBend {
        channel: u8,
        bend: Bend,
    },
    /// From F0 to F7, both included.
    Sysex(&'a [u8]),
    /// F1, F2, F3 or F6 with its data.
    Common(&'a [u8]),
    /// F8, FA, FB, FC, FE or FF.
    RealTime(u8),
}

impl<'a> Message<'a> {
    /// Looks at exactly one whole message with its status byte; `None` if it is anything else.
    pub fn read(bytes: &'a [u8]) -> Option<Message<'a>> {
        let zero_velocity =
            bytes.len() == 3 && bytes[0] & 0xF0 == super::status::NOTE_ON && bytes[2] == 0;
        Some(match MidiMessage::try_from(bytes).ok()? {
            MidiMessage::NoteOff(channel, note, velocity) => Message::NoteOff {
                channel: channel.index(),
                key: note.into(),
                velocity: if zero_velocity { 64 } else { velocity.into() },
            },
            MidiMessage::NoteOn(channel, note, velocity) => Message::NoteOn {
                channel: channel.index(),
                key: note.into(),
                velocity: velocity.into(),
            },
            MidiMessage::PolyphonicKeyPressure(channel, note, value) => Message::PolyPressure {
                channel: channel.index(),
                key: note.into(),
                value: value.into(),
            },
            MidiMessage::ControlChange(channel, number, value) => Message::Controller {
                channel: channel.index(),
                number: number.into(),
                value: value.into(),
            },
            MidiMessage::ProgramChange(channel, number) => Message::Program {
                channel: channel.index(),
                number: number.into(),
            },
            MidiMessage::ChannelPressure(channel, value) => Message::Pressure {
                channel: channel.index(),
                value: value.into(),
            },
            MidiMessage::PitchBendChange(channel, bend) => Message::PitchBend {
                channel: channel.index(),
                bend: Bend::new(bend.into())?,
            },
            MidiMessage::SysEx(_) | MidiMessage::OwnedSysEx(_) => Message::Sysex(bytes),
            MidiMessage::MidiTimeCode(_)
            | MidiMessage::SongPositionPointer(_)
            | MidiMessage::SongSelect(_)
            | MidiMessage::TuneRequest => Message::Common(bytes),
            MidiMessage::Reserved(_) => return None,
            _ => Message::RealTime(bytes[0]),
        })
    }
}

/// How many data bytes follow a status byte; `None` for system exclusive, its end, and undefined ones.
pub(super) fn data_bytes(status: u8) -> Option<usize> {
    match status {
        0x80..=0xBF | 0xE0..=0xEF | 0xF2 => Some(2),
        0xC0..=0xDF | 0xF1 | 0xF3 => Some(1),
        0xF6 => Some(0),
        _ => None,
    }
}

/// Whether a system exclusive message is General MIDI On or Off (universal, 09 01-03): the receiver forgets everything.
pub fn is_reset(sysex: &[u8]) -> bool {
    matches!(sysex, [0xF0, 0x7E, _, 0x09, 0x01..=0x03, 0xF7])
}
