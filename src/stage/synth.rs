//! One synth as written: dialect, channels, bend range, and how it is treated.

use super::advice::Findings;
use super::complaint::{Complaints, Trail};
use super::node::{At, Fields};
use super::rig::{Synth, leave, port};
use super::values::{channels, choice, spell_channels};
use super::{Device, Wish, defaults};
use crate::engine::plan::{ChannelSet, Dialect, Leave, Steal, SynthPlan};
use crate::limits::{BEND_RANGE_MAX, TAIL_MS_MAX};
use crate::pitch::word::BendRange;
use crate::time::Span;

/// The dialects this version plays.
#[derive(Clone, Copy, PartialEq)]
enum Spelling {
    Mpe,
    ChannelBend,
    NotYet,
}

const DIALECTS: [(&str, Spelling); 5] = [
    ("mpe", Spelling::Mpe),
    ("channel-bend", Spelling::ChannelBend),
    ("tuning-messages", Spelling::NotYet),
    ("octave-table", Spelling::NotYet),
    ("best", Spelling::NotYet),
];

/// One synth of the rig.
pub fn synth(name: String, at: &At<'_>, left: Leave, found: &mut Findings) -> Option<Synth> {
    let complaints = &mut found.complaints;
    if at.is_nothing() {
        return Some(any_synth(&name, left));
    }
    let mut fields = at.fields(
        "a map such as `{port: \"*Organ*\", dialect: mpe}`",
        complaints,
    )?;
    let mut synth = any_synth(&name, left);
    synth.device.port = port(&mut fields, complaints);
    let mpe = dialect(&mut fields, complaints) == Spelling::Mpe;
    members(&mut synth.plan, mpe, at, &mut fields, complaints);
    let mut bend_range = if mpe {
        defaults::BEND_RANGE_MPE
    } else {
        defaults::BEND_RANGE
    };
    if let Some(at) = fields.take("bend_range") {
        let range = 1..=BEND_RANGE_MAX as i64;
        let semitones = at.whole("semitones of a full bend", range, complaints);
        bend_range = semitones.map_or(bend_range, |semitones| semitones as u8);
    }
    synth.plan.bend_range = BendRange::new(bend_range).unwrap_or(BendRange::TWO);
    if let Some(at) = fields.take("tail_ms") {
        let tail = at.whole("milliseconds", 0..=TAIL_MS_MAX as i64, complaints);
        synth.plan.tail = Span::from_millis(tail.unwrap_or(0) as u64);
    }
    if let Some(at) = fields.take("share") {
        synth.plan.share = at.flag(complaints).unwrap_or(true);
    }
    if let Some(at) = fields.take("steal") {
        let words = [
            ("oldest", Steal::Oldest),
            ("quietest", Steal::Quietest),
            ("nothing", Steal::Nothing),
        ];
        synth.plan.steal = choice(&at, &words, complaints).unwrap_or_default();
    }
    if let Some(at) = fields.take("leave") {
        synth.plan.leave = leave(&at, complaints).unwrap_or_default();
    }
    if let Some(at) = fields.take("bytes_per_s") {
        let speed = at.whole("bytes a second", 100..=10_000_000, complaints);
        synth.plan.bytes_per_s = speed.map(|speed| speed as u32);
    }
    fields.finish(complaints);
    Some(synth)
}

fn dialect(fields: &mut Fields<'_>, complaints: &mut Complaints) -> Spelling {
    let Some(at) = fields.take("dialect") else {
        return Spelling::ChannelBend;
    };
    let spelling = choice(&at, &DIALECTS, complaints);
    if spelling == Some(Spelling::NotYet) {
        complaints.add(
            &at.trail,
            format!("{} is not played by this version", at.node.shown()),
            "use mpe or channel-bend",
        );
    }
    spelling.unwrap_or(Spelling::ChannelBend)
}

/// `channels` and `drums`: which channels carry notes.
fn members(
    plan: &mut SynthPlan,
    mpe: bool,
    synth: &At<'_>,
    fields: &mut Fields<'_>,
    complaints: &mut Complaints,
) {
    let written = fields.take("channels");
    let place = written.as_ref().unwrap_or(synth).trail.clone();
    let all = written
        .and_then(|at| channels(&at, complaints))
        .unwrap_or(defaults::CHANNELS);
    let drums_default = if mpe {
        defaults::DRUMS_MPE
    } else {
        defaults::DRUMS
    };
    plan.drums = match fields.take("drums") {
        Some(at) => channels(&at, complaints).unwrap_or(drums_default),
        None => drums_default,
    };
    let spelt = spell_channels(all);
    if !mpe {
        plan.members = all.without(plan.drums);
        if plan.members == ChannelSet::NONE {
            complaints.add(
                &place,
                "no channel is left beside the drums",
                "give it a channel that is not in `drums`, or write `drums: []`",
            );
        }
        return;
    }
    let Some(manager) = zone(all, &place, complaints) else {
        return;
    };
    let drummed = ChannelSet(all.0 & plan.drums.0);
    if drummed != ChannelSet::NONE {
        complaints.add(
            &place,
            format!(
                "the drum channel {} lies inside the MPE zone {spelt}",
                spell_channels(drummed)
            ),
            "a zone has no gaps: end it below the drums, as in `channels: 1-9`, or write `drums: []`",
        );
    }
    plan.dialect = Dialect::Mpe { manager };
    plan.members = all.without(ChannelSet::NONE.with(manager));
}

/// The manager, 0-15, of a zone that covers just these channels (MPE 1.1, 2.1: the outermost channel manages, members
/// follow without gaps).
pub fn zone(all: ChannelSet, place: &Trail, complaints: &mut Complaints) -> Option<u8> {
    let (first, last) = (all.iter().next()?, all.iter().last()?);
    let gapless = all.count() == u32::from(last - first) + 1 && all.count() >= 2;
    match (gapless, first, last) {
        (true, 0, _) => Some(0),
        (true, _, 15) => Some(15),
        _ => {
            complaints.add(
                place,
                format!("{} makes no MPE zone", spell_channels(all)),
                "a lower zone begins at 1, as in 1-8 (manager 1), an upper one ends at 16, as in 9-16 (manager 16)",
            );
            None
        }
    }
}

/// A synth of which nothing is said.
pub fn any_synth(name: &str, leave: Leave) -> Synth {
    Synth {
        device: Device {
            name: name.to_string(),
            port: Wish::Any,
        },
        plan: SynthPlan {
            name: name.into(),
            dialect: Dialect::ChannelBend,
            members: defaults::CHANNELS.without(defaults::DRUMS),
            bend_range: BendRange::new(defaults::BEND_RANGE).unwrap_or(BendRange::TWO),
            tail: Span::from_millis(defaults::TAIL_MS),
            drums: defaults::DRUMS,
            local_off: false,
            share: true,
            steal: Steal::Oldest,
            leave,
            pace: Span::from_millis(defaults::PACE_MS),
            bytes_per_s: None,
        },
    }
}
