//! Parameters that set bend ranges and MPE zones, and what a zone forbids.

use super::channel::{Channel, Entry};
use super::{Fault, Kind, Receiver};
use std::time::Duration;

/// MPE 1.1, 2.2.5.
const MANAGER_RANGE: u8 = 2;
const MEMBER_RANGE: u8 = 48;

impl Receiver {
    pub(super) fn parameter_message(&mut self, at: Duration, channel: u8, number: u8, value: u8) {
        match self.channels[channel as usize].parameter(number, value) {
            Entry::Nothing => {}
            Entry::Tuning => self.retune(at, |c| c == channel),
            Entry::BendRange => {
                self.setups += (number == 6) as u64;
                self.channels[channel as usize].forget_statements();
                self.share_range(channel);
                self.retune(at, |_| true);
            }
            // Only managers may set a zone; elsewhere it is ignored (MPE 1.1, 2.2.1). Its lower half has no function.
            Entry::Zone(members) => {
                if number == 6 && self.kind == Kind::Mpe && matches!(channel, 0 | 15) {
                    self.setups += 1;
                    self.set_zone(at, channel, members.min(15));
                }
            }
        }
    }

    /// The last range told to any member is that of all (MPE 1.1, 2.2.5).
    fn share_range(&mut self, channel: u8) {
        let Some(manager) = self.manager_of(channel) else {
            return;
        };
        let range_cents = self.channels[channel as usize].range_cents;
        for c in 0..16 {
            if self.manager_of(c) == Some(manager) {
                self.channels[c as usize].range_cents = range_cents;
            }
        }
    }

    /// The newest zone wins where two overlap (MPE 1.1, 2.2.1).
    fn set_zone(&mut self, at: Duration, manager: u8, members: u8) {
        let governors = |r: &Receiver| (0..16).map(|c| r.zone_place(c)).collect::<Vec<_>>();
        let before = governors(self);
        let (this, other) = if manager == 0 { (0, 1) } else { (1, 0) };
        self.zones[this] = members;
        // Two managers and their members share sixteen channels; a zone of fifteen takes the other manager's too.
        let left = if members == 0 {
            15
        } else {
            14u8.saturating_sub(members)
        };
        self.zones[other] = self.zones[other].min(left);
        let after = governors(self);
        let sounding = self.live.iter().any(|&n| self.notes[n].end.is_none());
        self.zones_while_sounding += sounding as u64;
        for c in 0..16u8 {
            let place = c as usize;
            // Entering or leaving a zone stops notes and resets controls (MPE 1.1, 2.2.3).
            if before[place] != after[place] {
                self.silence(at, |n| n == c);
                self.channels[place] = Channel::new(self.range_at_power_on);
            }
            if after[place] == Some(manager) {
                let range = if c == manager {
                    MANAGER_RANGE
                } else {
                    MEMBER_RANGE
                };
                self.channels[place].range_cents = range as f64 * 100.0;
                self.channels[place].forget_statements();
            }
        }
        self.retune(at, |_| true);
    }

    /// The zone a channel belongs to, as its manager's number; managers belong to their own.
    fn zone_place(&self, channel: u8) -> Option<u8> {
        match channel {
            0 if self.zones[0] > 0 => Some(0),
            15 if self.zones[1] > 0 => Some(15),
            _ => self.manager_of(channel),
        }
    }

    /// What may not stand on a member: polyphonic pressure (MPE 1.1, 2.2.7), pedals, programs, banks and the zone's own
    /// controllers and resets (2.3, table 6, appendix E). Bend range, 74, All Sound Off and note prefixes may.
    pub(super) fn check_member_rules(&mut self, at: Duration, channel: u8, message: &[u8]) {
        if self.manager_of(channel).is_none() {
            return;
        }
        let allowed = match message[0] & 0xF0 {
            0xA0 | 0xC0 => false,
            0xB0 => matches!(
                message[1],
                6 | 38 | 74 | 84 | 88 | 98..=101 | 120 | 126 | 127
            ),
            _ => true,
        };
        if !allowed {
            self.prohibited.push(Fault {
                at,
                message: message.to_vec(),
            });
        }
    }
}
