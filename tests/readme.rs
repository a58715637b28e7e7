//! Every stage file that the README shows loads without a complaint. A fragment is completed to a whole file first.

use std::path::Path;
use trued::stage::Stage;

const README: &str = include_str!("../README.md");
/// What a fragment lacks.
const REST: &str = "stage: Readme\nset:\n  - {song: One, tuning: equal-12}\n";

/// The YAML blocks, each moved to the margin.
fn blocks() -> Vec<String> {
    let mut blocks = Vec::new();
    let mut open: Option<(usize, String)> = None;
    for line in README.lines() {
        let indent = line.len() - line.trim_start().len();
        match (&mut open, line.trim()) {
            (None, "```yaml") => open = Some((indent, String::new())),
            (Some(_), "```") => blocks.extend(open.take().map(|(_, text)| text)),
            (Some((margin, text)), _) => {
                text.push_str(line.get(*margin..).unwrap_or(""));
                text.push('\n');
            }
            (None, _) => {}
        }
    }
    blocks
}

/// Tunings shown without their `tunings:` are indented as they would stand under it.
fn whole(block: &str) -> String {
    let block = if block.starts_with("  ") {
        format!("tunings:\n{block}")
    } else {
        block.to_string()
    };
    if block.contains("stage:") {
        block
    } else {
        format!("{REST}{block}")
    }
}

#[test]
fn every_stage_file_of_the_readme_loads() {
    let blocks = blocks();
    assert!(blocks.len() >= 4, "found {}", blocks.len());
    for block in blocks {
        let text = whole(&block);
        if let Err(complaints) = Stage::parse(Path::new("README.md"), &text) {
            panic!("{}\n{text}", complaints[0]);
        }
    }
}
