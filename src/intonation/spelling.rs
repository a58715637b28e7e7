//! What a black key is called where the harmony chooses: the name nearest to what has sounded lately.
//!
//! Names are places on the line of fifths (C = 0, G = 1, F = -1). What sounds and has sounded lately has a middle there,
//! and a key takes its sharp where that middle lies towards the sharps, its flat where it lies towards the flats. A major
//! third that it would make draws it besides. The weights were found on chorales that the reported figures leave out.

use crate::time::{Span, Time};
use crate::tuning::Letter;

/// One stroke of a key. What was struck lately weighs so much, `e` times less for each `FADE`.
const STROKE: i64 = 1 << 16;
const FADE: Span = Span::from_millis(3_000);
/// Less than a hundredth of a stroke is forgotten: after fourteen seconds nothing is left of one.
const FORGOTTEN: i64 = STROKE / 100;
/// What is struck now weighs more, what is held weighs besides.
const NOW: i64 = STROKE * 3;
const HELD: i64 = STROKE / 2;
/// Music goes to a sharp it needs as a leading note more often than it borrows a flat, so the line between sharp and
/// flat lies half a fifth from the middle of the two.
const LEANING_HALVES: i64 = 1;
/// A pure major third to a note of the same instant draws a key so many fifths towards the name that makes it. (What is
/// still held may be the chord before, about to be let go.)
const THIRD: i64 = 1;
const THIRD_PLACES: u8 = 4;
/// A key keeps its name within a quarter of a fifth to both sides of that line.
const DOUBT: (i64, i64) = (1, 4);
/// Where the black keys together could be called so that the squares of what lies apart were smaller by so much, on
/// average, they were called wrong from the beginning: in a remote key every name looks right beside the others.
const FAR_BETTER: i64 = 13;

/// What a key is called.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Called {
    pub now: Letter,
    /// Both its names, the first one first; `None` where it is not to be chosen at this moment.
    pub choice: Option<(Letter, Letter)>,
}

impl Called {
    /// The name on the side to which a middle of that weight leans, if it leans far enough.
    fn towards(&self, lean: i64, weight: i64) -> Letter {
        let Some((first, second)) = self.choice else {
            return self.now;
        };
        let doubt = 2 * weight * DOUBT.0;
        match lean * DOUBT.1 {
            _ if weight == 0 => first,
            lean if lean > doubt => first.max(second),
            lean if lean < -doubt => first.min(second),
            _ => self.now,
        }
    }
}

/// Where nothing is known every key is its first name.
fn begin(called: &mut [Called; 12]) {
    for key in called {
        key.now = key.choice.map_or(key.now, |(first, _)| first);
    }
}

/// The weight of what has sounded lately, by pitch class.
#[derive(Clone)]
pub struct Spelling {
    lately: [i64; 12],
    at: Time,
}

impl Default for Spelling {
    fn default() -> Spelling {
        Spelling::new()
    }
}

/// How often each pitch class is struck now, and held from before.
#[derive(Clone, Copy, Debug, Default)]
pub struct Strokes {
    pub struck: [u8; 12],
    pub held: [u8; 12],
}

impl Spelling {
    pub const fn new() -> Spelling {
        Spelling {
            lately: [0; 12],
            at: Time::START,
        }
    }

    /// Names the keys that are struck at this instant, as far as they may be chosen.
    pub fn name(&mut self, now: Time, strokes: &Strokes, called: &mut [Called; 12]) {
        self.fade(now);
        if self.lately == [0; 12] && strokes.held == [0; 12] {
            begin(called);
        }
        let mut weights = self.lately;
        for (class, weight) in weights.iter_mut().enumerate() {
            *weight += HELD * i64::from(strokes.held[class]);
        }
        put_right(&weights, strokes, called);
        let mut middle = Middle::default();
        for (class, weight) in weights.iter().enumerate() {
            middle.add(*weight, called[class].now);
        }
        let (mut open, mut known) = (0u16, 0u16);
        for (class, count) in strokes.struck.iter().enumerate() {
            match called[class].choice {
                Some(_) if *count > 0 => open |= 1 << class,
                _ => middle.add(NOW * i64::from(*count), called[class].now),
            }
            known |= u16::from(*count > 0 && open >> class & 1 == 0) << class;
        }
        while let Some((class, lean)) = surest(open, known, called, &middle) {
            open &= !(1 << class);
            known |= 1 << class;
            let name = called[class].towards(lean, middle.weight);
            middle.add(-weights[class], called[class].now);
            middle.add(
                weights[class] + NOW * i64::from(strokes.struck[class]),
                name,
            );
            called[class].now = name;
        }
        for (class, count) in strokes.struck.iter().enumerate() {
            self.lately[class] += STROKE * i64::from(*count);
        }
    }

    fn fade(&mut self, now: Time) {
        let (fade, longest) = (FADE.nanos() / 1_000_000, 20 * FADE.nanos() / 1_000_000);
        let whole_ms = now.since(self.at).nanos() / 1_000_000;
        self.at = self.at + Span::from_millis(whole_ms);
        let (t, f) = (whole_ms.min(longest) as i128, fade as i128);
        // e^-x as 1 / (1 + x + x^2 / 2 + x^3 / 6), which no rounding can make grow.
        let over = 6 * f * f * f;
        let under = over + 6 * f * f * t + 3 * f * t * t + t * t * t;
        for weight in &mut self.lately {
            *weight = (*weight as i128 * over / under) as i64;
            if *weight < FORGOTTEN {
                *weight = 0;
            }
        }
    }
}

/// A weighted mean of places, still undivided.
#[derive(Clone, Copy, Default)]
struct Middle {
    sum: i64,
    weight: i64,
}

impl Middle {
    fn add(&mut self, weight: i64, name: Letter) {
        self.sum += weight * i64::from(name.place());
        self.weight += weight;
    }

    /// How far it lies on the sharp side, in halves of a fifth, times the weight.
    fn lean(&self, names: (Letter, Letter)) -> i64 {
        let both = i64::from(names.0.place()) + i64::from(names.1.place());
        2 * self.sum + (LEANING_HALVES - both) * self.weight
    }
}

/// Of the keys still open the one about which there is least doubt, and how far it leans to its sharp, as [`Middle::lean`].
fn surest(open: u16, known: u16, called: &[Called; 12], middle: &Middle) -> Option<(usize, i64)> {
    let thirds = |name: Letter| {
        let struck = (0..12).filter(|class| known >> class & 1 == 1);
        let far = |class: &usize| called[*class].now.place().abs_diff(name.place());
        struck.filter(|class| far(class) == THIRD_PLACES).count() as i64
    };
    let lean = |class: usize| {
        let (first, second) = called[class].choice?;
        let drawn = thirds(first.max(second)) - thirds(first.min(second));
        Some((
            class,
            middle.lean((first, second)) + 2 * THIRD * drawn * middle.weight,
        ))
    };
    let keys = (0..12).filter(|class| open >> class & 1 == 1);
    keys.filter_map(lean)
        .max_by_key(|(class, lean)| (lean.abs(), std::cmp::Reverse(*class)))
}

/// Calls all keys otherwise that may be chosen, if that is far better for all that sounds, has sounded and is struck.
fn put_right(weights: &[i64; 12], strokes: &Strokes, called: &mut [Called; 12]) {
    let weight = |class: usize| weights[class] + STROKE * i64::from(strokes.struck[class]);
    let total: i128 = (0..12).map(|class| weight(class) as i128).sum();
    // The mean square of the distances from the middle, times the square of the weight.
    let apart = |name: &dyn Fn(usize) -> Letter| {
        let (mut sum, mut squares) = (0i128, 0i128);
        for class in 0..12 {
            let (weight, place) = (weight(class) as i128, i128::from(name(class).place()));
            sum += weight * place;
            squares += weight * place * place;
        }
        total * squares - sum * sum
    };
    // Sharps up to a key and flats beyond it, from the key that is first to be a sharp.
    let both = |names: (Letter, Letter)| names.0.place() + names.1.place();
    let spelt = |class: usize, sharps_to: i8| match called[class].choice {
        Some(names) if both(names) <= sharps_to => names.0.max(names.1),
        Some(names) => names.0.min(names.1),
        None => called[class].now,
    };
    let is_now = apart(&|class| called[class].now);
    let bounds = called.iter().filter_map(|key| key.choice.map(both));
    let best = bounds
        .chain([i8::MIN])
        .map(|bound| (apart(&|class| spelt(class, bound)), bound))
        .min();
    if let Some((least, bound)) = best
        && least + i128::from(FAR_BETTER) * total * total < is_now
    {
        *called = std::array::from_fn(|class| Called {
            now: spelt(class, bound),
            ..called[class]
        });
    }
}

#[cfg(test)]
mod tests;
