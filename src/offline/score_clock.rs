//! Ticks of a MIDI file and moments, exactly.

use crate::time::Time;

/// Turns ticks into moments and back. Held as fractions of a nanosecond, so that no tempo change loses anything.
#[derive(Clone, Debug, PartialEq)]
pub struct Clock {
    /// Parts of a nanosecond that everything is counted in.
    parts: u128,
    /// Stretches of even tempo, in order; the first begins at tick 0.
    stretches: Vec<Stretch>,
}

#[derive(Clone, Copy, Debug, PartialEq)]
struct Stretch {
    tick: u64,
    /// Where it begins, in parts.
    at: u128,
    /// Parts a tick.
    each: u128,
}

/// Without a tempo: 120 quarters a minute (Standard MIDI Files 1.0, "Set Tempo").
const TEMPO_US: u32 = 500_000;

impl Clock {
    /// Ticks that divide a quarter note. `tempi` are microseconds a quarter, from a tick on, in order of ticks.
    ///
    /// # Panics
    /// If `ticks` is zero: a score is checked where it is read.
    pub fn metrical(ticks: u16, tempi: &[(u64, u32)]) -> Clock {
        assert!(ticks > 0, "a quarter has ticks");
        let mut clock = Clock {
            parts: ticks as u128,
            stretches: vec![Stretch {
                tick: 0,
                at: 0,
                each: TEMPO_US as u128 * 1000,
            }],
        };
        for (tick, tempo_us) in tempi {
            let at = clock.parts_at(*tick);
            let each = *tempo_us as u128 * 1000;
            clock.stretches.push(Stretch {
                tick: *tick,
                at,
                each,
            });
        }
        clock
    }

    /// Ticks that divide a frame of film or video; tempo means nothing then. 29 frames are 30000/1001.
    ///
    /// # Panics
    /// If either is zero.
    pub fn frames(frames_per_s: u8, ticks_per_frame: u8) -> Clock {
        assert!(frames_per_s > 0 && ticks_per_frame > 0, "a frame has ticks");
        let (each, parts) = match frames_per_s {
            29 => (1_001_000_000_000, 30_000),
            whole => (1_000_000_000, whole as u128),
        };
        Clock {
            parts: parts * ticks_per_frame as u128,
            stretches: vec![Stretch {
                tick: 0,
                at: 0,
                each,
            }],
        }
    }

    pub fn time(&self, tick: u64) -> Time {
        Time::from_nanos((self.parts_at(tick) / self.parts) as u64)
    }

    /// The nearest tick that is not before `time`.
    pub fn tick_not_before(&self, time: Time) -> u64 {
        let wanted = time.nanos() as u128 * self.parts;
        let after = self.stretches.partition_point(|s| s.at <= wanted);
        let stretch = self.stretches[after - 1]; // the first begins at 0, so one is found
        stretch.tick + (wanted - stretch.at).div_ceil(stretch.each) as u64
    }

    fn parts_at(&self, tick: u64) -> u128 {
        let after = self.stretches.partition_point(|s| s.tick <= tick);
        let stretch = self.stretches[after - 1];
        stretch.at + (tick - stretch.tick) as u128 * stretch.each
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    // Standard MIDI Files 1.0, header chunk: E250 is 30 frames of 80 ticks; E728 (computed) 25 frames of 40, 1 ms a tick.
    #[test]
    fn divisions_of_the_standard() {
        assert_eq!(
            Clock::metrical(480, &[]).time(960),
            Time::from_millis(1000),
            "120 quarters a minute without a tempo"
        );
        assert_eq!(Clock::frames(25, 40).time(7), Time::from_millis(7));
        assert_eq!(Clock::frames(30, 80).time(2400), Time::from_millis(1000));
        assert_eq!(
            Clock::frames(29, 80).time(2400),
            Time::from_millis(1001),
            "29 means 30000/1001"
        );
    }

    #[test]
    fn a_tempo_change_counts_from_its_tick() {
        let clock = Clock::metrical(96, &[(96, 1_000_000), (192, 250_000)]);
        let at = |tick| clock.time(tick).nanos() / 1_000_000;
        assert_eq!([at(96), at(192), at(288), at(240)], [500, 1500, 1750, 1625]);
    }

    #[test]
    fn every_tick_comes_back_and_a_moment_goes_to_the_next_one() {
        let clock = Clock::metrical(7, &[(3, 333_333), (3, 777_777), (50, 1)]);
        for tick in 0..200 {
            let time = clock.time(tick);
            let back = clock.tick_not_before(time);
            assert_eq!(clock.time(back), time, "tick {tick}");
            assert!(back <= tick, "tick {tick}");
            let later = Time::from_nanos(time.nanos() + 1);
            assert!(clock.time(clock.tick_not_before(later)) >= later);
        }
    }
}
