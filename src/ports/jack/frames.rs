//! Frames of a JACK server as times, and back, in whole numbers.
//!
//! The server counts frames in 32 bits, which are full after a day (24.8 h at 48 kHz), and begins anew when it is
//! started again; our time does neither.

use crate::time::{Span, Time};

const NANOS: u128 = 1_000_000_000;

/// The time of each frame of the cycle under way.
#[derive(Clone, Copy, Debug)]
pub struct Frames {
    rate: u32,
    /// When our count was 0.
    zero: Time,
    /// The server's count at the start of the cycle, and ours.
    count: u32,
    start: u64,
    /// How long the cycle is.
    length: u32,
}

impl Frames {
    /// The server's count is `count` at `zero`.
    pub fn new(rate: u32, zero: Time, count: u32) -> Frames {
        Frames {
            rate: rate.max(1),
            zero,
            count,
            start: 0,
            length: 0,
        }
    }

    /// A cycle of `length` frames begins. A server that was late has skipped frames; one that says that it has gone
    /// back is not believed: no two cycles overlap.
    pub fn begin(&mut self, count: u32, length: u32) {
        let step = count.wrapping_sub(self.count);
        let believed = step >= self.length && step <= u32::MAX / 2;
        self.start += u64::from(if believed { step } else { self.length });
        self.count = count;
        self.length = length;
    }

    /// When a frame of this cycle is.
    pub fn time(&self, frame: u32) -> Time {
        let nanos = u128::from(self.start + u64::from(frame)) * NANOS / u128::from(self.rate);
        self.zero + Span::from_nanos(nanos as u64)
    }

    /// The first frame of this cycle that is not before a time; the last one if all are.
    pub fn frame(&self, time: Time) -> u32 {
        let nanos = u128::from(time.since(self.zero).nanos());
        let frame = (nanos * u128::from(self.rate)).div_ceil(NANOS);
        let last = u64::from(self.length.saturating_sub(1));
        (frame as u64).saturating_sub(self.start).min(last) as u32
    }

    /// When the last frame of this cycle is.
    pub fn end(&self) -> Time {
        self.time(self.length.saturating_sub(1))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_frame_has_its_time_and_every_time_its_frame() {
        for rate in [8_000, 44_100, 48_000, 96_000, 192_000] {
            let mut frames = Frames::new(rate, Time::from_millis(1_234), 99);
            let mut before = Time::START;
            for cycle in 0..3_000u32 {
                frames.begin(99 + cycle * 64, 64);
                for frame in [0, 1, 31, 63] {
                    let time = frames.time(frame);
                    assert!(time > before);
                    assert_eq!(frames.frame(time), frame, "rate {rate}, cycle {cycle}");
                    before = time;
                }
                assert_eq!(frames.end(), before);
            }
        }
        let mut frames = Frames::new(48_000, Time::from_millis(1_000), 0);
        frames.begin(48_000, 64);
        assert_eq!(frames.time(0), Time::from_millis(2_000));
    }

    #[test]
    fn a_time_between_two_frames_waits_for_the_next() {
        let mut frames = Frames::new(48_000, Time::START, 0);
        frames.begin(64, 64);
        let between = frames.time(10) + Span::from_nanos(1);
        assert_eq!(frames.frame(between), 11);
        assert_eq!(frames.frame(Time::START), 0);
        assert_eq!(frames.frame(Time::from_millis(9_000)), 63);
    }

    #[test]
    fn the_count_runs_over_after_a_day_and_time_goes_on() {
        let mut frames = Frames::new(48_000, Time::START, u32::MAX - 63);
        frames.begin(u32::MAX - 63, 64);
        let before = frames.time(63);
        frames.begin(0, 64);
        assert_eq!(frames.time(0).since(before).nanos(), 1_000_000_000 / 48_000);
    }

    #[test]
    fn skipped_frames_pass_and_a_count_that_goes_back_does_not() {
        let mut frames = Frames::new(1_000, Time::START, 0);
        frames.begin(0, 10);
        frames.begin(50, 10);
        assert_eq!(frames.time(0), Time::from_millis(50));
        frames.begin(7, 10);
        assert_eq!(frames.time(0), Time::from_millis(60));
        frames.begin(17, 10);
        assert_eq!(frames.time(0), Time::from_millis(70));
    }
}
