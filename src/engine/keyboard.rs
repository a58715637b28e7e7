//! What a keyboard holds: its stream, and the player's hands on each of its channels.

use super::channel::UNSAID;
use super::plan::KeyboardId;
use super::synth::PEDALS;
use crate::limits::{CHANNELS, SENSING_MS};
use crate::midi::Splitter;
use crate::pitch::Interval;
use crate::pitch::word::Bend;
use crate::time::{Span, Time};

pub(super) struct Keyboard {
    /// The keyboard of the plan that it plays as: itself, unless several devices play as one.
    pub plays_as: KeyboardId,
    pub splitter: Splitter,
    pub sources: [Source; CHANNELS],
    /// Set once it has sent Active Sensing: when it was last heard.
    pub sensed_at: Option<Time>,
}

/// One channel of a keyboard: wheel, pedals and what is half said.
#[derive(Clone, Copy)]
pub(super) struct Source {
    pub wheel: Bend,
    /// What a full push of the wheel means.
    pub wheel_range: Interval,
    pub pressure: u8,
    /// In the order of `PEDALS`.
    pub pedals: [u8; 4],
    /// Keys that are down, whether they sound or not; those that cues take away are no playing. Bit 0 = key 0.
    pub keys: u128,
    /// Keys that are down and only named something. Bit 0 = key 0.
    pub named: u128,
    pub select: Select,
    pub data_msb: u8,
    /// CC88, for the next note.
    pub velocity_low: Option<u8>,
    /// CC84, for the next note.
    pub portamento_from: Option<u8>,
    /// Latest value of each controller and of pressure, `UNSAID` before the first, to see them come into a cue's values.
    pub latest: [u8; 128],
    pub latest_pressure: u8,
    pub bank: [u8; 2],
}

/// The parameter that data entry would set.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub(super) enum Select {
    #[default]
    Nothing,
    Registered([u8; 2]),
    NonRegistered([u8; 2]),
}

impl Source {
    fn new(wheel_semitones: u8) -> Source {
        Source {
            wheel: Bend::CENTRE,
            wheel_range: Interval::SEMITONE * wheel_semitones as i64,
            pressure: 0,
            pedals: [0; PEDALS.len()],
            keys: 0,
            named: 0,
            select: Select::Nothing,
            data_msb: 0,
            velocity_low: None,
            portamento_from: None,
            latest: [UNSAID; 128],
            latest_pressure: UNSAID,
            bank: [UNSAID; 2],
        }
    }

    /// All keys and pedals are up.
    pub fn is_quiet(&self) -> bool {
        self.keys == 0 && self.pedals.iter().all(|value| *value < 64)
    }

    /// How far the wheel is pushed.
    pub fn wheel_interval(&self) -> Interval {
        let steps = self.wheel.value() as i64 - Bend::CENTRE.value() as i64;
        Interval::from_microcents((steps * self.wheel_range.microcents() + 4096).div_euclid(8192))
    }

    /// Takes one half of a parameter's number.
    pub fn select_half(&mut self, registered: bool, low: bool, value: u8) {
        let mut number = match self.select {
            Select::Registered(number) if registered => number,
            Select::NonRegistered(number) if !registered => number,
            _ => [0x7F; 2],
        };
        number[low as usize] = value;
        self.select = match (registered, number) {
            (true, number) => Select::Registered(number),
            (false, number) => Select::NonRegistered(number),
        };
    }
}

impl Keyboard {
    pub fn new(plays_as: KeyboardId, wheel_semitones: u8) -> Keyboard {
        Keyboard {
            plays_as,
            splitter: Splitter::new(),
            sources: [Source::new(wheel_semitones); CHANNELS],
            sensed_at: None,
        }
    }

    /// Forgets the player's hands, as when the keyboard has gone.
    pub fn let_go(&mut self, wheel_semitones: u8) {
        self.sources = [Source::new(wheel_semitones); CHANNELS];
    }

    /// When its silence means that it has gone.
    pub fn gone_at(&self) -> Option<Time> {
        self.sensed_at
            .map(|heard| heard + Span::from_millis(SENSING_MS))
    }
}
