//! Which channel a new note takes.

use super::channel::{Channel, Rest};
use super::fingers::Finger;
use super::following::Class;
use super::plan::{ChannelSet, PartId, Steal};
use super::synth::Synth;
use super::voices::Voices;
use crate::pitch::Interval;
use crate::pitch::word::Bend;
use crate::time::Time;
use crate::tuning::Key;

/// What a new note asks of a channel.
pub(super) struct Want {
    pub part: PartId,
    /// Channels it may take.
    pub pool: ChannelSet,
    pub key: Key,
    pub number: u8,
    /// Distance of the wanted pitch from the number's own.
    pub offset: Interval,
    /// The pitch nudge that is in it.
    pub nudge: Interval,
    /// What will move it.
    pub follows: Option<Class>,
    /// How many different bends the tuning can ask for.
    pub groups: u8,
    /// Channels on which its number sounds already.
    pub sounding_on: ChannelSet,
    /// It sounds already at this very bend.
    pub doubles: bool,
    /// The player's wheel, where it is added to the channel's bend.
    pub wheel: Interval,
    /// The bend for all this, without the player's hands.
    pub word: Bend,
    /// What the finger on its key adds, where it has a channel of its own.
    pub finger: Finger,
    /// Channels that another finger moves; where one moves this, also those that none does.
    pub led_otherwise: ChannelSet,
    /// Controller 74 of the part, where notes are told it; else `UNSAID`.
    pub brightness: u8,
    /// Nothing else sounds on its channel: its part has one voice.
    pub alone: bool,
}

/// The channel to take and what has to give way for it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Choice {
    pub channel: u8,
    pub cost: Cost,
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Cost {
    Nothing,
    /// It will be moved with what rings there.
    Along,
    /// A tail will be bent.
    Tail,
    /// What rings on the channel has to be ended first.
    Steal,
}

/// The order of wishes, best first.
#[derive(Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
enum Wish {
    /// Sounding at this very bend, and will not have to part.
    Shared,
    LastPlayedThisKey,
    FreeAtThisBend,
    NeverUsed,
    /// Sounding at this very bend with the same number still held: two note-ons on one number, as a keyboard on one
    /// channel would send them. Better than to take a channel that another pitch will want back.
    Doubled,
    /// Quiet, and another channel has the same bend: taking it costs nobody a bend later.
    Spare,
    BeyondTail,
    InTail,
    /// Sounding at this very bend, but it will be moved differently.
    Along,
    UnderPedal,
    Held,
}

/// Finds the channel for a note, or `None` where nothing may give way. Always the same for the same history.
pub(super) fn choose(want: &Want, synth: &Synth, voices: &Voices, now: Time) -> Option<Choice> {
    let mut best: Option<(Wish, u64, Choice)> = None;
    for channel in want.pool.iter() {
        let Some((wish, order, cost)) = wish(want, synth, voices, channel, now) else {
            continue;
        };
        if best.is_none_or(|(w, o, _)| (wish, order) < (w, o)) {
            best = Some((wish, order, Choice { channel, cost }));
        }
    }
    best.map(|(_, _, choice)| choice)
}

/// How well a channel fits, and its place among those that fit as well (lower first).
fn wish(
    want: &Want,
    synth: &Synth,
    voices: &Voices,
    number: u8,
    now: Time,
) -> Option<(Wish, u64, Cost)> {
    let channel = &synth.channels[number as usize];
    let rest = channel.rest(now, synth.rig.tail, synth.rig.keeps_pitch());
    let this_key = channel.last_key == Some(want.key);
    // Notes that a nudge will move differently may not share, though they stand at one bend now.
    let moves_alike = !matches!(rest, Rest::Held | Rest::Pedal) || channel.nudge == want.nudge;
    // What rings of a part that plays no more has another player's settings.
    let this_part = channel.part.is_none_or(|part| part == want.part);
    let this_bend =
        rest != Rest::New && moves_alike && this_part && same_bend(want, channel, synth);
    let must_part = want.sounding_on.has(number);
    // A finger moves its own note, and nothing that rings on once its key is up.
    let moved_alike = channel.follows == want.follows && !want.led_otherwise.has(number);
    let ringing = matches!(rest, Rest::Held | Rest::Pedal | Rest::Tail(_));
    let may_share = synth.rig.share || (this_key && rest != Rest::Held);
    let oldest_first = channel.released_at.map_or(0, Time::nanos);
    Some(match rest {
        _ if ringing && this_bend && may_share && !must_part && moved_alike => {
            (Wish::Shared, !this_key as u64, Cost::Nothing)
        }
        Rest::Quiet(_) if this_key => (Wish::LastPlayedThisKey, 0, Cost::Nothing),
        Rest::Quiet(_) if this_bend => (Wish::FreeAtThisBend, 0, Cost::Nothing),
        Rest::New if want.doubles && !has_plenty(want, synth) => {
            (Wish::BeyondTail, 0, Cost::Nothing)
        }
        Rest::New => (Wish::NeverUsed, 0, Cost::Nothing),
        Rest::Quiet(_) if is_spare(want, synth, number) => {
            (Wish::Spare, oldest_first, Cost::Nothing)
        }
        Rest::Quiet(_) => (Wish::BeyondTail, oldest_first, Cost::Nothing),
        Rest::Held | Rest::Pedal if this_bend && !moved_alike && synth.rig.share => {
            (Wish::Along, oldest_first, Cost::Along)
        }
        _ if this_bend && must_part && moved_alike && synth.rig.share => {
            (Wish::Doubled, 0, Cost::Nothing)
        }
        Rest::Tail(_) if synth.rig.keeps_pitch() => (Wish::InTail, oldest_first, Cost::Nothing),
        Rest::Tail(_) => (Wish::InTail, oldest_first, Cost::Tail),
        Rest::Pedal => (Wish::UnderPedal, oldest_first, Cost::Steal),
        Rest::Held => match synth.rig.steal {
            Steal::Nothing => return None,
            Steal::Oldest => (Wish::Held, channel.struck_at.nanos(), Cost::Steal),
            Steal::Quietest => (Wish::Held, loudest(synth, voices, number), Cost::Steal),
        },
    })
}

/// Whether the note would send the very bend that the channel has, with and without the player's hands.
fn same_bend(want: &Want, channel: &Channel, synth: &Synth) -> bool {
    let with_wheel = |bend| Bend::encode(bend + want.wheel, synth.rig.bend_range);
    let (here, there) = (
        want.offset + want.finger.bend,
        channel.offset + channel.finger,
    );
    want.word == channel.word && (here == there || with_wheel(here) == with_wheel(there))
}

/// Whether there are more channels never used than bends that have none yet, so that a second one for a bend that has
/// one will not be missed.
fn has_plenty(want: &Want, synth: &Synth) -> bool {
    let channels = || want.pool.iter().map(|n| &synth.channels[n as usize]);
    let used = |channel: &&Channel| channel.released_at.is_some();
    let is_first = |channel: &Channel| {
        let same = |other: &&Channel| used(other) && other.word == channel.word;
        channels()
            .find(same)
            .is_some_and(|first| std::ptr::eq(first, channel))
    };
    let unused = channels().filter(|c| !used(c)).count();
    let placed = channels().filter(used).filter(|c| is_first(c)).count();
    unused > (want.groups as usize).saturating_sub(placed)
}

/// Whether another channel of the pool has the same bend.
fn is_spare(want: &Want, synth: &Synth, number: u8) -> bool {
    let word = |number: u8| synth.channels[number as usize].word;
    let used = |number: u8| synth.channels[number as usize].released_at.is_some();
    want.pool
        .iter()
        .any(|other| other != number && used(other) && word(other) == word(number))
}

fn loudest(synth: &Synth, voices: &Voices, channel: u8) -> u64 {
    voices
        .iter()
        .filter(|v| v.synth == synth.id && v.channel == channel)
        .map(|v| v.velocity as u64)
        .max()
        .unwrap_or(0)
}
