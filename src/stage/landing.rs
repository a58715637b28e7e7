//! Where middle C lands in a tuning, and why: players who pin another key are told what it does.

use crate::pitch::{Interval, Log, Pitch};
use crate::tuning::{Key, Pin, Placement, Scale, Tuning};

/// Closer to equal than this is not worth a reason.
const SAME: Interval = Interval::from_microcents(50_000);
/// The largest number below in a ratio that is shown as one.
const UNDER_MAX: u64 = 128;

/// `C4 sounds 251.43 Hz, 68.8 c under equal at A4 = 440, because A4 is 7/4 here; pin: tonic would put C4 at 261.63 Hz`.
pub fn where_c4_lands(scale: &Scale, placement: &Placement, tuning: &Tuning) -> String {
    let Some(c4) = tuning.pitch(Key::C4) else {
        return "C4 is silent".to_string();
    };
    let reference = placement.reference;
    let semitones = Key::C4.number() as i64 - reference.number() as i64;
    let equal = placement.hertz.pitch() + Interval::SEMITONE * semitones;
    let at = format!(
        "equal at {reference} = {}",
        short_hertz(placement.hertz.hertz())
    );
    let sounds = format!("C4 sounds {:.2} Hz", c4.hertz());
    if (c4 - equal).abs() < SAME {
        return format!("{sounds}, as {at}");
    }
    let off = off_equal(c4 - equal);
    let Placement { pin: Pin::Key, .. } = placement else {
        let tonic = scale.tonic_of(placement);
        let heard = match tuning.pitch(reference) {
            Some(pitch) => format!("{reference} sounds {:.2} Hz", pitch.hertz()),
            None => format!("{reference} is silent"),
        };
        return format!("{sounds}, {off} {at}, because pin: tonic puts {tonic} there; {heard}");
    };
    if reference == Key::C4 {
        return format!("{sounds}, {off} {at}");
    }
    let because = match tuning.pitch(reference) {
        Some(pitch) => format!(", because {reference} is {} here", place_above(pitch, c4)),
        None => String::new(),
    };
    let pinned = Placement {
        pin: Pin::Tonic,
        ..*placement
    };
    let other = match scale
        .tune(&pinned)
        .ok()
        .and_then(|tuning| tuning.pitch(Key::C4))
    {
        Some(pitch) if (pitch - c4).abs() >= SAME => {
            format!("; pin: tonic would put C4 at {:.2} Hz", pitch.hertz())
        }
        _ => String::new(),
    };
    format!("{sounds}, {off} {at}{because}{other}")
}

fn off_equal(off: Interval) -> String {
    let direction = if off < Interval::ZERO {
        "under"
    } else {
        "over"
    };
    format!("{:.1} c {direction}", off.abs().cents())
}

/// `7/4`, or `889.7 c above C4`, or `3.2 c below C4`.
fn place_above(pitch: Pitch, c4: Pitch) -> String {
    let above = pitch - c4;
    match ratio(above) {
        Some((over, under)) => format!("{over}/{under}"),
        None if above < Interval::ZERO => format!("{:.1} c below C4", above.abs().cents()),
        None => format!("{:.1} c above C4", above.cents()),
    }
}

/// The simplest ratio of this size, to the microcent or two that rounding costs.
pub fn ratio(size: Interval) -> Option<(u64, u64)> {
    let factor = 2f64.powf(size.cents() / 1200.0);
    (1..=UNDER_MAX).find_map(|under| {
        let over = (factor * under as f64).round() as u64;
        let close = over > 0
            && (Log::of_ratio(over, under).interval() - size)
                .abs()
                .microcents()
                <= 2;
        close.then_some((over, under))
    })
}

/// `440`, `415.3`: as many decimals as there are.
pub fn short_hertz(hertz: f64) -> String {
    let text = format!("{hertz:.6}");
    text.trim_end_matches('0').trim_end_matches('.').to_string()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::pitch::Hertz;
    use crate::tuning::{FromTonic, KeyMap};

    fn said(steps: &[(u64, u64)], pin: Pin, tonic: Option<Key>) -> String {
        let scale = Scale::FromTonic(FromTonic {
            steps: steps
                .iter()
                .map(|(over, under)| Log::of_ratio(*over, *under))
                .collect(),
            period: Log::OCTAVE,
            map: KeyMap::EachKey,
            changes: [Log::ZERO; 12],
        });
        let placement = Placement {
            tonic,
            turned_to: None,
            reference: Key::A4,
            hertz: Hertz::A440,
            pin,
        };
        let tuning = scale.tune(&placement).expect("tunes");
        where_c4_lands(&scale, &placement, &tuning)
    }

    #[test]
    fn c4_is_said_with_its_reason() {
        let sevens: Vec<(u64, u64)> = [(1, 1), (7, 4)]
            .into_iter()
            .chain((1..8).map(|n| (n, n)))
            .collect();
        let mut on_a: Vec<(u64, u64)> = sevens.iter().map(|_| (1, 1)).collect();
        on_a.push((7, 4));
        on_a.extend([(1, 1), (1, 1)]);
        assert_eq!(on_a.len(), 12);
        assert_eq!(
            said(&on_a, Pin::Key, None),
            "C4 sounds 251.43 Hz, 68.8 c under equal at A4 = 440, because A4 is 7/4 here; \
             pin: tonic would put C4 at 261.63 Hz"
        );
        assert_eq!(
            said(&on_a, Pin::Tonic, None),
            "C4 sounds 261.63 Hz, as equal at A4 = 440"
        );
        let tonic = Key::parse("D4");
        assert!(
            said(&on_a, Pin::Tonic, tonic).contains("because pin: tonic puts D4 there; A4 sounds")
        );
    }

    #[test]
    fn ratios_are_found_only_where_there_is_one() {
        for (over, under) in [(3, 2), (7, 4), (45, 32), (4, 5), (27, 16)] {
            assert_eq!(
                ratio(Log::of_ratio(over, under).interval()),
                Some((over, under))
            );
        }
        assert_eq!(ratio(Interval::from_cents(700)), None);
    }
}
