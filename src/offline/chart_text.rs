//! The chart as a sheet for people: one from which a real harpsichord can be set.

use super::beats;
use super::chart::Chart;
use crate::pitch::{Interval, Log, Pitch};
use crate::stage::chords::good_keys;
use crate::stage::circle::Circle;
use crate::stage::expression::narrow_or_wide;
use crate::stage::landing::{ratio, where_c4_lands};
use crate::tuning::{Key, TonicWanted};
use std::fmt::Write;

/// The keys between which instruments are set by ear.
const F3: Key = match Key::new(53) {
    Some(key) => key,
    None => panic!("53 is a key"),
};
const FIFTH: Interval = Interval::from_cents(700);
const THIRD: Interval = Interval::from_cents(400);
/// An interval further off is none of its kind: a wolf third is 41 c wide, a wolf fifth 55.
const STRANGE: Interval = Interval::from_cents(60);

/// The whole sheet.
pub fn sheet(chart: &Chart) -> String {
    let mut text = heading(chart);
    match Circle::of(&chart.tuning, &chart.names) {
        Some(circle) => {
            for line in circle.lines() {
                let _ = writeln!(text, "{line}.");
            }
            if let Some(keys) = good_keys(&chart.tuning, &chart.names) {
                let _ = writeln!(text, "There is {keys}.");
            }
            octave(&mut text, chart);
            setting(&mut text, chart);
        }
        None => steps(&mut text, chart),
    }
    all_keys(&mut text, chart);
    text
}

fn heading(chart: &Chart) -> String {
    let mut text = String::new();
    // Writing to a String cannot fail.
    if let Some(song) = &chart.song {
        let _ = writeln!(text, "{song}");
    }
    let tonic = chart
        .tonic()
        .map(|tonic| format!(" on {tonic}"))
        .unwrap_or_default();
    let turned = chart
        .placement
        .turned_to
        .map(|to| format!(", turned to {to}"))
        .unwrap_or_default();
    let _ = writeln!(text, "{}{tonic}{turned}", chart.tuning_name);
    for (word, said) in [
        ("", &chart.about),
        ("Source: ", &chart.source),
        ("How sure: ", &chart.sure),
    ] {
        if let Some(said) = said {
            let _ = writeln!(text, "{word}{said}.");
        }
    }
    let _ = writeln!(text, "{}.", chart.reference());
    if let Some(key) = Key::C4
        .moved(chart.transpose_keys.into())
        .filter(|key| *key != Key::C4)
    {
        let (from, to) = (chart.name(Key::C4), chart.name(key));
        let _ = writeln!(
            text,
            "The song is transposed: {from} sounds what is said of {to} here."
        );
    }
    let landing = where_c4_lands(&chart.scale, &chart.placement, &chart.tuning);
    let _ = writeln!(text, "{landing}.");
    text
}

/// One octave from middle C, as tuners write it.
fn octave(text: &mut String, chart: &Chart) {
    let reference = chart.name(chart.placement.reference);
    let _ = writeln!(
        text,
        "\nCents from equal with {reference} at 0, cents above C, and hertz:\n"
    );
    let _ = writeln!(text, "  key   offset   above C        Hz");
    let Some(c4) = chart.tuning.pitch(Key::C4) else {
        return; // a circle sounds on all keys
    };
    for line in chart
        .keys()
        .iter()
        .filter(|line| (60..72).contains(&line.key))
    {
        let above = line.cents - c4.cents();
        let _ = writeln!(
            text,
            "  {:<4} {:>+7.1} {above:>9.3} {:>9.3}",
            line.name,
            plus_nought(line.offset),
            line.hz
        );
    }
}

/// `-0.0` has no place on a sheet.
fn plus_nought(value: f64) -> f64 {
    if value.abs() < 0.05 { 0.0 } else { value }
}

/// Fifths and major thirds from F3 to F4.
fn setting(text: &mut String, chart: &Chart) {
    let _ = writeln!(
        text,
        "\nFrom F3 to F4: beats a second of fifths and major thirds, and how far each is from pure:\n"
    );
    let (fifth, third) = ("fifth    beats  from pure", "third    beats  from pure");
    let _ = writeln!(text, "  {:<4} {:>8}   {fifth:<46} {third}", "key", "Hz");
    for low in (F3.number()..=F3.number() + 12).filter_map(Key::new) {
        let Some(pitch) = chart.tuning.pitch(low) else {
            continue;
        };
        let fifth = interval(chart, low, 7, FIFTH, (3, 2), beats::of_fifth);
        let third = interval(chart, low, 4, THIRD, (5, 4), beats::of_major_third);
        let line = format!(
            "  {:<4} {:>8.3}   {fifth:<46} {third}",
            chart.name(low),
            pitch.hertz()
        );
        let _ = writeln!(text, "{}", line.trim_end());
    }
}

/// `F3-C4    1.64  narrow 1/4 syntonic`.
fn interval(
    chart: &Chart,
    low: Key,
    keys: i32,
    equal: Interval,
    (over, under): (u64, u64),
    beats: fn(Pitch, Pitch) -> f64,
) -> String {
    let Some(high) = low.moved(keys) else {
        return String::new();
    };
    let (Some(from), Some(to)) = (chart.tuning.pitch(low), chart.tuning.pitch(high)) else {
        return String::new();
    };
    let names = format!("{}-{}", chart.name(low), chart.name(high));
    if (to - from - equal).abs() > STRANGE {
        return format!("{names:<8}  {:.1} c, none", (to - from).cents());
    }
    let from_pure = to - from - Log::of_ratio(over, under).interval();
    format!(
        "{names:<8} {:>5.2}  {}",
        beats(from, to).abs(),
        narrow_or_wide(from_pure)
    )
}

/// One period upwards from the tonic, where twelve keys are not an octave or some are silent.
fn steps(text: &mut String, chart: &Chart) {
    let tonic = chart.scale.tonic_of(&chart.placement);
    let Some(zero) = chart.tuning.pitch(tonic) else {
        return;
    };
    let every = chart.scale.keys_to_period() as u8;
    let counted = match chart.scale.tonic_wanted() {
        TonicWanted::Key => format!("{every} keys to the period"),
        _ => "twelve keys to the period".to_string(),
    };
    let _ = writeln!(text, "\nUpwards from {}, {counted}:\n", chart.name(tonic));
    let _ = writeln!(text, "  key        above    ratio        Hz");
    for key in (0..=every).filter_map(|by| tonic.moved(by as i32)) {
        let Some(pitch) = chart.tuning.pitch(key) else {
            continue;
        };
        let above = pitch - zero;
        let ratio = ratio(above)
            .map(|(over, under)| format!("{over}/{under}"))
            .unwrap_or_default();
        let _ = writeln!(
            text,
            "  {:<5} {:>10.3} {ratio:>8} {:>9.3}",
            chart.name(key),
            above.cents(),
            pitch.hertz()
        );
    }
}

fn all_keys(text: &mut String, chart: &Chart) {
    let _ = writeln!(text, "\nAll keys that sound:\n");
    let _ = writeln!(text, "  number  key          Hz   offset");
    for line in chart.keys() {
        let offset = plus_nought(line.offset);
        let _ = writeln!(
            text,
            "  {:>6}  {:<5} {:>9.3} {offset:>+8.1}",
            line.key, line.name, line.hz
        );
    }
}
