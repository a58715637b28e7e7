//! Where the shape of a chord is put: by what sounds, what has just sounded, and a leash to the tuning at rest.
//!
//! The method is that of exact chord templates with a weighted translation; its weights were found on forty chorales
//! that are none of those it is judged by. All in microcents. Weights are whole numbers; only their proportions matter.

use super::candidates::{Candidate, Candidates};
use super::shapes::{self, CORE_MAX};

/// Pulls of what sounds and what has sounded, against each other and against the leash.
pub const HELD: i64 = 21_500;
pub const YOUNG: i64 = 330;
pub const REMEMBERED: i64 = 120;
const LEASH: i64 = 320;
/// At this mean distance from rest, in thousandths of a cent, the leash pulls twice as hard.
const STRETCH: i64 = 8_000;
/// What moving held notes counts against errors of the shape, and standing away from rest, in hundredths.
const MOTION: i64 = 150;
const AWAY: i64 = 15;
/// Nobody hears so small a correction: notes older than the settle window are spared it.
pub const DEAD_BAND: i64 = 1_000_000;
/// Rounds in which newcomers settle among held notes.
const ROUNDS: usize = 12;

/// One pitch class of the chord.
#[derive(Clone, Copy, Debug, Default)]
pub struct Member {
    pub class: u8,
    /// How many keys of it sound.
    pub keys: i64,
    /// Where the tuning at rest puts it.
    pub rest: i64,
    /// Where it stands, or stood when it last sounded.
    pub was: i64,
    /// How much that counts; 0 for a newcomer of whom nothing is remembered.
    pub pull: i64,
    /// For one that sounds and is beyond the settle window: how far it may be moved.
    pub held: Option<(i64, i64)>,
}

/// A place for each member, in the order of the candidates' pitch classes.
#[derive(Clone, Copy)]
pub struct Placed {
    pub at: [i64; CORE_MAX],
    pub candidate: Candidate,
}

/// What two pitch classes of the chord are to each other.
#[derive(Clone, Copy, Default)]
struct Pair {
    sizes: [i64; 2],
    /// What an error between them counts, in quarters.
    weight: i64,
    /// How hard either holds the other.
    pull: i64,
}

/// Every two of a chord; worked out once for all places that are tried.
struct Pairs([[Pair; CORE_MAX]; CORE_MAX]);

impl Pairs {
    fn of(members: &[Member]) -> Pairs {
        let mut pairs = Pairs([[Pair::default(); CORE_MAX]; CORE_MAX]);
        for (one, a) in members.iter().enumerate() {
            for (other, b) in members.iter().enumerate().filter(|(at, _)| *at != one) {
                let semitones = (a.class + 12 - b.class) % 12;
                pairs.0[one][other] = Pair {
                    sizes: shapes::exact(semitones),
                    weight: shapes::quarters(semitones) * a.keys * b.keys,
                    pull: shapes::pull(semitones) * b.keys,
                };
            }
        }
        pairs
    }
}

/// Finds the best candidate and its best place. `drift_limit: None` takes the leash away with the limit.
pub fn place(members: &[Member], candidates: &Candidates, drift_limit: Option<i64>) -> Placed {
    let count = members.len();
    let pairs = Pairs::of(members);
    let any_held = members.iter().any(|m| m.held.is_some());
    let mut best = Placed {
        at: [0; CORE_MAX],
        candidate: candidates.get(0),
    };
    let mut least = i64::MAX;
    for index in 0..candidates.count() {
        // Where nothing holds a note back, the shape errs as much wherever it is put.
        if !any_held && candidates.errs(index) >= least {
            continue;
        }
        let candidate = &candidates.get(index);
        let zero = &candidate.offsets[..count];
        if !any_held && candidates.errs(index) + least_away(members, zero) >= least {
            continue;
        }
        let mean = away(members, zero);
        let soft = shift(members, zero, mean, drift_limit);
        // Besides the place that all pull it to, those where one held note need not move at all.
        let held = members.iter().zip(zero).filter(|(m, _)| m.held.is_some());
        let still = held.map(|(m, at)| m.was - at);
        let near = |shift: &i64| drift_limit.is_none_or(|limit| (mean + shift).abs() <= limit);
        for shift in std::iter::once(soft).chain(still.filter(near)) {
            let mut at = candidate.offsets;
            at[..count].iter_mut().for_each(|at| *at += shift);
            give_way(members, &pairs, &mut at[..count], drift_limit);
            let strain = strain(members, &at[..count]);
            let Some(errors) = errors(&pairs, &at[..count], candidate, least - strain) else {
                continue;
            };
            least = errors + strain;
            best = Placed {
                at,
                candidate: *candidate,
            };
        }
    }
    best
}

/// How far the whole shape is moved from where its zero would put it; `mean`: how far that is from rest.
fn shift(members: &[Member], zero: &[i64], mean: i64, drift_limit: Option<i64>) -> i64 {
    let (mut sum, mut weight) = (0, 0);
    for (member, at) in members.iter().zip(zero) {
        sum += member.pull * (member.was - at);
        weight += member.pull;
    }
    let Some(limit) = drift_limit else {
        return if weight > 0 { sum / weight } else { -mean };
    };
    let mut leash = LEASH;
    let mut shift = 0;
    // The leash is the stiffer the further it is stretched; four rounds come close enough.
    for _ in 0..4 {
        shift = (sum - leash * mean) / (weight + leash);
        let stretch = (mean + shift) / 1_000;
        let stiffer = LEASH * (stretch * stretch / STRETCH) / STRETCH;
        leash = (leash + LEASH + stiffer) / 2;
    }
    (mean + shift).clamp(-limit, limit) - mean
}

/// What standing away from rest costs a shape at least, wherever it is put: two members cannot both be at rest if they
/// are not so far apart there.
fn least_away(members: &[Member], zero: &[i64]) -> i64 {
    let away = || members.iter().zip(zero).map(|(m, at)| at - m.rest);
    let spread = away().max().unwrap_or(0) - away().min().unwrap_or(0);
    spread * AWAY / 100
}

/// How far the chord stands from rest, on average over its keys.
pub fn away(members: &[Member], at: &[i64]) -> i64 {
    let keys: i64 = members.iter().map(|m| m.keys).sum();
    summed_away(members, at) / keys.max(1)
}

fn summed_away(members: &[Member], at: &[i64]) -> i64 {
    let away = members.iter().zip(at).map(|(m, at)| m.keys * (at - m.rest));
    away.sum()
}

/// How far its intervals are from just, dissonances a quarter; `None` where that is not less than `below`.
fn errors(pairs: &Pairs, at: &[i64], candidate: &Candidate, below: i64) -> Option<i64> {
    let mut sum = 0;
    for (one, one_at) in at.iter().enumerate() {
        for (other, other_at) in at.iter().enumerate().take(one) {
            let pair = &pairs.0[one][other];
            let stands = one_at - other_at;
            let error = if candidate.wanted & (1 << one | 1 << other) != 0 {
                (stands - candidate.offsets[one] + candidate.offsets[other]).abs()
            } else {
                shapes::error(pair.sizes, stands)
            };
            sum += error * pair.weight;
        }
        if sum / 4 >= below {
            return None;
        }
    }
    Some(sum / 4)
}

/// What else speaks against a placement, in microcents of error.
fn strain(members: &[Member], at: &[i64]) -> i64 {
    let (mut motion, mut away) = (0, 0);
    for (member, at) in members.iter().zip(at) {
        if member.held.is_some() {
            // What has long been sounding weighs more, as it pulls more.
            motion += (at - member.was).abs() / 1_000 * member.keys * member.pull / (HELD / 1_000);
        }
        away += (at - member.rest).abs() * member.keys;
    }
    (motion * MOTION + away * AWAY) / 100
}

/// Held notes move less than the shape wants; then the others are put as well with them as can be.
fn give_way(members: &[Member], pairs: &Pairs, at: &mut [i64], drift_limit: Option<i64>) {
    let mut shape = [0; CORE_MAX];
    shape[..at.len()].copy_from_slice(at);
    let mut clamped = false;
    for (member, at) in members.iter().zip(at.iter_mut()) {
        if let Some((low, high)) = member.held {
            if (*at - member.was).abs() < DEAD_BAND {
                *at = member.was;
            } else {
                let within = (*at).clamp(low, high);
                clamped |= within != *at;
                *at = within;
            }
        }
    }
    if clamped {
        ease(members, pairs, &shape, at);
    }
    if let Some(limit) = drift_limit {
        keep_within(members, at, limit);
    }
}

/// Each note that is free goes to the weighted mean of where the others want it.
fn ease(members: &[Member], pairs: &Pairs, shape: &[i64], at: &mut [i64]) {
    let is_free = |index: &usize| members[*index].held.is_none();
    for _ in 0..ROUNDS {
        let mut moved = false;
        for free in (0..members.len()).filter(is_free) {
            let (mut sum, mut weight) = (0, 0);
            for other in (0..members.len()).filter(|other| *other != free) {
                let pull = pairs.0[free][other].pull;
                sum += pull * (at[other] + shape[free] - shape[other]);
                weight += pull;
            }
            if weight > 0 {
                let to = sum / weight;
                moved |= to != at[free];
                at[free] = to;
            }
        }
        if !moved {
            return;
        }
    }
}

/// The limit of drift goes before purity: newcomers give way first, then held notes as far as they may.
pub fn keep_within(members: &[Member], at: &mut [i64], limit: i64) {
    let keys: i64 = members.iter().map(|m| m.keys).sum();
    for held_too in [false, true] {
        // As `away`, but without a division where all is well.
        if summed_away(members, at).abs() < (limit + 1) * keys {
            return;
        }
        let away = away(members, at);
        let beyond = away - away.clamp(-limit, limit);
        let moves = |m: &Member| held_too || m.held.is_none();
        let moving: i64 = members.iter().filter(|m| moves(m)).map(|m| m.keys).sum();
        if moving == 0 {
            continue;
        }
        let each = beyond * keys / moving;
        for (at, member) in at.iter_mut().zip(members).filter(|(_, m)| moves(m)) {
            *at -= each;
            if let Some((low, high)) = member.held {
                *at = (*at).clamp(low, high);
            }
        }
    }
}

/// A place for a pitch class that is not part of the shape: exact to one of the chord's, and as well as can be with the
/// others.
pub fn attach(class: u8, members: &[Member], at: &[i64], drift: i64, rest: i64) -> i64 {
    let mut to_each = [Pair::default(); CORE_MAX];
    for (pair, member) in to_each.iter_mut().zip(members) {
        let semitones = (class + 12 - member.class) % 12;
        pair.sizes = shapes::exact(semitones);
        pair.weight = shapes::quarters(semitones) * member.keys;
    }
    let to_each = &to_each[..members.len()];
    let mut best = rest + drift;
    let mut least = i64::MAX;
    for (to, to_at) in to_each.iter().zip(at) {
        let [one, other] = to.sizes;
        let sizes = if one == other {
            &to.sizes[..1]
        } else {
            &to.sizes
        };
        for place in sizes.iter().map(|size| to_at + size) {
            let away = (place - rest - drift).abs() * AWAY / 100;
            let mut errors = 0;
            for (pair, at) in to_each.iter().zip(at) {
                errors += shapes::error(pair.sizes, place - at) * pair.weight;
                if errors / 4 + away >= least {
                    break;
                }
            }
            let strain = errors / 4 + away;
            if strain < least {
                least = strain;
                best = place;
            }
        }
    }
    best
}
