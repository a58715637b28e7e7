//! The way from the desk to the score thread, with a count, so that the desk knows when an order has been followed.

use crate::engine::Command;
use crate::ports::Ring;
use rtrb::Producer;

pub struct Orders {
    commands: Producer<Command>,
    bell: Box<dyn Ring>,
    given: u64,
}

impl Orders {
    pub fn new(commands: Producer<Command>, bell: Box<dyn Ring>) -> Orders {
        Orders {
            commands,
            bell,
            given: 0,
        }
    }

    /// Wakes the score thread for something other than an order.
    pub fn ring(&self) {
        self.bell.ring();
    }

    /// The score thread waits at other ports now.
    pub fn ring_at(&mut self, bell: Box<dyn Ring>) {
        self.bell = bell;
    }

    /// Gives an order and wakes the score thread. It is followed once `Pulse::obeyed` has come to the number returned;
    /// `None` if so many wait already that the score thread must be stuck.
    pub fn give(&mut self, command: Command) -> Option<u64> {
        self.commands.push(command).ok()?;
        self.given += 1;
        self.bell.ring();
        Some(self.given)
    }
}
