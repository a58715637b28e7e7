//! What a receiver keeps for each of its sixteen channels.

/// What was last said on a channel, for finding messages that say nothing new.
pub const BEND: usize = 128;
pub const PROGRAM: usize = 129;
pub const PRESSURE: usize = 130;
const SLOTS: usize = 131;

#[derive(Clone, Debug)]
pub struct Channel {
    /// 14 bits; 8192 is the centre.
    pub bend: u16,
    pub range_cents: f64,
    /// Registered parameters 1 and 2, in cents (MIDI 1.0 p. 18).
    pub fine_cents: f64,
    pub coarse_cents: f64,
    /// The parameter that data entry goes to; none after the null parameter or a non-registered one.
    rpn: [u8; 2],
    rpn_live: bool,
    data_msb: u8,
    pub damper: bool,
    pub sostenuto: bool,
    pub controllers: [Option<u8>; 128],
    pub program: Option<u8>,
    pub pressure: u8,
    said: [Option<u16>; SLOTS],
}

/// Where data entry went.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Entry {
    BendRange,
    Tuning,
    Zone(u8),
    Nothing,
}

impl Channel {
    pub fn new(range_semitones: u8) -> Channel {
        Channel {
            bend: 8192,
            range_cents: range_semitones as f64 * 100.0,
            fine_cents: 0.0,
            coarse_cents: 0.0,
            rpn: [127, 127],
            rpn_live: true,
            data_msb: 0,
            damper: false,
            sostenuto: false,
            controllers: [None; 128],
            program: None,
            pressure: 0,
            said: [None; SLOTS],
        }
    }

    /// `(value - 8192) x range / 8192` (MPE 1.1 C.3 turned round; MIDI 1.0 p. 19 gives the end points).
    pub fn bend_cents(&self) -> f64 {
        (self.bend as f64 - 8192.0) * self.range_cents / 8192.0
    }

    /// Remembers a statement; true if the channel already had it.
    pub fn say(&mut self, slot: usize, value: u16) -> bool {
        self.said[slot].replace(value) == Some(value)
    }

    /// A set-up has begun here: whatever comes next may be said again, once.
    pub fn forget_statements(&mut self) {
        self.said = [None; SLOTS];
    }

    /// Controllers 6, 38 and 98-101 (MIDI 1.0 p. 17; the null parameter: GM2 3.4.5).
    pub fn parameter(&mut self, number: u8, value: u8) -> Entry {
        match number {
            98 | 99 => self.rpn_live = false,
            100 | 101 => {
                self.rpn[(101 - number) as usize] = value;
                self.rpn_live = true;
            }
            // Receiving the upper half sets the lower one to zero (MIDI 1.0 p. 12).
            6 => {
                self.data_msb = value;
                return self.enter(value, 0);
            }
            38 => return self.enter(self.data_msb, value),
            _ => {}
        }
        Entry::Nothing
    }

    fn enter(&mut self, msb: u8, lsb: u8) -> Entry {
        if !self.rpn_live {
            return Entry::Nothing;
        }
        match self.rpn {
            [0, 0] => self.range_cents = msb as f64 * 100.0 + lsb as f64,
            [0, 1] => {
                let word = (msb as f64) * 128.0 + lsb as f64;
                self.fine_cents = (word - 8192.0) * 100.0 / 8192.0;
            }
            [0, 2] => self.coarse_cents = (msb as f64 - 64.0) * 100.0,
            [0, 6] => return Entry::Zone(msb),
            _ => return Entry::Nothing,
        }
        if self.rpn == [0, 0] {
            Entry::BendRange
        } else {
            Entry::Tuning
        }
    }

    /// Reset All Controllers as RP-015 has it. Ranges, volume, pan, program and sound controllers stay.
    pub fn reset_controllers(&mut self) {
        self.bend = 8192;
        self.rpn = [127, 127];
        self.damper = false;
        self.sostenuto = false;
        self.pressure = 0;
        self.said[BEND] = Some(8192);
        self.said[PRESSURE] = Some(0);
        for (number, value) in [(1, 0), (11, 127), (64, 0), (65, 0), (66, 0), (67, 0)] {
            self.controllers[number] = Some(value);
            self.said[number] = Some(value as u16);
        }
    }
}
