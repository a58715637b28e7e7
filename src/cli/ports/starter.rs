//! A stage file from what is plugged in.

use crate::limits::{KEYBOARDS_MAX, SYNTHS_MAX};
use crate::ports::names::{Port, without_numbers};

/// A device and the globs and socket that find it again.
struct Found {
    name: String,
    glob: String,
    socket: Option<String>,
}

/// A file that loads as it stands. Where nothing is plugged in, it waits for whatever comes.
pub fn stage_file(ports: &[Port]) -> String {
    let usable = || ports.iter().filter(|port| !port.ours && !port.is_through());
    let plain_synths: Vec<&Port> = usable().filter(|port| port.hears && !port.sends).collect();
    // A device both ways is taken for a keyboard; for a synth too only if there is no other.
    let synths = match plain_synths.is_empty() {
        false => plain_synths,
        true => usable().filter(|port| port.hears).take(1).collect(),
    };
    let keyboards: Vec<&Port> = usable().filter(|port| port.sends).collect();
    let mut names = Vec::new();
    let keyboards = found(&keyboards, KEYBOARDS_MAX, "keys", ports, &mut names);
    let synths = found(&synths, SYNTHS_MAX, "synth", ports, &mut names);

    let mut text = String::from(
        "# From what was plugged in. Change what you like; `trued check` says what is wrong, `trued run` plays.\n\
         stage: My evening\n",
    );
    if keyboards.is_empty() {
        text.push_str("# No keyboard was plugged in: any that comes will do.\n");
    } else {
        text.push_str("keyboards:\n");
    }
    for found in &keyboards {
        text.push_str(&format!("  {}: {{{}}}\n", found.name, found.wish()));
    }
    text.push_str("synths:\n");
    if synths.is_empty() {
        text.push_str("  # No synth was plugged in: this opens a port that others connect to.\n");
        text.push_str("  synth: {port: virtual, dialect: channel-bend, bend_range: 2}\n");
    }
    for found in &synths {
        let wish = found.wish();
        text.push_str(&format!(
            "  {}: {{{wish}, dialect: channel-bend, bend_range: 2}}\n",
            found.name
        ));
    }
    text.push_str(
        "set:\n\
         \x20 - {song: First song, tuning: quarter-comma-meantone}\n\
         \x20 - {song: Second song, tuning: werckmeister-3}\n\
         # `trued ports --watch` prints a line for what you press; put it here:\n\
         # cues:\n\
         #   - {when: {controller: 82}, do: next}\n",
    );
    text
}

impl Found {
    fn wish(&self) -> String {
        let socket = self.socket.as_ref();
        let socket = socket.map_or(String::new(), |socket| format!(", socket: \"{socket}\""));
        format!("port: {}{socket}", quoted(&self.glob))
    }
}

fn found(
    chosen: &[&Port],
    max: usize,
    fallback: &str,
    all: &[Port],
    names: &mut Vec<String>,
) -> Vec<Found> {
    chosen
        .iter()
        .take(max)
        .map(|port| {
            let twins = |same: &dyn Fn(&Port) -> bool| all.iter().filter(|p| same(p)).count() > 1;
            let short = without_numbers(&port.name);
            // Without numbers, because some change with every plugging; with them, where only they tell two ports apart.
            let same_short = |p: &Port| without_numbers(&p.name) == short;
            let glob = if twins(&same_short) {
                port.name.clone()
            } else {
                format!("*{short}*")
            };
            let same_name = |p: &Port| p.name == port.name;
            Found {
                name: device_name(port, fallback, names),
                glob,
                socket: port.socket.clone().filter(|_| twins(&same_name)),
            }
        })
        .collect()
}

/// A short name to say aloud: the device's, small letters joined by hyphens.
pub fn device_name(port: &Port, fallback: &str, names: &mut Vec<String>) -> String {
    let words: Vec<String> = without_numbers(&port.device)
        .split(|c: char| !c.is_alphabetic())
        .filter(|word| !word.is_empty())
        .map(str::to_lowercase)
        .collect();
    let base = match words.is_empty() {
        true => fallback.to_string(),
        false => words.join("-"),
    };
    let numbered = |n: usize| match n {
        1 => base.clone(),
        n => format!("{base}-{n}"),
    };
    let name = (1..)
        .map(numbered)
        .find(|name| !names.contains(name))
        .unwrap_or(base.clone());
    names.push(name.clone());
    name
}

/// A text in double quotes, as YAML reads it.
fn quoted(text: &str) -> String {
    let inside: String = text
        .chars()
        .filter(|c| !c.is_control())
        .flat_map(|c| match c {
            '"' | '\\' => vec!['\\', c],
            _ => vec![c],
        })
        .collect();
    format!("\"{inside}\"")
}

#[cfg(test)]
mod tests {
    use super::super::tests::port;
    use super::*;
    use crate::daemon::rig::RigWanted;
    use crate::ports::names::{Choice, choose};
    use crate::stage::Stage;
    use std::path::Path;

    /// What a file takes of the ports it was made from, by client number.
    fn taken(ports: &[Port]) -> (Vec<i32>, Vec<i32>) {
        let text = stage_file(ports);
        let stage = Stage::parse(Path::new("evening.yaml"), &text)
            .unwrap_or_else(|complaints| panic!("{text}\n{}", complaints[0]));
        let rig = RigWanted::of(&stage);
        let choice = choose(ports, &rig.keyboards, &rig.synths, &Choice::default());
        assert!(choice.remarks.is_empty(), "{text}\n{:?}", choice.remarks);
        let client = |address: &crate::ports::names::Address| address.client;
        (
            choice.keyboards.iter().flatten().map(client).collect(),
            choice.synths.iter().flatten().map(client).collect(),
        )
    }

    #[test]
    fn the_file_loads_and_finds_what_it_was_made_from() {
        let through = port(14, "Midi Through", "Midi Through Port-0", "sh");
        assert_eq!(taken(&[]), (vec![], vec![]));
        assert_eq!(taken(std::slice::from_ref(&through)), (vec![], vec![]));
        let keys = port(20, "Wharf Keys", "Wharf Keys MIDI 1", "sh");
        let organ = port(130, "Loft \"Organ\" \\ 2", "Loft: organ, #2", "h");
        assert_eq!(
            taken(&[through.clone(), keys.clone(), organ]),
            (vec![20], vec![130])
        );
        // A piano that is all there is, is both.
        assert_eq!(taken(&[through, keys]), (vec![20], vec![20]));
    }

    #[test]
    fn twins_are_told_apart_by_number_or_by_socket() {
        let raw = |n: i32| {
            let name = format!("VirMIDI 1-{n}");
            port(20 + n, &format!("Virtual Raw MIDI 1-{n}"), &name, "sh")
        };
        let organ = port(130, "Organ", "Organ", "h");
        assert_eq!(
            taken(&[raw(0), raw(1), raw(2), organ]),
            (vec![20, 21, 22], vec![130])
        );
        let twin = |client: i32, socket: &str| Port {
            socket: Some(socket.to_string()),
            ..port(client, "Wharf Keys", "Wharf Keys MIDI 1", "s")
        };
        assert_eq!(taken(&[twin(20, "1-1.2"), twin(24, "1-1.3")]).0, [20, 24]);
    }
}
