//! The table as people read it: ours above, the published rows below.

use super::corpus::Manner;
use super::peers::{Peer, peers};
use super::score::{Scores, Spread, Table};

const METHOD_WIDTH: usize = 40;
/// Headings as in `peers.md`, where it has them, and widths.
const COLUMNS: [(&str, usize); 11] = [
    ("V5c", 17),
    ("V5a", 17),
    ("V7a", 17),
    ("triads pure", 13),
    ("held", 16),
    ("settling", 11),
    ("late motion", 15),
    ("drift", 18),
    ("rest", 6),
    ("farthest", 10),
    ("fastest", 7),
];

pub fn print_head(what: &str) {
    println!("\n{what}; cents, mean/95 %/max (drift: mean end/max end/peak, settling: 95 %)");
    let cells = COLUMNS.map(|(heading, width)| format!("{heading:<width$}"));
    println!("{:<METHOD_WIDTH$}{}", "", cells.concat());
}

pub fn print_ours(name: &str, scores: &Scores) {
    let cells = [
        precise(scores.purity(Table::V5c)),
        precise(scores.purity(Table::V5a)),
        precise(scores.purity(Table::V7a)),
        format!("{:.1}", scores.pure_triads_percent()),
        precise(scores.held()),
        format!("{:.1}", scores.settling().p95),
        precise(scores.late()),
        format!(
            "{:.2}/{:.1}/{:.1}",
            scores.drift_ends().mean,
            scores.drift_ends().max,
            scores.drift_peak()
        ),
        format!("{:.1}", scores.rest()),
        format!("{:.1}", scores.farthest()),
        format!("{:.2}", scores.fastest()),
    ];
    print_row(name, &cells);
    let Scores {
        missing,
        extra,
        stuck,
        cut,
        ..
    } = scores;
    if missing + extra + stuck + cut > 0 {
        println!(
            "    {missing} notes missing, {extra} extra, {stuck} stuck, {cut} ended at a wrong time"
        );
    }
}

pub fn print_peers(manner: Manner) {
    println!("published, of the same pieces (tests/outside/adaptive/peers.md):");
    for peer in &peers(manner) {
        print_peer(peer);
    }
}

pub fn print_peer(peer: &Peer) {
    let cells = COLUMNS.map(|(heading, _)| peer.cell(heading).unwrap_or("").to_string());
    // The published motion and motion cells carry a share in brackets; the figures are enough beside ours.
    let bare = cells.map(|cell| cell.split(" (").next().unwrap_or("").to_string());
    print_row(&format!("  {}", peer.method), &bare);
}

fn print_row(name: &str, cells: &[String; 11]) {
    let name: String = name.chars().take(METHOD_WIDTH - 2).collect();
    let cells: Vec<String> = cells
        .iter()
        .zip(COLUMNS)
        .map(|(cell, (_, width))| format!("{cell:<width$}"))
        .collect();
    println!("{name:<METHOD_WIDTH$}{}", cells.concat().trim_end());
}

fn precise(spread: Spread) -> String {
    format!("{:.2}/{:.1}/{:.1}", spread.mean, spread.p95, spread.max)
}
