//! Music of our own for what chorales have not: a piano's arpeggios, accompaniments and clusters under the damper, and the
//! rootless voicings of jazz. Made by rule and seeded dice, the same in every run; played as hands would.

use super::keyboard::{Music, QUARTER_S, Touch};
use crate::support::dice::Dice;

const BAR_Q: f64 = 4.0;
/// Onsets come up to so much late, releases early or late.
const SPREAD_US: u64 = 30_000;
/// The foot follows the hand: up so long after the new chord, down again so long after it.
const PEDAL_UP_S: f64 = 0.06;
const PEDAL_DOWN_S: f64 = 0.2;

/// Semitones above a chord's root.
type Chord = &'static [u8];
const MAJOR: Chord = &[0, 4, 7];
const MINOR: Chord = &[0, 3, 7];
const SEVENTH: Chord = &[0, 4, 7, 10];
const MINOR_SEVENTH: Chord = &[0, 3, 7, 10];
const HALF_DIMINISHED: Chord = &[0, 3, 6, 10];
const DIMINISHED_SEVENTH: Chord = &[0, 3, 6, 9];

/// A bar each: root above the tonic, and chord.
const IN_MAJOR: [(u8, Chord); 16] = [
    (0, MAJOR),
    (9, MINOR),
    (2, MINOR_SEVENTH),
    (7, SEVENTH),
    (0, MAJOR),
    (5, MAJOR),
    (2, SEVENTH),
    (7, SEVENTH),
    (4, MINOR),
    (9, MINOR),
    (2, SEVENTH),
    (7, MAJOR),
    (0, SEVENTH),
    (5, MAJOR),
    (5, MINOR),
    (0, MAJOR),
];
const IN_MINOR: [(u8, Chord); 16] = [
    (0, MINOR),
    (5, MINOR),
    (7, SEVENTH),
    (0, MINOR),
    (8, MAJOR),
    (5, MINOR),
    (2, HALF_DIMINISHED),
    (7, SEVENTH),
    (0, MINOR),
    (3, MAJOR),
    (10, SEVENTH),
    (3, MAJOR),
    (8, MAJOR),
    (11, DIMINISHED_SEVENTH),
    (7, SEVENTH),
    (0, MINOR),
];

/// Rootless voicings above the (absent) root, for ii, V and I: thirds and sevenths below, 9 and 13 above.
const FOUR_LOW: [Chord; 3] = [&[3, 7, 10, 14], &[10, 14, 16, 21], &[4, 7, 11, 14]];
const FOUR_HIGH: [Chord; 3] = [&[10, 14, 15, 19], &[4, 9, 10, 14], &[11, 14, 16, 19]];
const FIVE: [Chord; 3] = [
    &[3, 7, 10, 14, 17],
    &[4, 9, 10, 14, 19],
    &[4, 9, 11, 14, 19],
];
/// Half-diminished with 11, seventh with flat 9 and flat 13, minor with 6 and 9.
const FOUR_MINOR: [Chord; 3] = [&[3, 6, 10, 17], &[4, 8, 10, 13], &[3, 7, 9, 14]];

/// Keys and pedals in quarters as written.
#[derive(Default)]
struct Sheet {
    notes: Vec<(f64, f64, u8)>,
    pedals: Vec<(f64, bool)>,
}

impl Sheet {
    fn note(&mut self, on_q: f64, long_q: f64, key: u8) {
        self.notes.push((on_q, on_q + long_q, key));
    }

    /// Changes the damper where a chord begins.
    fn pedal(&mut self, on_q: f64) {
        self.pedals.push((on_q + PEDAL_UP_S / QUARTER_S, false));
        self.pedals.push((on_q + PEDAL_DOWN_S / QUARTER_S, true));
    }

    /// As hands would, at 80 quarters a minute.
    fn performed(self, dice: &mut Dice) -> Music {
        let touch = |(on_q, off_q, key): (f64, f64, u8)| {
            let mut late = |most| dice.between(0, most) as f64 / 1e6;
            let on_s = on_q * QUARTER_S + late(SPREAD_US);
            let off_s = off_q * QUARTER_S + late(2 * SPREAD_US) - SPREAD_US as f64 / 1e6;
            let off_s = off_s.max(on_s + 0.02);
            Touch { on_s, off_s, key }
        };
        let touches: Vec<Touch> = self.notes.into_iter().map(touch).collect();
        let end_s = touches.iter().map(|t| t.off_s).fold(0.0, f64::max);
        let pedals = self
            .pedals
            .into_iter()
            .map(|(at_q, down)| (at_q * QUARTER_S, down));
        let lifted = [(end_s + PEDAL_UP_S, false)];
        Music {
            touches,
            pedal_s: pedals.chain(lifted).collect(),
        }
    }
}

/// The key of this class that is nearest above `low`.
fn above(low: u8, class: u8) -> u8 {
    low + (class + 120 - low) % 12
}

/// Five pieces.
pub fn piano() -> Vec<Music> {
    let mut dice = Dice::new(1);
    let sheets = [
        arpeggios(0, &IN_MAJOR),
        arpeggios(4, &IN_MINOR),
        alberti(7, &mut dice),
        broken_tenths(3, &mut dice),
        clusters(&mut dice),
    ];
    sheets
        .into_iter()
        .map(|sheet| sheet.performed(&mut dice))
        .collect()
}

/// Three pieces; each goes down by fifths through all twelve keys.
pub fn jazz() -> Vec<Music> {
    let mut dice = Dice::new(2);
    let sheets = [
        comping(&[FOUR_LOW, FOUR_HIGH], false, &mut dice),
        comping(&[FIVE], true, &mut dice),
        comping(&[FOUR_MINOR], true, &mut dice),
    ];
    sheets
        .into_iter()
        .map(|sheet| sheet.performed(&mut dice))
        .collect()
}

/// Sixteenths up and down over three octaves, all ringing under the damper.
fn arpeggios(tonic: u8, bars: &[(u8, Chord)]) -> Sheet {
    let mut sheet = Sheet::default();
    for (bar, (root, chord)) in bars.iter().enumerate() {
        let start_q = bar as f64 * BAR_Q;
        let bass = above(36, tonic + root);
        let mut ladder: Vec<u8> = vec![bass];
        ladder.extend(
            (0..3).flat_map(|octave| chord.iter().map(move |n| bass + 12 + octave * 12 + n)),
        );
        let top = ladder.len() - 1;
        sheet.pedal(start_q);
        for step in 0..16 {
            let place = if step <= top { step } else { 2 * top - step };
            sheet.note(start_q + step as f64 * 0.25, 0.25, ladder[place]);
        }
    }
    sheet
}

/// Low, high, middle, high in eighths under a tune, no pedal.
fn alberti(tonic: u8, dice: &mut Dice) -> Sheet {
    let mut sheet = Sheet::default();
    for (bar, (root, chord)) in IN_MAJOR.iter().enumerate() {
        let start_q = bar as f64 * BAR_Q;
        let low = above(48, tonic + root);
        for eighth in 0..8 {
            let place = [0, 2, 1, 2][eighth % 4];
            sheet.note(start_q + eighth as f64 * 0.5, 0.5, low + chord[place]);
        }
        tune(&mut sheet, start_q, tonic + root, chord, dice);
    }
    sheet
}

/// Quarters and eighths of chord tones with a step between them now and then.
fn tune(sheet: &mut Sheet, start_q: f64, root: u8, chord: Chord, dice: &mut Dice) {
    for beat in 0..4 {
        let at_q = start_q + beat as f64;
        let key = above(69, root + dice.pick(chord));
        if dice.percent(40) {
            sheet.note(at_q, 0.5, key);
            sheet.note(at_q + 0.5, 0.5, key + dice.pick(&[1, 2]));
        } else {
            sheet.note(at_q, 1.0, key);
        }
    }
}

/// Root, fifth and tenth one after another and held, chords of the right hand off the beat.
fn broken_tenths(tonic: u8, dice: &mut Dice) -> Sheet {
    let mut sheet = Sheet::default();
    for (bar, (root, chord)) in IN_MAJOR.iter().chain(&IN_MINOR[..8]).enumerate() {
        let start_q = bar as f64 * BAR_Q;
        let bass = above(36, tonic + root);
        sheet.pedal(start_q);
        for (place, step) in [0, chord[2], chord[1] + 12].into_iter().enumerate() {
            let at_q = place as f64 * 0.5;
            sheet.note(start_q + at_q, BAR_Q - at_q, bass + step);
        }
        for beat in [1.5, 2.0, 3.0, 3.5] {
            if dice.percent(75) {
                let low = dice.between(60, 67) as u8;
                for class in *chord {
                    sheet.note(start_q + beat, 0.5, above(low, tonic + root + class));
                }
            }
        }
    }
    sheet
}

/// Neighbouring keys together, white, black or all, that open into a triad.
fn clusters(dice: &mut Dice) -> Sheet {
    const WHITE: Chord = &[0, 2, 4, 5, 7, 9, 11];
    const BLACK: Chord = &[1, 3, 6, 8, 10];
    const ALL: Chord = &[0, 1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11];
    let mut sheet = Sheet::default();
    for bar in 0..16 {
        let start_q = bar as f64 * BAR_Q;
        let low = dice.between(50, 66) as u8;
        let kind = dice.pick(&[WHITE, BLACK, ALL]);
        let many = dice.between(3, 6) as usize;
        let keys = (low..).filter(|key| kind.contains(&(key % 12)));
        for key in keys.take(many) {
            sheet.note(start_q, 2.0, key);
        }
        let chord = dice.pick(&[MAJOR, MINOR]);
        for step in chord {
            sheet.note(start_q + 2.0, 2.0, low + step);
        }
        sheet.note(start_q + 2.0, 2.0, above(36, low));
    }
    sheet
}

/// ii and V for two quarters each, I for four, in each key; struck off the beat, too; with a walking bass and a tune or
/// without.
fn comping(voicings: &[[Chord; 3]], band: bool, dice: &mut Dice) -> Sheet {
    let mut sheet = Sheet::default();
    for key in 0..12u8 {
        let tonic = key * 5 % 12;
        let voicing = dice.pick(voicings);
        let start_q = key as f64 * 2.0 * BAR_Q;
        for (place, (step, at_q, long_q)) in [(2, 0.0, 2.0), (7, 2.0, 2.0), (0, 4.0, 4.0)]
            .into_iter()
            .enumerate()
        {
            let root = tonic + step;
            let low = above(48, root + voicing[place][0]);
            let keys = voicing[place].iter().map(|n| low + n - voicing[place][0]);
            strike(&mut sheet, start_q + at_q, long_q, keys.collect(), dice);
            if band {
                walk(
                    &mut sheet,
                    start_q + at_q,
                    long_q,
                    root,
                    voicing[place],
                    dice,
                );
            }
        }
    }
    sheet
}

/// One chord, held, or let go and struck again half a beat late.
fn strike(sheet: &mut Sheet, at_q: f64, long_q: f64, keys: Vec<u8>, dice: &mut Dice) {
    let again = dice.percent(50);
    for key in keys {
        if again {
            sheet.note(at_q, 1.0, key);
            sheet.note(at_q + 1.5, long_q - 1.5, key);
        } else {
            sheet.note(at_q, long_q, key);
        }
    }
}

/// A bass in quarters that begins on the root, and a tune above.
fn walk(sheet: &mut Sheet, at_q: f64, long_q: f64, root: u8, voicing: Chord, dice: &mut Dice) {
    for beat in 0..long_q as u8 {
        let step = if beat == 0 { 0 } else { dice.pick(voicing) };
        sheet.note(at_q + beat as f64, 1.0, above(33, root + step));
        if dice.percent(60) {
            let tone = above(72, root + dice.pick(voicing));
            sheet.note(at_q + beat as f64 + dice.pick(&[0.0, 0.5]), 0.5, tone);
        }
    }
}
