//! `intonation`: the method by which a song's tuning meets its harmony, and its knobs.

use super::advice::Findings;
use super::complaint::Complaints;
use super::node::{At, Node};
use super::placing::twelve_to_the_octave;
use super::tunings::TuningText;
use super::values::choice;
use crate::intonation::{Method, Ratios, Settings};
use crate::pitch::Interval;
use crate::time::Span;

#[derive(Clone, Copy, PartialEq)]
enum Way {
    Fixed,
    ChordRoot,
    LeastSquares,
}

const METHODS: [(&str, Way); 3] = [
    ("fixed", Way::Fixed),
    ("chord-root", Way::ChordRoot),
    ("least-squares", Way::LeastSquares),
];

/// A word, or a map with `method` and its knobs.
pub fn read(at: Option<&At<'_>>, described: Option<&TuningText>, found: &mut Findings) -> Method {
    let Some(at) = at else {
        return Method::Fixed;
    };
    let (way, settings) = match at.node {
        Node::Map(_) => settings(at, &mut found.complaints),
        _ => {
            let way = choice(at, &METHODS, &mut found.complaints);
            (way, Settings::DEFAULT)
        }
    };
    let Some(way) = way.filter(|way| *way != Way::Fixed) else {
        return Method::Fixed;
    };
    let name = METHODS
        .iter()
        .find(|(_, other)| *other == way)
        .map_or("", |(name, _)| name);
    if let Some(described) = described
        && !twelve_to_the_octave(&described.scale)
    {
        found.complaints.add(
            &at.trail,
            format!(
                "{name} needs twelve keys to the octave, and {} has not",
                described.name
            ),
            "write `intonation: fixed`, or choose another tuning",
        );
        return Method::Fixed;
    }
    match way {
        Way::Fixed => Method::Fixed,
        Way::ChordRoot => Method::ChordRoot(settings),
        Way::LeastSquares => Method::LeastSquares(settings),
    }
}

fn settings(at: &At<'_>, complaints: &mut Complaints) -> (Option<Way>, Settings) {
    let mut settings = Settings::DEFAULT;
    let Some(mut fields) = at.fields(
        "a method, or a map such as `{method: chord-root}`",
        complaints,
    ) else {
        return (None, settings);
    };
    let way = match fields.take("method") {
        Some(at) => choice(&at, &METHODS, complaints),
        None => {
            complaints.add(
                &at.trail,
                "this intonation has no method",
                "write `method: fixed`, chord-root or least-squares",
            );
            None
        }
    };
    if let Some(at) = fields.take("ratios") {
        settings.ratios = ratios(&at, complaints).unwrap_or_default();
    }
    let mut knob = |name: &'static str, unit: &str, most: i64| {
        let at = fields.take(name)?;
        limit(&at, name, unit, most, complaints)
    };
    let cents = |number: f64| Interval::from_microcents((number * 1e6).round() as i64);
    let span = |seconds: f64| Span::from_nanos((seconds * 1e9).round() as u64);
    if let Some(limit) = knob("drift_limit_cents", "cents", 100) {
        settings.drift_limit = limit.map(cents);
    }
    if let Some(Some(speed)) = knob("return_cents_per_s", "cents a second", 100) {
        settings.return_per_s = cents(speed);
    }
    if let Some(Some(millis)) = knob("settle_ms", "milliseconds", 1000) {
        settings.settle = span(millis / 1e3);
    }
    if let Some(limit) = knob("hold_limit_cents", "cents", 100) {
        settings.hold_limit = limit.map(cents);
    }
    if let Some(Some(speed)) = knob("glide_cents_per_s", "cents a second", 1000) {
        settings.glide_per_s = cents(speed);
    }
    if let Some(Some(seconds)) = knob("memory_s", "seconds", 60) {
        settings.memory = span(seconds);
    }
    fields.finish(complaints);
    (way, settings)
}

/// A number that need not be whole, from 0; `none` (here `Some(None)`) takes a limit in cents away.
fn limit(
    at: &At<'_>,
    name: &str,
    unit: &str,
    most: i64,
    complaints: &mut Complaints,
) -> Option<Option<f64>> {
    let free = name.ends_with("limit_cents");
    let number = match at.node {
        Node::Number(text) => text.parse::<f64>().ok().map(Some),
        Node::Text(text) if free && text == "none" => Some(None),
        _ => None,
    };
    let good = number.filter(|n| n.is_none_or(|n| (0.0..=most as f64).contains(&n)));
    if good.is_none() {
        let none = if free { ", or none" } else { "" };
        complaints.add(
            &at.trail,
            format!("{} does not fit here", at.node.shown()),
            format!("write {unit} from 0 to {most}{none}"),
        );
    }
    good
}

/// `pure`, `pure-with-7`, or twelve ratios above the root.
fn ratios(at: &At<'_>, complaints: &mut Complaints) -> Option<Ratios> {
    let Node::List(items) = at.node else {
        let sets = [("pure", Ratios::Pure), ("pure-with-7", Ratios::PureWith7)];
        return choice(at, &sets, complaints);
    };
    if items.len() != 12 {
        complaints.add(
            &at.trail,
            format!("a set of ratios has twelve, here are {}", items.len()),
            "write one for each key above the root, beginning with 1/1; or pure, or pure-with-7",
        );
        return None;
    }
    let mut offsets = [Interval::ZERO; 12];
    for (semitones, item) in at.items().iter().enumerate() {
        let stands = super::values::interval(item, complaints)?;
        offsets[semitones] = stands - Interval::SEMITONE * semitones as i64;
    }
    Some(Ratios::Own(offsets))
}
