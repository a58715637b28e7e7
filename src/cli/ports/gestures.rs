//! What a player does, as a line to paste under `cues:`.

use crate::limits::CHANNELS;
use crate::midi::{Message, Splitter, controller, status};
use crate::tuning::Key;

/// One keyboard being watched.
pub struct Gestures {
    name: String,
    splitter: Splitter,
    /// Controllers, and pressure behind them, that stand at 64 or above; a press is a rise.
    up: Vec<bool>,
    /// What controllers 0 and 32 have said on each channel.
    banks: [[u8; 2]; CHANNELS],
}

/// Where pressure stands among the controllers of its channel.
const PRESSURE: u8 = 128;
const CONTROLS: usize = 129;

impl Gestures {
    pub fn new(name: String) -> Gestures {
        Gestures {
            name,
            splitter: Splitter::new(),
            up: vec![false; CHANNELS * CONTROLS],
            banks: [[0; 2]; CHANNELS],
        }
    }

    /// The lines for what bytes do; releases, wheels and knobs on their way down do nothing.
    pub fn lines(&mut self, bytes: &[u8]) -> Vec<String> {
        let mut lines = Vec::new();
        for byte in bytes {
            let gesture = match self.splitter.push(*byte) {
                Some(Message::Controller {
                    channel,
                    number: number @ (controller::BANK_MSB | controller::BANK_LSB),
                    value,
                }) => {
                    self.banks[channel as usize][usize::from(number != 0)] = value;
                    None
                }
                Some(Message::Controller {
                    channel,
                    number,
                    value,
                }) if number < 120 => self
                    .rises(channel, number, value)
                    .then(|| (channel, format!("controller: {number}"))),
                Some(Message::Pressure { channel, value }) => self
                    .rises(channel, PRESSURE, value)
                    .then(|| (channel, String::from("pressure: 64.."))),
                Some(Message::Program { channel, number }) => {
                    let bank = match self.banks[channel as usize] {
                        [0, 0] => String::new(),
                        [msb, lsb] => format!(", bank: {msb}/{lsb}"),
                    };
                    // People and stage files count programs from 1.
                    Some((channel, format!("program: {}{bank}", number + 1)))
                }
                Some(Message::NoteOn { channel, key, .. }) => {
                    Key::new(key).map(|key| (channel, format!("note: {key}")))
                }
                Some(Message::Common([status::SONG_SELECT, number])) => {
                    Some((0, format!("song_select: {}", number + 1)))
                }
                _ => None,
            };
            if let Some((channel, what)) = gesture {
                lines.push(self.line(channel, &what));
            }
        }
        lines
    }

    fn rises(&mut self, channel: u8, number: u8, value: u8) -> bool {
        let up = &mut self.up[channel as usize * CONTROLS + number as usize];
        let was_up = std::mem::replace(up, value >= 64);
        *up && !was_up
    }

    fn line(&self, channel: u8, what: &str) -> String {
        let channel = match channel {
            0 => String::new(),
            other => format!(", channel: {}", other + 1),
        };
        format!(
            "- {{when: {{{what}{channel}, from: {}}}, do: next}}",
            self.name
        )
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::stage::Stage;
    use std::path::Path;

    #[test]
    fn presses_become_cues_and_releases_nothing() {
        let mut gestures = Gestures::new("pads".to_string());
        let lines = gestures.lines(&[
            0xB0, 82, 127, 0xB0, 82, 0, 0xB0, 82, 100, 82, 127, 0xCF, 4, 0x99, 38, 90, 0x89, 38, 0,
            0xE0, 0, 0x60, 0xB0, 7, 50, 0xB0, 0, 121, 32, 3, 0xC0, 6, 0xF3, 2, 0xD0, 70, 90, 20,
        ]);
        assert_eq!(
            lines,
            [
                "- {when: {controller: 82, from: pads}, do: next}",
                "- {when: {controller: 82, from: pads}, do: next}",
                "- {when: {program: 5, channel: 16, from: pads}, do: next}",
                "- {when: {note: D2, channel: 10, from: pads}, do: next}",
                "- {when: {program: 7, bank: 121/3, from: pads}, do: next}",
                "- {when: {song_select: 3, from: pads}, do: next}",
                "- {when: {pressure: 64.., from: pads}, do: next}",
            ]
        );
        // And they load.
        let mut file = String::from(
            "stage: Cues\nkeyboards: {pads: {port: virtual}}\nset: [{song: One, tuning: equal-12}]\ncues:\n",
        );
        for line in &lines[1..] {
            file.push_str(&format!("  {line}\n"));
        }
        if let Err(complaints) = Stage::parse(Path::new("cues.yaml"), &file) {
            panic!("{}", complaints[0]);
        }
    }
}
