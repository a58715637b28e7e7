//! From the devices of a stage file to the ports they want, and back to words for players.

use crate::ports::names::{Address, Choice, Port, Wanted, Wish};
use crate::stage::{self, Device, Stage};

/// The keyboards and synths of a stage file, as ports know them.
#[derive(Clone, Debug)]
pub struct RigWanted {
    pub keyboards: Vec<Wanted>,
    pub synths: Vec<Wanted>,
}

impl RigWanted {
    pub fn of(stage: &Stage) -> RigWanted {
        RigWanted {
            keyboards: stage.keyboards.iter().map(wanted).collect(),
            synths: stage.synths.iter().map(wanted).collect(),
        }
    }

    /// One clause for each device: what it `is` (or `would be`) connected to, or what it waits for.
    pub fn describe(&self, is: &str, choice: &Choice, ports: &[Port]) -> Vec<String> {
        let keyboards = self.keyboards.iter().enumerate().map(|(index, wanted)| {
            let connected = choice.keyboards.get(index).map_or(&[][..], Vec::as_slice);
            format!("keyboard {}", describe(wanted, is, connected, ports))
        });
        let synths = self.synths.iter().enumerate().map(|(index, wanted)| {
            let connected = choice.synths.get(index).copied().flatten();
            describe(wanted, is, connected.as_slice(), ports)
        });
        keyboards.chain(synths).collect()
    }
}

fn wanted(device: &Device) -> Wanted {
    Wanted {
        name: device.name.clone(),
        wish: match &device.port {
            stage::Wish::Any => Wish::Any,
            stage::Wish::Virtual => Wish::Virtual,
            stage::Wish::Named { globs, socket } => Wish::Named {
                globs: globs.clone(),
                socket: socket.clone(),
            },
        },
    }
}

fn describe(wanted: &Wanted, is: &str, connected: &[Address], ports: &[Port]) -> String {
    let name = &wanted.name;
    let names: Vec<String> = ports
        .iter()
        .filter(|port| connected.contains(&port.address))
        .map(Port::full_name)
        .collect();
    if !names.is_empty() {
        return format!("{name} {is} connected to {}", names.join(" and "));
    }
    match &wanted.wish {
        Wish::Virtual => format!("{name} is a port for others to connect to"),
        Wish::Any => format!("{name} waits for any port"),
        Wish::Named { globs, socket } => {
            let place = socket
                .as_ref()
                .map_or(String::new(), |socket| format!(" at socket {socket}"));
            format!("{name} waits for {}{place}", globs.join(" or "))
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_rig_in_words() {
        let wanted = |name: &str, wish| Wanted {
            name: name.to_string(),
            wish,
        };
        let rig = RigWanted {
            keyboards: vec![
                wanted(
                    "keys",
                    Wish::Named {
                        globs: vec!["*Keys*".to_string(), "*Rental*".to_string()],
                        socket: None,
                    },
                ),
                wanted("pads", Wish::Virtual),
            ],
            synths: vec![wanted("organ", Wish::Any)],
        };
        let address = Address {
            client: 20,
            port: 0,
        };
        let ports = [Port {
            address,
            device: "Loft Organ".to_string(),
            name: "Loft Organ MIDI 1".to_string(),
            aliases: Vec::new(),
            socket: None,
            sends: false,
            hears: true,
            ours: false,
        }];
        let choice = Choice {
            synths: vec![Some(address)],
            ..Choice::default()
        };
        assert_eq!(
            rig.describe("is", &choice, &ports).join("; "),
            "keyboard keys waits for *Keys* or *Rental*; \
             keyboard pads is a port for others to connect to; \
             organ is connected to Loft Organ MIDI 1"
        );
    }
}
