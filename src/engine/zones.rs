//! MPE zones that a keyboard plays: a manager speaks for the whole hand, each member for the note on it.

/// Members of the lower and of the upper zone. None in either: an ordinary keyboard.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Zones([u8; 2]);

/// The managers' channels, from 0 (MPE 1.1, 2.2.1).
const LOWER: u8 = 0;
const UPPER: u8 = 15;

impl Zones {
    pub const NONE: Zones = Zones([0, 0]);

    /// Sets up a zone, as a keyboard does by its MPE Configuration Message. Where two overlap, the newest has its way
    /// and the other keeps what is left. Another manager than 0 or 15 has none.
    pub fn set(&mut self, manager: u8, members: u8) {
        let (this, other) = match manager {
            LOWER => (0, 1),
            UPPER => (1, 0),
            _ => return,
        };
        self.0[this] = members.min(15);
        if members > 0 {
            // Two managers and their members share sixteen channels; fifteen members take the other manager's too.
            self.0[other] = self.0[other].min(14u8.saturating_sub(members));
        }
    }

    /// The manager of a member; `None` for managers themselves and for ordinary channels.
    pub const fn manager_of(self, channel: u8) -> Option<u8> {
        if channel > LOWER && channel <= self.0[0] {
            Some(LOWER)
        } else if channel < UPPER && channel + self.0[1] >= UPPER {
            Some(UPPER)
        } else {
            None
        }
    }

    /// The zone a channel belongs to, by its manager.
    pub const fn zone_of(self, channel: u8) -> Option<u8> {
        match channel {
            LOWER if self.0[0] > 0 => Some(LOWER),
            UPPER if self.0[1] > 0 => Some(UPPER),
            _ => self.manager_of(channel),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The examples of MPE 1.0, 2.1.2: lower zone of seven; seven and seven; upper zone of fifteen.
    #[test]
    fn printed_examples() {
        let members = |zones: Zones, manager| {
            (0..16)
                .filter(|channel| zones.manager_of(*channel) == Some(manager))
                .map(|channel| channel + 1)
                .collect::<Vec<u8>>()
        };
        let mut zones = Zones::NONE;
        zones.set(LOWER, 7);
        zones.set(UPPER, 0);
        assert_eq!(members(zones, LOWER), [2, 3, 4, 5, 6, 7, 8]);
        assert_eq!(zones.zone_of(15), None);
        zones.set(UPPER, 7);
        assert_eq!(members(zones, LOWER), [2, 3, 4, 5, 6, 7, 8]);
        assert_eq!(members(zones, UPPER), [9, 10, 11, 12, 13, 14, 15]);
        zones.set(UPPER, 15);
        assert_eq!(members(zones, UPPER), (1..=15).collect::<Vec<u8>>());
        assert_eq!(
            (members(zones, LOWER), zones.zone_of(0)),
            (vec![], Some(UPPER))
        );
        zones.set(3, 4);
        assert_eq!(zones, Zones([0, 15]), "only managers set zones");
    }
}
