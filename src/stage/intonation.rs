//! `intonation`: the method by which a song's tuning meets its harmony. Checked here; only `fixed` is played yet.

use super::advice::Findings;
use super::complaint::Complaints;
use super::node::{At, Node};
use super::placing::twelve_to_the_octave;
use super::tunings::TuningText;
use super::values::choice;
use crate::intonation::Method;

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

/// A word, or a map with `method` and its limits.
pub fn read(at: Option<&At<'_>>, described: Option<&TuningText>, found: &mut Findings) -> Method {
    let Some(at) = at else {
        return Method::Fixed;
    };
    let way = match at.node {
        Node::Map(_) => settings(at, &mut found.complaints),
        _ => choice(at, &METHODS, &mut found.complaints),
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
    }
    found.not_played(format!("`intonation: {name}`"));
    Method::Fixed
}

fn settings(at: &At<'_>, complaints: &mut Complaints) -> Option<Way> {
    let mut fields = at.fields(
        "a method, or a map such as `{method: chord-root}`",
        complaints,
    )?;
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
        ratios(&at, complaints);
    }
    const LIMITS: [(&str, &str, i64); 6] = [
        ("drift_limit_cents", "cents", 100),
        ("return_cents_per_s", "cents a second", 100),
        ("settle_ms", "milliseconds", 1000),
        ("hold_limit_cents", "cents", 100),
        ("glide_cents_per_s", "cents a second", 1000),
        ("memory_s", "seconds", 60),
    ];
    for (name, unit, most) in LIMITS {
        if let Some(at) = fields.take(name) {
            limit(&at, name, unit, most, complaints);
        }
    }
    fields.finish(complaints);
    way
}

/// A number that need not be whole, from 0; `none` takes a limit in cents away.
fn limit(at: &At<'_>, name: &str, unit: &str, most: i64, complaints: &mut Complaints) {
    let free = name.ends_with("limit_cents");
    let good = match at.node {
        Node::Number(text) => text
            .parse::<f64>()
            .is_ok_and(|number| (0.0..=most as f64).contains(&number)),
        Node::Text(text) => free && text == "none",
        _ => false,
    };
    if !good {
        let none = if free { ", or none" } else { "" };
        complaints.add(
            &at.trail,
            format!("{} does not fit here", at.node.shown()),
            format!("write {unit} from 0 to {most}{none}"),
        );
    }
}

/// `pure`, `pure-with-7`, or twelve ratios above the root.
fn ratios(at: &At<'_>, complaints: &mut Complaints) {
    let Node::List(items) = at.node else {
        let _ = choice(at, &[("pure", ()), ("pure-with-7", ())], complaints);
        return;
    };
    if items.len() != 12 {
        complaints.add(
            &at.trail,
            format!("a set of ratios has twelve, here are {}", items.len()),
            "write one for each key above the root, beginning with 1/1; or pure, or pure-with-7",
        );
    }
    for item in at.items() {
        let _ = super::values::interval(&item, complaints);
    }
}
