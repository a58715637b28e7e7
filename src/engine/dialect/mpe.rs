//! The MPE zone: one manager that speaks for all, members that carry a note each or several of one pitch offset.

use crate::engine::outbox::Outbox;
use crate::engine::synth::Synth;
use crate::engine::traffic::Weight;
use crate::midi::parameter;

/// Declares the zone (MPE 1.1, 2.2.1). Only while nothing sounds: a receiver stops its notes on a new zone (2.2.3).
pub(in crate::engine) fn open_zone(synth: &mut Synth, manager: u8, out: &mut Outbox) {
    let members = synth.rig.members.count() as u8;
    synth.send(Weight::Owed, &parameter::zone(manager, members), out);
}

/// Turns the zone off, so that its channels are ordinary again.
pub(in crate::engine) fn close_zone(synth: &mut Synth, manager: u8, out: &mut Outbox) {
    synth.send(Weight::Owed, &parameter::zone(manager, 0), out);
}
