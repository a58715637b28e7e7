//! How places move: young notes at once, held ones by a cent at a time, a chord that stands on slowly home.

use super::{Harmony, Place};
use crate::intonation::place::DEAD_BAND;
use crate::intonation::settings::Settings;
use crate::pitch::Interval;
use crate::time::{Span, Time};

/// A glide goes by steps of one cent: each is a bend on the wire.
const STEP: i64 = 1_000_000;
/// A chord that has stood so long begins to return.
const STANDS: Span = Span::from_millis(1_000);

impl Harmony {
    /// From here on held notes are measured against where they stand now.
    pub(super) fn note_event(&mut self, now: Time) {
        for place in &mut self.places {
            place.before = place.now;
        }
        self.event_at = now;
        self.returned_at = now;
        self.returned = 0;
    }

    /// Notes younger than the settle window go where they are bound at once.
    pub(super) fn jump(&mut self, now: Time, settings: &Settings) {
        for place in self.places.iter_mut().filter(|place| place.sounding > 0) {
            if place.since == now || now.since(place.since) < settings.settle {
                place.now = place.target;
                place.began = place.target;
                place.before = place.target;
            }
        }
    }

    /// To be called once [`Harmony::due_at`] has come: moves what is bound elsewhere by a step.
    pub fn glide(&mut self, now: Time) {
        let Some(settings) = self.method.settings().copied() else {
            return;
        };
        self.go_home(now, &settings);
        if let Some(step) = self.glide_step {
            for place in self.places.iter_mut().filter(|place| glides(place)) {
                if place.stepped.is_none_or(|at| at + step <= now) {
                    place.now += (place.target - place.now).clamp(-STEP, STEP);
                    place.stepped = Some(now);
                }
            }
        }
        self.look_ahead(&settings);
    }

    /// When something moves next.
    pub fn due_at(&self) -> Option<Time> {
        self.due
    }

    /// Works out how the chord stands, and when something moves next.
    fn look_ahead(&mut self, settings: &Settings) {
        let (mut away, mut bound, mut keys) = (0, 0, 0);
        let mut next: Option<Time> = None;
        for place in &self.places {
            let counted = place.counted as i64;
            away += (place.now - place.rest) * counted;
            bound += (place.target - place.rest) * counted;
            keys += counted;
            if let Some(step) = self.glide_step.filter(|_| glides(place)) {
                let at = place.stepped.unwrap_or(self.event_at) + step;
                next = Some(next.map_or(at, |next| next.min(at)));
            }
        }
        self.drift = away / keys.max(1);
        let is_away = bound.abs() >= (DEAD_BAND + 1) * keys.max(1);
        let home = self.home_at(settings).filter(|_| is_away);
        self.due = self.glide_step.and(next.into_iter().chain(home).min());
    }

    /// When a chord that stands away from rest is to take its next step home.
    fn home_at(&self, settings: &Settings) -> Option<Time> {
        let step = self.return_step?;
        settings.drift_limit?;
        let may = settings
            .hold_limit
            .is_none_or(|limit| self.returned < limit.microcents());
        may.then_some((self.event_at + STANDS).max(self.returned_at + step))
    }

    fn go_home(&mut self, now: Time, settings: &Settings) {
        if self.home_at(settings).is_none_or(|at| at > now) {
            return;
        }
        let bound = self.mean_away(|place| place.target);
        if bound.abs() <= DEAD_BAND {
            return;
        }
        let step = -bound.clamp(-STEP, STEP);
        let limit = settings
            .hold_limit
            .map_or(i64::MAX / 4, Interval::microcents);
        for place in self.places.iter_mut().filter(|place| place.held > 0) {
            let (low, high) = (place.before - limit, place.before + limit);
            place.target =
                (place.target + step).clamp(low.min(place.target), high.max(place.target));
        }
        self.returned += STEP;
        self.returned_at = now;
    }
}

fn glides(place: &Place) -> bool {
    place.sounding > 0 && place.target != place.now
}

/// How long a step takes at a speed; `None` where nothing moves.
pub(super) fn step_span(per_s: Interval) -> Option<Span> {
    let speed = per_s.microcents();
    (speed > 0).then(|| Span::from_nanos(STEP as u64 * 1_000_000_000 / speed as u64))
}
