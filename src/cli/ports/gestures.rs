//! What a player does, as a line to paste under `cues:`.

use crate::limits::CHANNELS;
use crate::midi::{Message, Splitter};
use crate::tuning::Key;

/// One keyboard being watched.
pub struct Gestures {
    name: String,
    splitter: Splitter,
    /// Controllers that stand at 64 or above; a press is a rise.
    up: Vec<bool>,
}

impl Gestures {
    pub fn new(name: String) -> Gestures {
        Gestures {
            name,
            splitter: Splitter::new(),
            up: vec![false; CHANNELS * 128],
        }
    }

    /// The lines for what bytes do; releases, wheels and knobs on their way down do nothing.
    pub fn lines(&mut self, bytes: &[u8]) -> Vec<String> {
        let mut lines = Vec::new();
        for byte in bytes {
            let gesture = match self.splitter.push(*byte) {
                Some(Message::Controller {
                    channel,
                    number,
                    value,
                }) if number < 120 => {
                    let up = &mut self.up[channel as usize * 128 + number as usize];
                    let rises = value >= 64 && !*up;
                    *up = value >= 64;
                    rises.then(|| (channel, format!("controller: {number}")))
                }
                Some(Message::Program { channel, number }) => {
                    // People and stage files count programs from 1.
                    Some((channel, format!("program: {}", number + 1)))
                }
                Some(Message::NoteOn { channel, key, .. }) => {
                    Key::new(key).map(|key| (channel, format!("note: {key}")))
                }
                _ => None,
            };
            if let Some((channel, what)) = gesture {
                lines.push(self.line(channel, &what));
            }
        }
        lines
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
            0xE0, 0, 0x60, 0xB0, 7, 50,
        ]);
        assert_eq!(
            lines,
            [
                "- {when: {controller: 82, from: pads}, do: next}",
                "- {when: {controller: 82, from: pads}, do: next}",
                "- {when: {program: 5, channel: 16, from: pads}, do: next}",
                "- {when: {note: D2, channel: 10, from: pads}, do: next}",
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
