//! The only place in the house that asks the time.

use crate::time::{Span, Time};
use std::time::Instant;

/// Microseconds as the machine counts them, for a supervisor that compares.
#[cfg(target_os = "linux")]
pub fn monotonic_micros() -> u64 {
    super::system::monotonic_micros()
}

/// The monotonic clock, counted from when this value was made.
#[derive(Clone, Copy, Debug)]
pub struct Clock {
    start: Instant,
}

impl Clock {
    /// Starts at a second past the epoch, so that a little before the start is still a time.
    pub fn start() -> Clock {
        Clock {
            start: Instant::now(),
        }
    }

    pub fn now(&self) -> Time {
        // 584 years fit.
        let nanos = self.start.elapsed().as_nanos() as u64;
        Time::from_millis(1_000) + Span::from_nanos(nanos)
    }
}
