//! What a keyboard holds: its stream, and the player's hands on each of its channels.

use super::channel::UNSAID;
use super::plan::{KeyboardId, KeyboardPlan, Plan, Zones};
use super::synth::PEDALS;
use crate::limits::{CHANNELS, SENSING_MS};
use crate::midi::Splitter;
use crate::pitch::Interval;
use crate::pitch::word::Bend;
use crate::time::{Span, Time};

/// Of keyboards that no plan knows.
const WHEEL_SEMITONES: u8 = 2;

pub(super) struct Keyboard {
    /// The keyboard of the plan that it plays as: itself, unless several devices play as one.
    pub plays_as: KeyboardId,
    pub splitter: Splitter,
    /// By the plan, or as it has said itself.
    pub zones: Zones,
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
    /// Controller 74 of a note with a channel of its own.
    pub brightness: u8,
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
            brightness: UNSAID,
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
    /// `plan`: of the keyboard that it plays as.
    pub fn new(plays_as: KeyboardId, plan: Option<&KeyboardPlan>) -> Keyboard {
        let mut keyboard = Keyboard {
            plays_as,
            splitter: Splitter::new(),
            zones: Zones::NONE,
            sources: [Source::new(0); CHANNELS],
            sensed_at: None,
        };
        keyboard.let_go(plan);
        keyboard
    }

    /// Forgets the player's hands, as when the keyboard has gone.
    pub fn let_go(&mut self, plan: Option<&KeyboardPlan>) {
        let zones = plan.map_or(Zones::NONE, |plan| plan.zones);
        self.zones = zones;
        self.sources = std::array::from_fn(|channel| {
            Source::new(match zones.manager_of(channel as u8) {
                Some(_) => plan.map_or(0, |plan| plan.finger_semitones),
                None => plan.map_or(WHEEL_SEMITONES, |plan| plan.wheel_semitones),
            })
        });
    }

    /// After an edit: one that sends MPE now, or no more, begins anew. What it held has been let go.
    pub fn fit(&mut self, plan: &Plan, old: &Plan) {
        let place = self.plays_as.index();
        let zones = |plan: &Plan| plan.keyboards.get(place).map(|plan| plan.zones);
        if zones(plan) != zones(old) {
            self.let_go(plan.keyboards.get(place));
        }
    }

    /// When its silence means that it has gone.
    pub fn gone_at(&self) -> Option<Time> {
        self.sensed_at
            .map(|heard| heard + Span::from_millis(SENSING_MS))
    }
}
