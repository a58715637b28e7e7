//! Output to the sequencer: a bundle is one write, and a receiver that is full is found out.

use super::events::to_event;
use crate::ports::Wire;
use crate::ports::hotplug::Hotplug;
use alsa::Seq;

/// Bytes of an event in the sequencer's buffer, without what a sysex has behind it.
const EVENT_BYTES: usize = 28;

/// Writes to the subscribers of our output ports.
pub struct SeqWire<'a> {
    pub seq: &'a Seq,
    /// Our port number for each synth.
    pub ports: &'a [i32],
    pub hotplug: &'a Hotplug,
    /// Synths of which one hearer of several was full and went without something, bit 0 = the first.
    pub missed: u8,
}

impl Wire for SeqWire<'_> {
    fn write(&mut self, synth: usize, bytes: &[u8]) -> usize {
        let mut written = 0;
        while written < bytes.len() {
            let loaded = self.load(synth, &bytes[written..]);
            if loaded == 0 {
                return bytes.len(); // no message at all: there is no sense in keeping it
            }
            let taken = self.drain(synth, &bytes[written..written + loaded]);
            if taken == 0 {
                break;
            }
            written += taken;
        }
        written
    }

    /// A program's queue in the kernel that runs over is thrown away whole (seen in tests/outside/alsa.rs). Hardware
    /// never looks full: what its driver cannot hold, it drops without a word (from memory of the kernel's seq_midi).
    fn loses_when_full(&self) -> bool {
        true
    }
}

impl SeqWire<'_> {
    /// Puts messages into the buffer until they end or it is full; says how many bytes they are.
    fn load(&self, synth: usize, bytes: &[u8]) -> usize {
        let mut loaded = 0;
        while let Some((mut event, length)) = to_event(&bytes[loaded..]) {
            event.set_source(self.ports[synth]);
            event.set_subs();
            event.set_direct();
            if self.seq.event_output_buffer(&mut event).is_err() {
                break;
            }
            loaded += length;
        }
        loaded
    }

    /// Writes the buffer out; says how many of its bytes are done with.
    fn drain(&mut self, synth: usize, loaded: &[u8]) -> usize {
        let size = buffer_size(loaded);
        let left = match self.seq.drain_output() {
            Ok(left) => left as usize,
            Err(error) if matches!(error.errno(), libc::EAGAIN | libc::ENOMEM) => size,
            // Refused for good (the subscriber went this very moment): nobody to wait for.
            Err(_) => 0,
        };
        if left == 0 {
            return loaded.len();
        }
        let _ = self.seq.drop_output();
        let taken = bytes_in(loaded, size - left);
        // One of several receivers is full and the others have heard this message: they must not hear it again, so
        // the full one goes without.
        let heard_by_others = self.hotplug.hearing(synth).len() > 1;
        self.missed |= u8::from(heard_by_others) << synth;
        taken
            + if heard_by_others {
                first(&loaded[taken..])
            } else {
                0
            }
    }
}

/// What messages take in the sequencer's buffer.
fn buffer_size(mut bytes: &[u8]) -> usize {
    let mut size = 0;
    while !bytes.is_empty() {
        size += event_size(bytes);
        bytes = &bytes[first(bytes)..];
    }
    size
}

/// How many bytes of messages fill so much of the sequencer's buffer.
fn bytes_in(bytes: &[u8], size: usize) -> usize {
    let (mut taken, mut filled) = (0, 0);
    while taken < bytes.len() && filled + event_size(&bytes[taken..]) <= size {
        filled += event_size(&bytes[taken..]);
        taken += first(&bytes[taken..]);
    }
    taken
}

fn event_size(bytes: &[u8]) -> usize {
    match bytes.first() {
        Some(0xF0 | 0xF7 | 0x00..=0x7F) => EVENT_BYTES + first(bytes),
        _ => EVENT_BYTES,
    }
}

/// Bytes of the first message or piece; all that is left if it is none.
fn first(bytes: &[u8]) -> usize {
    to_event(bytes).map_or(bytes.len(), |(_, length)| length)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_was_written_is_known_from_what_is_left() {
        let mut bytes = vec![0xE0, 0, 0x40, 0xC1, 5, 0xF0];
        bytes.extend([1; 299]);
        bytes.extend([0xF7, 0x90, 60, 100]);
        assert_eq!(buffer_size(&bytes), 5 * EVENT_BYTES + 301);
        assert_eq!(bytes_in(&bytes, 0), 0);
        assert_eq!(bytes_in(&bytes, EVENT_BYTES), 3);
        assert_eq!(bytes_in(&bytes, 2 * EVENT_BYTES), 5);
        assert_eq!(bytes_in(&bytes, 3 * EVENT_BYTES + 256), 5 + 256);
        assert_eq!(bytes_in(&bytes, 4 * EVENT_BYTES + 301), 5 + 301);
        assert_eq!(bytes_in(&bytes, buffer_size(&bytes)), bytes.len());
    }
}
