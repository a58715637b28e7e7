//! Output through midir: one message a call, each of them a write of its own.

use crate::ports::message::cut;
use crate::ports::{Tally, Wire};
use midir::{MidiOutputConnection, SendError};
use std::sync::atomic::Ordering;

/// Longer system exclusive messages are left out: midir sends them in one piece, which no queue in a system may hold,
/// and a message that is refused for ever would hold up all behind it.
const SYSEX_MAX: usize = 4 * 1024;

/// Writes to the connection of each synth.
pub struct Outputs<'a> {
    pub outputs: &'a mut [Option<MidiOutputConnection>],
    pub tally: &'a Tally,
}

impl Wire for Outputs<'_> {
    fn write(&mut self, synth: usize, bytes: &[u8]) -> usize {
        let Some(output) = self.outputs.get_mut(synth).and_then(Option::as_mut) else {
            return bytes.len(); // nobody to wait for
        };
        let mut rest = bytes;
        while let Some((message, more)) = cut(rest) {
            if message.len() > SYSEX_MAX {
                self.tally.too_long.fetch_add(1, Ordering::Relaxed);
            } else if let Err(SendError::Other(_)) = output.send(message) {
                return bytes.len() - rest.len();
            }
            rest = more;
        }
        bytes.len() // what is left is no message: there is no sense in keeping it
    }

    /// On Linux midir writes to the sequencer, which throws a queue that ran over away. Of others nothing is known.
    fn loses_when_full(&self) -> bool {
        cfg!(target_os = "linux")
    }
}
