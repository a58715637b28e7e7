//! The published rows of `peers.md`.

use super::corpus::Manner;

const TEXT: &str = include_str!("peers.md");

/// One row, as printed: the method, and each column's cell by its heading.
pub struct Peer {
    pub method: &'static str,
    cells: Vec<(&'static str, &'static str)>,
}

impl Peer {
    /// A cell, by how its heading begins.
    pub fn cell(&self, heading: &str) -> Option<&'static str> {
        let found = self.cells.iter().find(|(h, _)| h.starts_with(heading));
        found.map(|(_, cell)| *cell)
    }

    /// The figures in a cell such as `8.56/15.6/15.6`.
    pub fn figures(&self, heading: &str) -> Vec<f64> {
        let cell = self.cell(heading).expect("a column of the table");
        let bare = cell.split(" (").next().unwrap_or(cell);
        let figures = bare.split('/').map(str::parse);
        figures.map(|f| f.expect("a figure")).collect()
    }
}

pub fn peers(manner: Manner) -> Vec<Peer> {
    let (_, text) = TEXT
        .split_once(match manner {
            Manner::Together => "## Together\n",
            Manner::Performed => "## Performed\n",
        })
        .expect("both tables");
    let lines = text.lines().skip_while(|line| !line.starts_with('|'));
    let rows = lines.take_while(|line| line.starts_with('|'));
    let mut rows = rows.map(|line| {
        let cells = line.trim_matches('|').split('|');
        cells.map(str::trim).collect::<Vec<_>>()
    });
    let headings = rows.next().expect("a head");
    let peer = |cells: Vec<&'static str>| Peer {
        method: cells[0],
        cells: headings.iter().copied().zip(cells).skip(1).collect(),
    };
    rows.skip(1).map(peer).collect()
}

/// The row whose name begins so.
pub fn peer(manner: Manner, begins: &str) -> Peer {
    let found = peers(manner)
        .into_iter()
        .find(|peer| peer.method.starts_with(begins));
    found.unwrap_or_else(|| panic!("a row {begins}"))
}
