//! How a song's notes meet its harmony, as the player set it.

use crate::pitch::Interval;
use crate::time::Span;

/// How a song's notes are placed.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Method {
    /// Every key sounds what its tuning says, always.
    #[default]
    Fixed,
    /// The chord now sounding takes its exact shape, placed where what sounds and what has just sounded want it.
    ChordRoot(Settings),
    /// Every interval pulls towards its just size, and what is left over is shared out.
    LeastSquares(Settings),
}

impl Method {
    pub fn settings(&self) -> Option<&Settings> {
        match self {
            Method::Fixed => None,
            Method::ChordRoot(settings) | Method::LeastSquares(settings) => Some(settings),
        }
    }
}

/// The intervals of a chord.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Ratios {
    /// 5-limit.
    #[default]
    Pure,
    /// The same, but dominant sevenths are 4:5:6:7.
    PureWith7,
    /// Twelve of one's own: how far each key above the root stands from equal, the root first.
    Own([Interval; 12]),
}

/// The knobs of the adaptive methods.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Settings {
    pub ratios: Ratios,
    /// How far the sounding chord may stand from the tuning at rest, on average; `None`: as far as its common tones
    /// carry it.
    pub drift_limit: Option<Interval>,
    /// How fast a chord that stands on returns, in a second.
    pub return_per_s: Interval,
    /// Notes younger than this still jump to their place as the chord fills in.
    pub settle: Span,
    /// How far an older note may be moved for one event; twice that in its life. `None`: as far as the chord wants.
    pub hold_limit: Option<Interval>,
    /// How fast it is moved, in a second.
    pub glide_per_s: Interval,
    /// How long a note that has ended still counts.
    pub memory: Span,
}

impl Settings {
    /// What a bare method name means.
    pub const DEFAULT: Settings = Settings {
        ratios: Ratios::Pure,
        drift_limit: Some(Interval::from_cents(12)),
        return_per_s: Interval::from_cents(2),
        settle: Span::from_millis(50),
        hold_limit: Some(Interval::from_cents(6)),
        glide_per_s: Interval::from_cents(30),
        memory: Span::from_millis(3_000),
    };
}

impl Default for Settings {
    fn default() -> Settings {
        Settings::DEFAULT
    }
}
