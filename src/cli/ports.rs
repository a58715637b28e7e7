//! `trued ports`: what is connected, what a stage file would take of it, gestures to paste, a file to start from.

mod gestures;
mod starter;
#[cfg(target_os = "linux")]
mod watch;

use super::{Failure, print};
use crate::daemon::rig::RigWanted;
use crate::ports::names::{Choice, Port, choose};
use serde_json::{Value, json};
use std::path::PathBuf;

#[derive(clap::Args)]
pub struct Args {
    /// A stage file: says which ports it would take
    file: Option<PathBuf>,
    /// As JSON
    #[arg(long, conflicts_with_all = ["watch", "stage"])]
    json: bool,
    /// Prints each gesture on any keyboard as a line to paste under `cues:`
    #[arg(long, conflicts_with = "stage")]
    watch: bool,
    /// Writes a stage file from what is plugged in
    #[arg(long, conflicts_with = "file")]
    stage: bool,
}

#[cfg(not(target_os = "linux"))]
pub fn run(_: Args) -> Result<(), Failure> {
    Err(Failure::new(
        Failure::UNAVAILABLE,
        "this version sees ports on Linux only",
    ))
}

#[cfg(target_os = "linux")]
pub fn run(args: Args) -> Result<(), Failure> {
    use crate::ports::{Patchbay, alsa::desk::Desk};
    let rig = match &args.file {
        Some(path) => Some(RigWanted::of(&super::read_stage(path)?)),
        None => None,
    };
    let unavailable =
        |broken: crate::ports::Broken| Failure::new(Failure::UNAVAILABLE, broken.to_string());
    let desk = Desk::open("trued").map_err(unavailable)?;
    let ports = desk.ports();
    if args.stage {
        print(&starter::stage_file(&ports))
    } else if args.watch {
        watch::watch(desk, &ports, rig.as_ref()).map_err(unavailable)
    } else if args.json {
        let json = serde_json::to_string_pretty(&as_json(&ports, rig.as_ref()));
        print(&format!("{}\n", json.unwrap_or_default()))
    } else {
        print(&as_text(&ports, rig.as_ref()))
    }
}

fn choice(ports: &[Port], rig: &RigWanted) -> Choice {
    choose(ports, &rig.keyboards, &rig.synths, &Choice::default())
}

fn as_text(ports: &[Port], rig: Option<&RigWanted>) -> String {
    let mut text = String::new();
    if ports.is_empty() {
        text.push_str("No MIDI ports. Plug something in, or start a synth.\n");
    }
    for port in ports {
        let ways = match (port.sends, port.hears) {
            (true, true) => "keyboard or synth",
            (true, false) => "keyboard",
            _ => "synth",
        };
        let remark = match (port.ours, port.is_through()) {
            (true, _) => "   (trued's own)",
            (_, true) => "   (a loop of the system; * leaves it alone)",
            _ => "",
        };
        let socket = port.socket.as_ref();
        let socket = socket.map_or(String::new(), |socket| format!("   socket {socket}"));
        text.push_str(&format!(
            "{ways:<18} {}{socket}{remark}\n",
            port.full_name()
        ));
    }
    if let Some(rig) = rig {
        let choice = choice(ports, rig);
        text.push_str("\nWith this stage file:\n");
        for line in rig.describe("would be", &choice, ports) {
            text.push_str(&format!("  {line}\n"));
        }
        for remark in &choice.remarks {
            text.push_str(&format!("  note: {remark}\n"));
        }
    }
    text
}

fn as_json(ports: &[Port], rig: Option<&RigWanted>) -> Value {
    let one = |port: &Port| {
        json!({
            "name": port.full_name(),
            "device": port.device,
            "port": port.name,
            "socket": port.socket,
            "keyboard": port.sends,
            "synth": port.hears,
            "through": port.is_through(),
            "ours": port.ours,
        })
    };
    let mut value = json!({"ports": ports.iter().map(one).collect::<Vec<_>>()});
    if let Some(rig) = rig {
        let choice = choice(ports, rig);
        let name = |address| {
            let port = ports.iter().find(|port| port.address == address);
            port.map(Port::full_name)
        };
        let keyboards = rig.keyboards.iter().zip(&choice.keyboards);
        let synths = rig.synths_alone().iter().zip(&choice.synths);
        value["keyboards"] = keyboards
            .map(|(wanted, taken)| {
                let taken: Vec<_> = taken.iter().copied().filter_map(name).collect();
                json!({"name": wanted.name, "would_take": taken})
            })
            .collect();
        value["synths"] = synths
            .map(|(wanted, taken)| json!({"name": wanted.name, "would_take": taken.and_then(name)}))
            .collect();
        value["remarks"] = json!(choice.remarks);
    }
    value
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::ports::names::{Address, Wanted, Wish};

    pub(super) fn port(client: i32, device: &str, name: &str, ways: &str) -> Port {
        Port {
            address: Address { client, port: 0 },
            device: device.to_string(),
            name: name.to_string(),
            aliases: Vec::new(),
            socket: None,
            sends: ways.contains('s'),
            hears: ways.contains('h'),
            ours: false,
        }
    }

    fn rig() -> RigWanted {
        RigWanted {
            keyboards: vec![Wanted {
                name: "keys".to_string(),
                wish: Wish::Any,
            }],
            synths: vec![Wanted {
                name: "organ".to_string(),
                wish: Wish::Named {
                    globs: vec!["*Organ*".to_string()],
                    socket: None,
                },
            }],
            lamps: 0,
        }
    }

    #[test]
    fn what_is_there_and_what_a_file_would_take() {
        let ports = [
            port(14, "Midi Through", "Midi Through Port-0", "sh"),
            port(20, "Wharf Keys", "Wharf Keys MIDI 1", "s"),
        ];
        assert_eq!(
            as_text(&ports, Some(&rig())),
            "keyboard or synth  Midi Through Port-0   (a loop of the system; * leaves it alone)\n\
             keyboard           Wharf Keys MIDI 1\n\
             \n\
             With this stage file:\n\
             \x20 keyboard keys would be connected to Wharf Keys MIDI 1\n\
             \x20 organ waits for *Organ*\n"
        );
        let json = as_json(&ports, Some(&rig()));
        assert_eq!(json["ports"][1]["name"], "Wharf Keys MIDI 1");
        assert_eq!(
            json["keyboards"][0]["would_take"],
            json!(["Wharf Keys MIDI 1"])
        );
        assert_eq!(json["synths"][0]["would_take"], Value::Null);
    }
}
