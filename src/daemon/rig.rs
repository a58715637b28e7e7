//! From the devices of a stage file to the ports they want, and back to words for players.

use super::status::{Device, Waits};
use crate::ports::names::{Address, Choice, Port, Wanted, Wish};
use crate::stage::{self, Stage};

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

    /// How every device stands, for status: keyboards, then synths.
    pub fn devices(&self, choice: &Choice, ports: &[Port]) -> (Vec<Device>, Vec<Device>) {
        let keyboards = self.keyboards.iter().enumerate().map(|(index, wanted)| {
            let connected = choice.keyboards.get(index).map_or(&[][..], Vec::as_slice);
            device(wanted, connected, ports)
        });
        let synths = self.synths.iter().enumerate().map(|(index, wanted)| {
            let connected = choice.synths.get(index).copied().flatten();
            device(wanted, connected.as_slice(), ports)
        });
        (keyboards.collect(), synths.collect())
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

fn wanted(device: &stage::Device) -> Wanted {
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

fn device(wanted: &Wanted, connected: &[Address], ports: &[Port]) -> Device {
    Device {
        name: wanted.name.clone(),
        ports: names_of(connected, ports),
        waits: match &wanted.wish {
            Wish::Virtual => Waits::ForOthers,
            Wish::Any => Waits::For("any port".to_string()),
            Wish::Named { globs, socket } => Waits::For(named(globs, socket.as_deref())),
        },
        linked: false,
    }
}

fn names_of(connected: &[Address], ports: &[Port]) -> Vec<String> {
    let here = ports
        .iter()
        .filter(|port| connected.contains(&port.address));
    here.map(Port::full_name).collect()
}

fn named(globs: &[String], socket: Option<&str>) -> String {
    let place = socket.map_or(String::new(), |socket| format!(" at socket {socket}"));
    format!("{}{place}", globs.join(" or "))
}

fn describe(wanted: &Wanted, is: &str, connected: &[Address], ports: &[Port]) -> String {
    let name = &wanted.name;
    let names = names_of(connected, ports);
    if !names.is_empty() {
        return format!("{name} {is} connected to {}", names.join(" and "));
    }
    match &wanted.wish {
        Wish::Virtual => format!("{name} is a port for others to connect to"),
        Wish::Any => format!("{name} waits for any port"),
        Wish::Named { globs, socket } => {
            format!("{name} waits for {}", named(globs, socket.as_deref()))
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
