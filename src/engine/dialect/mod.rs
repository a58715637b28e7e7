//! How each dialect spreads a player's gestures over a synth's channels.
//!
//! **What this room is**: what differs between an MPE zone and a plain multitimbral synth, and nothing else.
//! **Start reading at** [`on_members`].
//! **May know** the engine's plan and synths.
//! **Owns**: a gesture reaches the channels of its own part only.
//! **Not here**: which channel a note takes (`choose`), which channels a part speaks for (`parts`).

pub(super) mod mpe;

use super::plan::{ChannelSet, Dialect, PartPlan};
use super::synth::Rig;

/// The channels that a part's new notes may take. While a changed rig waits for silence, only those that both have.
pub(super) fn members(rig: &Rig, part: &PartPlan) -> ChannelSet {
    ChannelSet(part.pool.0 & rig.members.0)
}

/// Whether wheel, pressure and pedals are played on the part's own channels rather than by an MPE manager. Parts that
/// share a manager (`late_offs`) may not move each other's notes with it.
pub(super) fn on_members(rig: &Rig, part: &PartPlan) -> bool {
    rig.dialect == Dialect::ChannelBend || part.late_offs
}
