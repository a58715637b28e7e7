//! Plans put together by hand: one keyboard, one synth, one part, a small set. Tests change what they are about.

use std::sync::Arc;
use trued::engine::plan::{
    ByHand, ChannelSet, Dialect, KeyboardPlan, Leave, PartPlan, Pass, SongPlan, Steal, SynthPlan,
};
use trued::engine::{Plan, SynthId};
use trued::intonation::Method;
use trued::pitch::word::BendRange;
use trued::pitch::{Interval, Pitch};
use trued::time::Span;
use trued::tuning::{Key, Tuning};

pub const TAIL_MS: u64 = 1500;

/// 128 pitches in cents (100 x MIDI key), rounded to the microcent; `None` is a silent key.
pub fn tuning(cents: impl Fn(u8) -> Option<f64>) -> Arc<Tuning> {
    let pitch =
        |key: u8| cents(key).map(|cents| Pitch::from_microcents((cents * 1e6).round() as i64));
    Arc::new(Tuning::new(std::array::from_fn(|key| pitch(key as u8))))
}

/// Twelve-equal at A4 = 440 Hz.
pub fn equal() -> Arc<Tuning> {
    tuning(|key| Some(key as f64 * 100.0))
}

/// Every key its own distance from equal: the octave's, in cents.
pub fn offsets(octave: [f64; 12]) -> Arc<Tuning> {
    tuning(|key| Some(key as f64 * 100.0 + octave[key as usize % 12]))
}

pub fn song(title: &str, tuning: Arc<Tuning>) -> SongPlan {
    SongPlan {
        title: title.into(),
        tuning,
        reference: Pitch::of_key(69),
        transpose_keys: 0,
        method: Method::Fixed,
        parts: None,
        by_hand: Arc::new(ByHand::nothing(Key::C4)),
        sends: Vec::new(),
    }
}

/// A plain synth on channels 1-16 but 10, or a lower MPE zone of 15.
pub fn synth(name: &str, dialect: Dialect, range: u8) -> SynthPlan {
    let drums = match dialect {
        Dialect::Mpe { .. } => ChannelSet::NONE,
        Dialect::ChannelBend => ChannelSet::NONE.with(9),
    };
    let managers = match dialect {
        Dialect::Mpe { manager } => ChannelSet::NONE.with(manager),
        Dialect::ChannelBend => ChannelSet::NONE,
    };
    SynthPlan {
        name: name.into(),
        dialect,
        members: ChannelSet::ALL.without(drums).without(managers),
        bend_range: BendRange::new(range).expect("1-96"),
        tail: Span::from_millis(TAIL_MS),
        drums,
        local_off: false,
        share: true,
        steal: Steal::Oldest,
        leave: Leave::Plain,
        pace: Span::ZERO,
        bytes_per_s: None,
    }
}

pub fn keyboard(name: &str) -> KeyboardPlan {
    KeyboardPlan {
        name: name.into(),
        channels: ChannelSet::ALL,
        wheel_semitones: 2,
        zones: trued::engine::plan::Zones::NONE,
        finger_semitones: 48,
    }
}

/// Every key of every keyboard to the first synth.
pub fn part(synths: &[SynthPlan]) -> PartPlan {
    PartPlan {
        from: None,
        hears: ChannelSet::ALL,
        keys: (Key::new(0).expect("a key"), Key::new(127).expect("a key")),
        to: SynthId::new(0).expect("a synth"),
        pool: synths[0].members,
        transpose_keys: 0,
        offset: Interval::ZERO,
        pass: Pass::ALL,
        tune: true,
        mono: false,
        follow: trued::engine::plan::Follow::Harmony,
        late_offs: false,
    }
}

pub fn plan(synth: SynthPlan, set: Vec<SongPlan>) -> Plan {
    let synths = vec![synth];
    Plan {
        keyboards: vec![keyboard("first"), keyboard("second")],
        parts: vec![part(&synths)],
        synths,
        set,
        cues: Vec::new(),
        lamps: Vec::new(),
        lamp_ports: Vec::new(),
        edits_at_once: false,
        plain_offset: Interval::ZERO,
    }
}
