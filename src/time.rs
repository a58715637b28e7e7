//! Points and spans of time, in nanoseconds since an epoch that the caller chose.
//!
//! Deliberately absent: `now()`. The core cannot read a clock; whoever drives it says what time it is.

use std::ops::{Add, Sub};

/// A moment: nanoseconds since the epoch of whoever drives the engine. Only compare times of one driver.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Time(u64);

/// A length of time in nanoseconds, never negative.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Span(u64);

impl Time {
    pub const START: Time = Time(0);

    pub const fn from_nanos(nanos: u64) -> Time {
        Time(nanos)
    }

    pub const fn from_millis(millis: u64) -> Time {
        Time(millis * 1_000_000)
    }

    pub const fn nanos(self) -> u64 {
        self.0
    }

    /// The span from `earlier` to here; nothing if `earlier` is in fact later (clocks are not trusted).
    pub const fn since(self, earlier: Time) -> Span {
        Span(self.0.saturating_sub(earlier.0))
    }
}

impl Span {
    pub const ZERO: Span = Span(0);

    pub const fn from_nanos(nanos: u64) -> Span {
        Span(nanos)
    }

    pub const fn from_millis(millis: u64) -> Span {
        Span(millis * 1_000_000)
    }

    pub const fn nanos(self) -> u64 {
        self.0
    }

    /// Milliseconds, for people.
    pub fn millis(self) -> f64 {
        self.0 as f64 / 1e6
    }
}

impl Add<Span> for Time {
    type Output = Time;
    fn add(self, span: Span) -> Time {
        Time(self.0.saturating_add(span.0))
    }
}

impl Sub<Span> for Time {
    type Output = Time;
    fn sub(self, span: Span) -> Time {
        Time(self.0.saturating_sub(span.0))
    }
}
