//! Which channels of a synth each part may call its own.

use super::complaint::{Complaints, Trail};
use super::parts::Part;
use super::rig::Rig;
use super::songs::Entry;
use super::values::spell_channels;
use crate::engine::plan::{ChannelSet, Dialect, PartPlan, SynthId};

/// Gives every part its channels: those it asks for, else an even share of what is left, in order.
pub fn allot(parts: &[Part], rig: &Rig, complaints: &mut Complaints) -> Vec<PartPlan> {
    let mut pools = vec![ChannelSet::NONE; parts.len()];
    for (index, synth) in rig.synths.iter().enumerate() {
        let here: Vec<usize> = (0..parts.len())
            .filter(|part| parts[*part].to.index() == index)
            .collect();
        let mut free = synth.plan.members;
        for part in &here {
            if let Some((trail, asked)) = &parts[*part].channel {
                let asked = asked_for(*asked, free, trail, &parts[*part], rig, complaints);
                pools[*part] = asked;
                free = free.without(asked);
            }
        }
        let sharing: Vec<usize> = here
            .iter()
            .copied()
            .filter(|part| parts[*part].channel.is_none())
            .collect();
        share(free, &sharing, parts, rig, &mut pools, complaints);
    }
    let plans = parts.iter().zip(pools);
    plans
        .map(|(part, pool)| PartPlan {
            from: part.from,
            hears: ChannelSet::ALL,
            keys: part.keys,
            to: part.to,
            pool,
            transpose_keys: part.transpose_keys,
            offset: part.offset,
            pass: part.pass,
            tune: part.tune,
            mono: part.mono,
            follow: part.follow,
            late_offs: false, // known once the whole evening is
        })
        .collect()
}

/// Parts in one MPE zone share its manager, where pedals are heard: at once, or because what rings of the last song is
/// another player's.
pub fn share_managers(rig: &Rig, stage: &mut [PartPlan], set: &mut [Entry]) {
    for index in 0..rig.synths.len() {
        let mpe = matches!(rig.synths[index].plan.dialect, Dialect::Mpe { .. });
        let Some(synth) = SynthId::new(index).filter(|_| mpe) else {
            continue;
        };
        let mut players = Vec::new();
        let mut shared = false;
        for song in set.iter().map(|entry| &entry.plan) {
            let here = song.parts.as_deref().unwrap_or(stage);
            let here = here.iter().filter(|part| part.to == synth);
            shared |= here.clone().count() > 1;
            players.extend(here.map(|part| (part.from, part.pass)));
        }
        shared |= players.iter().any(|player| *player != players[0]);
        let told = |part: &PartPlan| PartPlan {
            late_offs: part.late_offs || (shared && part.to == synth),
            ..*part
        };
        for part in stage.iter_mut() {
            *part = told(part);
        }
        for entry in set.iter_mut() {
            if let Some(parts) = &mut entry.plan.parts {
                *parts = parts.iter().map(told).collect();
            }
        }
    }
}

/// What a part asks for by number, as far as it can have it.
fn asked_for(
    asked: ChannelSet,
    free: ChannelSet,
    trail: &Trail,
    part: &Part,
    rig: &Rig,
    complaints: &mut Complaints,
) -> ChannelSet {
    let synth = &rig.synths[part.to.index()];
    let name = &synth.device.name;
    let members = synth.plan.members;
    let outside = asked.without(members);
    let taken = asked.without(free).without(outside);
    let spelt = spell_channels(outside);
    let drums = ChannelSet(outside.0 & synth.plan.drums.0);
    if drums != ChannelSet::NONE {
        complaints.add(
            trail,
            format!("channel {} is a drum channel of {name}", spell_channels(drums)),
            "what is played on it goes through untouched without a part; to tune it, write `drums: []` at the synth",
        );
    } else if outside != ChannelSet::NONE {
        let wrong = match synth.plan.dialect {
            Dialect::Mpe { manager } if outside.has(manager) => {
                format!(
                    "channel {} is the MPE manager of {name} and carries no notes",
                    manager + 1
                )
            }
            _ => format!("{name} has no channel {spelt}"),
        };
        let right = format!("choose from its channels {}", spell_channels(members));
        complaints.add(trail, wrong, right);
    }
    if taken != ChannelSet::NONE {
        let right = match free == ChannelSet::NONE {
            true => String::from("none is left: give the other parts fewer"),
            false => format!("still free: {}", spell_channels(free)),
        };
        complaints.add(
            trail,
            format!(
                "channel {} of {name} belongs to a part above",
                spell_channels(taken)
            ),
            right,
        );
    }
    ChannelSet(asked.0 & free.0)
}

/// One channel for each part of one voice, and an even share for each of the others, in order; the first get what is
/// over.
fn share(
    free: ChannelSet,
    sharing: &[usize],
    parts: &[Part],
    rig: &Rig,
    pools: &mut [ChannelSet],
    complaints: &mut Complaints,
) {
    if sharing
        .iter()
        .any(|part| rig.synths[parts[*part].to.index()].plan.members == ChannelSet::NONE)
    {
        return; // the synth has had its complaint
    }
    let mut channels = free.iter();
    let voices = sharing.iter().filter(|part| parts[**part].mono).count();
    let others = sharing.len() - voices;
    let count = (free.count() as usize).saturating_sub(voices);
    let mut place = 0;
    for part in sharing {
        let wanted = if parts[*part].mono {
            1
        } else {
            place += 1;
            count / others + usize::from(place <= count % others)
        };
        pools[*part] = channels
            .by_ref()
            .take(wanted)
            .fold(ChannelSet::NONE, ChannelSet::with);
        if pools[*part] == ChannelSet::NONE {
            complaints.add(
                &parts[*part].trail,
                format!(
                    "no channel of {} is left for this part",
                    rig.synths[parts[*part].to.index()].device.name
                ),
                "give the other parts fewer channels, or the synth more",
            );
        }
    }
}
