//! MIDI bytes and messages.
//!
//! **What this room is**: a stream splitter ([`Splitter`]), messages as a closed list ([`Message`]), the sequences
//! that set parameters ([`parameter`]).
//! **Start reading at** [`Message`].
//! **May know** `pitch/` (for bend words), `limits`.
//! **Owns** wmidi. What trued does not change is passed on as the raw bytes it came in.
//! **Not here**: which channel a note takes (`engine/`), MIDI files (`offline/`).

mod message;
pub mod parameter;
mod splitter;

pub use message::{Message, is_reset};
pub use splitter::Splitter;

/// Controllers the engine has something to say about, by number (MIDI 1.0, table 3; 74 by MPE 1.1, 88 from CA-031).
pub mod controller {
    pub const BANK_MSB: u8 = 0;
    pub const DATA_MSB: u8 = 6;
    pub const BANK_LSB: u8 = 32;
    pub const DATA_LSB: u8 = 38;
    pub const DAMPER: u8 = 64;
    pub const SOSTENUTO: u8 = 66;
    pub const SOFT: u8 = 67;
    pub const HOLD_2: u8 = 69;
    pub const BRIGHTNESS: u8 = 74;
    pub const PORTAMENTO_FROM: u8 = 84;
    pub const VELOCITY_LOW: u8 = 88;
    pub const DATA_UP: u8 = 96;
    pub const DATA_DOWN: u8 = 97;
    pub const NRPN_LSB: u8 = 98;
    pub const NRPN_MSB: u8 = 99;
    pub const RPN_LSB: u8 = 100;
    pub const RPN_MSB: u8 = 101;
    pub const ALL_SOUND_OFF: u8 = 120;
    pub const RESET_ALL: u8 = 121;
    pub const LOCAL: u8 = 122;
    pub const ALL_NOTES_OFF: u8 = 123;
}

/// Status bytes of channel messages, channel nibble zero.
pub mod status {
    pub const NOTE_OFF: u8 = 0x80;
    pub const NOTE_ON: u8 = 0x90;
    pub const POLY_PRESSURE: u8 = 0xA0;
    pub const CONTROLLER: u8 = 0xB0;
    pub const PROGRAM: u8 = 0xC0;
    pub const PRESSURE: u8 = 0xD0;
    pub const BEND: u8 = 0xE0;
    pub const SONG_SELECT: u8 = 0xF3;
}
