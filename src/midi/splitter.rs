//! Cuts a stream of bytes into messages.

use super::message::{Message, data_bytes};
use crate::limits::SYSEX_BYTES_MAX;

/// Cuts one port's stream into whole messages: running status, real-time bytes inside others, broken input.
///
/// Receiver's rules of MIDI 1.0, additional explanations, p. A-2: running status is set by channel messages, cleared by
/// F0-F7, untouched by F8-FF; data without a status is dropped; a new status always begins anew.
#[derive(Debug)]
pub struct Splitter {
    /// Status of the message being gathered or repeated; 0 when there is none.
    status: u8,
    data: [u8; 3],
    gathered: usize,
    /// Room for the longest sysex, taken once.
    sysex: Vec<u8>,
    state: State,
    bad_bytes: u64,
    sysex_lost: u64,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum State {
    Short,
    Sysex,
    /// A sysex that has grown too long: swallowed up to its end.
    TooLong,
}

impl Default for Splitter {
    fn default() -> Self {
        Splitter::new()
    }
}

impl Splitter {
    /// The only allocation: room for one sysex.
    pub fn new() -> Splitter {
        Splitter {
            sysex: Vec::with_capacity(SYSEX_BYTES_MAX),
            ..Splitter::lent()
        }
    }

    /// A stand-in without room, to hold the place of one that is lent out. It has no heap and is never fed.
    pub fn lent() -> Splitter {
        Splitter {
            sysex: Vec::new(),
            status: 0,
            data: [0; 3],
            gathered: 0,
            state: State::Short,
            bad_bytes: 0,
            sysex_lost: 0,
        }
    }

    /// Takes the next byte; gives a message if it completes one.
    pub fn push(&mut self, byte: u8) -> Option<Message<'_>> {
        match byte {
            0xF8..=0xFF => self.real_time(byte),
            0xF0 => {
                self.break_off();
                self.status = 0;
                self.state = State::Sysex;
                self.sysex.clear();
                self.sysex.push(byte);
                None
            }
            0xF7 => self.end_sysex(),
            0x80..=0xF6 => {
                self.break_off();
                self.start(byte)
            }
            _ => self.data(byte),
        }
    }

    /// Bytes dropped since the last call because they made no message.
    pub fn take_bad_bytes(&mut self) -> u64 {
        std::mem::take(&mut self.bad_bytes)
    }

    /// Sysex messages lost since the last call: too long, or cut off by another status.
    pub fn take_sysex_lost(&mut self) -> u64 {
        std::mem::take(&mut self.sysex_lost)
    }

    /// Forgets what was being gathered, as after a lost connection.
    pub fn reset(&mut self) {
        self.break_off();
        self.status = 0;
    }

    fn real_time(&mut self, byte: u8) -> Option<Message<'_>> {
        if matches!(byte, 0xF9 | 0xFD) {
            self.bad_bytes += 1;
            return None;
        }
        Some(Message::RealTime(byte))
    }

    /// A status byte has come before the message under way was whole.
    fn break_off(&mut self) {
        match self.state {
            State::Short => self.bad_bytes += self.gathered as u64,
            State::Sysex | State::TooLong => self.sysex_lost += 1,
        }
        self.state = State::Short;
        self.gathered = 0;
    }

    fn start(&mut self, status: u8) -> Option<Message<'_>> {
        match data_bytes(status) {
            Some(0) => {
                self.status = 0;
                self.data[0] = status;
                Message::read(&self.data[..1])
            }
            Some(_) => {
                self.status = status;
                None
            }
            None => {
                self.status = 0;
                self.bad_bytes += 1;
                None
            }
        }
    }

    fn data(&mut self, byte: u8) -> Option<Message<'_>> {
        match self.state {
            State::TooLong => return None,
            State::Sysex => {
                // One byte is kept for the end.
                if self.sysex.len() + 1 < SYSEX_BYTES_MAX {
                    self.sysex.push(byte);
                } else {
                    self.state = State::TooLong;
                }
                return None;
            }
            State::Short => {}
        }
        let Some(wanted) = data_bytes(self.status).filter(|_| self.status != 0) else {
            self.bad_bytes += 1;
            return None;
        };
        self.data[1 + self.gathered] = byte;
        self.gathered += 1;
        if self.gathered < wanted {
            return None;
        }
        self.gathered = 0;
        self.data[0] = self.status;
        if self.status >= 0xF0 {
            self.status = 0; // running status is for channel messages only
        }
        Message::read(&self.data[..1 + wanted])
    }

    fn end_sysex(&mut self) -> Option<Message<'_>> {
        let state = self.state;
        if state != State::Sysex {
            self.break_off();
            self.status = 0;
            self.bad_bytes += (state == State::Short) as u64;
            return None;
        }
        self.state = State::Short;
        self.sysex.push(0xF7);
        Some(Message::Sysex(&self.sysex))
    }
}
