//! A picture of a recording: time to the right, pitch upwards, every note a strip where it was sent.

use super::retune::{Recording, Sounded};
use crate::tuning::Key;
use std::fmt::Write;

const PIXELS_PER_S: f64 = 24.0;
const PIXELS_PER_SEMITONE: f64 = 14.0;
const MARGIN: f64 = 48.0;
/// A strip narrower than this has no room for its number.
const LABEL_PIXELS_MIN: f64 = 26.0;

/// An SVG. `titles` are those of the set.
pub fn draw(recording: &Recording, titles: &[String]) -> String {
    let numbers = recording.notes.iter().map(|note| note.onset.number);
    let lowest = numbers.clone().min().unwrap_or(60) as f64 - 1.5;
    let highest = numbers.max().unwrap_or(72) as f64 + 1.5;
    let length_s = recording.end.nanos() as f64 / 1e9;
    let width = (2.0 * MARGIN + length_s * PIXELS_PER_S).max(480.0);
    let height = 2.0 * MARGIN + (highest - lowest) * PIXELS_PER_SEMITONE;
    let x = |s: f64| MARGIN + s * PIXELS_PER_S;
    let y = |semitones: f64| height - MARGIN - (semitones - lowest) * PIXELS_PER_SEMITONE;
    let mut svg = format!(
        "<svg xmlns=\"http://www.w3.org/2000/svg\" viewBox=\"0 0 {width:.0} {height:.0}\" width=\"{width:.0}\" \
         height=\"{height:.0}\" font-family=\"sans-serif\" font-size=\"9\">\n\
         <rect width=\"100%\" height=\"100%\" fill=\"white\"/>\n\
         <text x=\"{MARGIN}\" y=\"14\" font-size=\"11\">Each strip is a note where it sounds; grey lines are equal \
         temperament at A4 = 440 Hz; numbers are cents from there</text>\n"
    );
    let mut draw = |line: String| svg += &(line + "\n");
    for key in Key::all() {
        let semitones = key.number() as f64;
        if semitones < lowest || semitones > highest {
            continue;
        }
        let (at, right) = (y(semitones), width - MARGIN);
        draw(format!(
            "<path d=\"M{MARGIN} {at:.1}H{right:.0}\" stroke=\"#ddd\"/><text x=\"12\" y=\"{:.1}\" fill=\"#666\">{key}</text>",
            at + 3.0
        ));
    }
    for second in (0..=length_s as u32).step_by(10) {
        let (at, foot) = (x(second as f64), height - MARGIN + 14.0);
        let clock = format!("{}:{:02}", second / 60, second % 60);
        draw(format!(
            "<text x=\"{at:.1}\" y=\"{foot:.1}\" fill=\"#666\">{clock}</text>"
        ));
    }
    let mut song = None;
    for note in &recording.notes {
        if song.replace(note.song) != Some(note.song) {
            let title = titles.get(note.song as usize).map_or("", |title| title);
            let at = x(seconds(note).0);
            let foot = height - MARGIN;
            draw(format!(
                "<path d=\"M{at:.1} 32V{foot:.1}\" stroke=\"#bbb\" stroke-dasharray=\"3\"/>\
                 <text x=\"{:.1}\" y=\"30\" font-size=\"10\">{}</text>",
                at + 2.0,
                escaped(title)
            ));
        }
        draw(strip(note, x, y));
    }
    svg + "</svg>\n"
}

/// A note as a bar with its cents from equal: blue below, orange above, the stronger the further away.
fn strip(note: &Sounded, x: impl Fn(f64) -> f64, y: impl Fn(f64) -> f64) -> String {
    let (from_s, until_s) = seconds(note);
    let semitones = note.onset.sent.cents() / 100.0;
    let off_cents = note.onset.sent.cents() - note.onset.number as f64 * 100.0;
    let (left, width) = (x(from_s), (x(until_s) - x(from_s)).max(1.5));
    let (top, high) = (y(semitones) - 4.5, 9.0);
    let hue = if off_cents < 0.0 { 215 } else { 28 };
    let strength = (off_cents.abs() * 3.0).min(85.0);
    let mut text = format!(
        "<rect x=\"{left:.1}\" y=\"{top:.2}\" width=\"{width:.1}\" height=\"{high}\" rx=\"2\" \
         fill=\"hsl({hue},{strength:.0}%,70%)\" stroke=\"#555\" stroke-width=\".4\"/>"
    );
    if width >= LABEL_PIXELS_MIN {
        let _ = write!(
            text,
            "<text x=\"{:.1}\" y=\"{:.2}\">{off_cents:+.1}</text>",
            left + 2.0,
            top + 7.6
        );
    }
    text
}

fn seconds(note: &Sounded) -> (f64, f64) {
    let s = |time: crate::time::Time| time.nanos() as f64 / 1e9;
    (s(note.time), s(note.until))
}

fn escaped(text: &str) -> String {
    text.replace('&', "&amp;")
        .replace('<', "&lt;")
        .replace('>', "&gt;")
}
