//! From the devices of a stage file to the ports they want, and back to words for players.

use super::status::{Device, Waits};
use crate::limits::{KEYBOARDS_MAX, SYNTHS_MAX};
use crate::ports::hotplug::Renewed;
use crate::ports::names::{Address, Choice, Port, Wanted, Wish};
use crate::stage::{self, Stage};

/// The keyboards and synths of a stage file, as ports know them.
#[derive(Clone, Debug)]
pub struct RigWanted {
    pub keyboards: Vec<Wanted>,
    /// All that we send to: synths, then the way back to each keyboard that has lamps.
    pub synths: Vec<Wanted>,
    /// How many of them are no synths.
    pub lamps: usize,
}

impl RigWanted {
    pub fn of(stage: &Stage) -> RigWanted {
        RigWanted {
            keyboards: stage.keyboards.iter().map(wanted).collect(),
            synths: (stage.synths.iter().map(wanted))
                .chain(
                    stage
                        .keyboards_with_lamps()
                        .map(|place| lamps(stage, place)),
                )
                .collect(),
            lamps: stage.keyboards_with_lamps().count(),
        }
    }

    pub fn synths_alone(&self) -> &[Wanted] {
        &self.synths[..self.synths.len() - self.lamps]
    }

    /// How every device stands, for status: keyboards, then synths.
    pub fn devices(&self, choice: &Choice, ports: &[Port]) -> (Vec<Device>, Vec<Device>) {
        let keyboards = self.keyboards.iter().enumerate().map(|(index, wanted)| {
            let connected = choice.keyboards.get(index).map_or(&[][..], Vec::as_slice);
            device(wanted, connected, ports)
        });
        let synths = self.synths_alone().iter().enumerate();
        let synths = synths.map(|(index, wanted)| {
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

/// What becomes of the devices of one rig in the next.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Moved {
    pub keyboards: Moves,
    pub synths: Moves,
}

#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Moves {
    /// For each device of the new rig its place in the old one, if it was there and wanted the same port.
    pub from: Vec<Option<usize>>,
    /// Places of the old rig where the new one has another device, or one that wants another port.
    pub gone: Places,
    /// For each device of the new rig its place in the old one by name, whatever port it wanted.
    pub by_name: Vec<Option<usize>>,
    /// Not the same names in the same order.
    renamed: bool,
}

/// Some places of a rig.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Places(u8);

const _: () = assert!(KEYBOARDS_MAX <= 8 && SYNTHS_MAX <= 8);

impl Places {
    pub fn add(&mut self, place: usize) {
        self.0 |= 1 << place;
    }

    pub fn has(self, place: usize) -> bool {
        self.0 >> place & 1 == 1
    }

    pub fn is_empty(self) -> bool {
        self.0 == 0
    }
}

impl Moved {
    pub fn between(old: &RigWanted, new: &RigWanted) -> Moved {
        Moved {
            keyboards: Moves::between(&old.keyboards, &new.keyboards),
            synths: Moves::between(&old.synths, &new.synths),
        }
    }

    /// Our own ports, which bear the names of the devices, are no longer right.
    pub fn renamed(&self) -> bool {
        self.keyboards.renamed || self.synths.renamed
    }

    /// Nothing has to be connected otherwise than it is.
    pub fn is_nothing(&self) -> bool {
        !self.renamed() && self.keyboards.gone.is_empty() && self.synths.gone.is_empty()
    }
}

impl Moves {
    /// Whether the device of this place in the old rig is in the new one and wants the same port.
    pub fn stays(&self, place: usize) -> bool {
        self.from.contains(&Some(place))
    }

    /// The devices of the new rig, as ports are to know them.
    pub fn renewed(&self, rig: &[Wanted]) -> Vec<Renewed> {
        let by_name = self.by_name.iter().copied().enumerate();
        let renewed = rig
            .iter()
            .zip(by_name)
            .map(|(wanted, (place, from))| Renewed {
                name: wanted.name.clone(),
                from,
                same: from == Some(place) && !self.gone.has(place),
            });
        renewed.collect()
    }

    fn between(old: &[Wanted], new: &[Wanted]) -> Moves {
        let from = |wanted: &Wanted| old.iter().position(|known| known == wanted);
        let mut gone = Places::default();
        for (place, known) in old.iter().enumerate() {
            if new.get(place) != Some(known) {
                gone.add(place);
            }
        }
        let names = |rig: &[Wanted]| rig.iter().map(|wanted| wanted.name.clone()).collect();
        let (before, after): (Vec<String>, Vec<String>) = (names(old), names(new));
        let by_name = |wanted: &Wanted| old.iter().position(|known| known.name == wanted.name);
        Moves {
            from: new.iter().map(from).collect(),
            by_name: new.iter().map(by_name).collect(),
            gone,
            renamed: before != after,
        }
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

/// The way back to a keyboard. Its name is that of a port, so no other port of ours may have it.
fn lamps(stage: &Stage, place: usize) -> Wanted {
    let keyboard = &stage.keyboards[place];
    let mut name = format!("{} lamps", keyboard.name);
    let taken = |name: &str| {
        let mut all = stage.keyboards.iter().chain(&stage.synths);
        all.any(|device| device.name == name)
    };
    while taken(&name) {
        name.push_str(" too");
    }
    Wanted {
        name,
        wish: match keyboard.port {
            stage::Wish::Virtual => Wish::Virtual,
            _ => Wish::BackTo(place),
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
            Wish::BackTo(_) => Waits::For("a device that hears".to_string()),
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
        Wish::BackTo(_) => format!("{name} waits for a device that hears"),
        Wish::Named { globs, socket } => {
            format!("{name} waits for {}", named(globs, socket.as_deref()))
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_becomes_of_devices() {
        let wanted = |name: &str, wish| Wanted {
            name: name.to_string(),
            wish,
        };
        let rig = |synths: &[(&str, Wish)]| RigWanted {
            keyboards: vec![wanted("keys", Wish::Any)],
            synths: synths.iter().map(|(n, w)| wanted(n, w.clone())).collect(),
            lamps: 0,
        };
        let old = rig(&[("organ", Wish::Any), ("bells", Wish::Virtual)]);
        assert!(Moved::between(&old, &old).is_nothing());

        let other_port = rig(&[("organ", Wish::Any), ("bells", Wish::Any)]);
        let moved = Moved::between(&old, &other_port);
        assert!(!moved.renamed() && !moved.is_nothing() && moved.keyboards.gone.is_empty());
        assert_eq!(moved.synths.from, [Some(0), None]);
        assert_eq!(
            [0, 1].map(|place| moved.synths.gone.has(place)),
            [false, true]
        );

        let turned = rig(&[("bells", Wish::Virtual), ("organ", Wish::Any)]);
        let moved = Moved::between(&old, &turned);
        assert!(moved.renamed());
        assert_eq!(moved.synths.from, [Some(1), Some(0)]);
        assert_eq!(
            [0, 1].map(|place| moved.synths.gone.has(place)),
            [true, true]
        );

        let more = rig(&[
            ("organ", Wish::Any),
            ("bells", Wish::Virtual),
            ("flute", Wish::Any),
        ]);
        let moved = Moved::between(&old, &more);
        assert!(moved.renamed() && moved.synths.gone.is_empty());
        let same = |renewed: &Renewed| (renewed.from, renewed.same);
        let renewed: Vec<_> = moved
            .synths
            .renewed(&more.synths)
            .iter()
            .map(same)
            .collect();
        assert_eq!(renewed, [(Some(0), true), (Some(1), true), (None, false)]);
        assert_eq!(moved.synths.from, [Some(0), Some(1), None]);
    }

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
            lamps: 0,
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

    #[test]
    fn a_keyboard_with_lamps_has_a_way_back_behind_the_synths() {
        let text = "keyboards: {keys: {}, pads: {port: virtual}, 'keys lamps': {port: virtual}}\n\
                    synths: {organ: {}, bells: {}}\nset: [{song: One}]\n\
                    lamps:\n\
                    \x20 - {show: plain, send: {note: E2, to: pads}}\n\
                    \x20 - {show: plain, send: {note: E2, to: keys}}\n\
                    \x20 - {show: song One, send: {note: F2, to: pads}}\n";
        let stage = Stage::parse(std::path::Path::new("lamps.yaml"), text).expect("it loads");
        let rig = RigWanted::of(&stage);
        let outs: Vec<_> = (rig.synths.iter())
            .map(|wanted| (wanted.name.as_str(), wanted.wish.clone()))
            .collect();
        assert_eq!(
            outs,
            [
                ("organ", Wish::Any),
                ("bells", Wish::Any),
                ("pads lamps", Wish::Virtual),
                ("keys lamps too", Wish::BackTo(0)),
            ]
        );
        let (_, synths) = rig.devices(&Choice::default(), &[]);
        assert_eq!(synths.len(), 2);
        assert_eq!(stage.plan().ports(), 4);
    }
}
