//! What the engine has to say, in order, until the driver takes it.

use super::plan::SynthId;
use super::traffic::{Ask, Counters, Onset, Output, Weight};
use crate::limits::{BUNDLE_BYTES_MAX, OUTBOX_BYTES, OUTBOX_ITEMS};

/// Outputs waiting for the driver, and the counters that go with them. Room is taken once.
pub(super) struct Outbox {
    bytes: Vec<u8>,
    items: Vec<Item>,
    taken: usize,
    pub counters: Counters,
    /// Whether anybody keeps records of notes.
    pub recorded: bool,
}

#[derive(Clone, Copy)]
enum Item {
    Send {
        synth: SynthId,
        weight: Weight,
        from: u32,
        to: u32,
    },
    Onset(Onset),
    Moved(Onset),
    Ask(Ask),
}

/// Messages that go out together or not at all.
pub(super) struct Bundle {
    bytes: [u8; BUNDLE_BYTES_MAX],
    length: usize,
}

impl Bundle {
    pub fn new() -> Bundle {
        Bundle {
            bytes: [0; BUNDLE_BYTES_MAX],
            length: 0,
        }
    }

    /// Adds one message. What a note needs is known to fit (`limits.rs`).
    pub fn add(&mut self, message: &[u8]) {
        self.bytes[self.length..self.length + message.len()].copy_from_slice(message);
        self.length += message.len();
    }

    pub fn bytes(&self) -> &[u8] {
        &self.bytes[..self.length]
    }
}

impl Outbox {
    pub fn new() -> Outbox {
        Outbox {
            bytes: Vec::with_capacity(OUTBOX_BYTES),
            items: Vec::with_capacity(OUTBOX_ITEMS),
            taken: 0,
            counters: Counters::default(),
            recorded: false,
        }
    }

    /// Never grows: if the driver has let it fill up, the output is lost and counted.
    pub fn send(&mut self, synth: SynthId, weight: Weight, bytes: &[u8]) {
        if bytes.is_empty() {
            return;
        }
        if self.bytes.len() + bytes.len() > OUTBOX_BYTES || self.items.len() == OUTBOX_ITEMS {
            self.counters.overrun += 1;
            return;
        }
        let from = self.bytes.len() as u32;
        self.bytes.extend_from_slice(bytes);
        let to = self.bytes.len() as u32;
        self.items.push(Item::Send {
            synth,
            weight,
            from,
            to,
        });
    }

    pub fn onset(&mut self, onset: Onset) {
        self.push(Item::Onset(onset));
    }

    pub fn moved(&mut self, onset: Onset) {
        self.push(Item::Moved(onset));
    }

    pub fn ask(&mut self, ask: Ask) {
        self.push(Item::Ask(ask));
    }

    fn push(&mut self, item: Item) {
        if self.items.len() < OUTBOX_ITEMS {
            self.items.push(item);
        }
    }

    /// Nothing waits for the driver.
    pub fn is_drained(&self) -> bool {
        self.taken == self.items.len()
    }

    /// The next output; once all are taken, `None`, and the room is free again.
    pub fn take(&mut self) -> Option<Output<'_>> {
        let Some(item) = self.items.get(self.taken) else {
            self.items.clear();
            self.bytes.clear();
            self.taken = 0;
            return None;
        };
        self.taken += 1;
        Some(match *item {
            Item::Onset(onset) => Output::Onset(onset),
            Item::Moved(onset) => Output::Moved(onset),
            Item::Ask(ask) => Output::Ask(ask),
            Item::Send {
                synth,
                weight,
                from,
                to,
            } => Output::Send {
                synth,
                weight,
                bytes: &self.bytes[from as usize..to as usize],
            },
        })
    }
}
