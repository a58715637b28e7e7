//! `trued ports --watch`: listens to every keyboard until Ctrl-C.

use super::choice;
use super::gestures::Gestures;
use super::starter::device_name;
use crate::daemon::rig::RigWanted;
use crate::limits::KEYBOARDS_MAX;
use crate::ports::alsa::{Alsa, desk::Desk};
use crate::ports::names::Port;
use crate::ports::{Backend, Broken, Cycle, Inbox, Next, Outlet, Patchbay, What};
use crate::time::Time;
use std::io::Write;

/// Prints each gesture; ends with Ctrl-C, or when the reader of stdout has gone.
pub fn watch(desk: Desk, ports: &[Port], rig: Option<&RigWanted>) -> Result<(), Broken> {
    let keyboards: Vec<&Port> = ports
        .iter()
        .filter(|port| port.sends && !port.ours && !port.is_through())
        .take(KEYBOARDS_MAX)
        .collect();
    if keyboards.is_empty() {
        return Err(Broken {
            wrong: "There is no keyboard to watch".to_string(),
            right: "plug one in and start again".to_string(),
        });
    }
    let names = names(&keyboards, ports, rig);
    let mut alsa = Alsa::open("trued watch", &names, &[])?;
    for (index, port) in keyboards.iter().enumerate() {
        desk.connect(port.address, alsa.keyboard_address(index))?;
        eprintln!("watching {} as {}", port.full_name(), names[index]);
    }
    eprintln!("press a pedal, a button or a key: each line can stand under cues:   (Ctrl-C ends)");
    let gestures = names.into_iter().map(Gestures::new).collect();
    alsa.run(&mut Watch { gestures })
}

/// What the stage file calls them, or else a name from the device.
fn names(keyboards: &[&Port], ports: &[Port], rig: Option<&RigWanted>) -> Vec<String> {
    let mut taken = Vec::new();
    let choice = rig.map(|rig| (rig, choice(ports, rig)));
    let by_file = |port: &Port| {
        let (rig, choice) = choice.as_ref()?;
        let is = |taken: &Vec<_>| taken.contains(&port.address);
        let index = choice.keyboards.iter().position(is)?;
        Some(rig.keyboards[index].name.clone())
    };
    keyboards
        .iter()
        .map(|port| by_file(port).unwrap_or_else(|| device_name(port, "keys", &mut taken)))
        .collect()
}

struct Watch {
    gestures: Vec<Gestures>,
}

impl Cycle for Watch {
    fn run(&mut self, _: Time, inbox: &mut Inbox, _: &mut Outlet<'_>) -> Next {
        for (_, what) in inbox.sorted() {
            let What::Midi { keyboard, bytes } = what else {
                continue;
            };
            let Some(gestures) = self.gestures.get_mut(keyboard) else {
                continue; // somebody has connected a second device to one of our ports
            };
            for line in gestures.lines(bytes) {
                // A reader that has gone has seen enough.
                let mut stdout = std::io::stdout().lock();
                if writeln!(stdout, "{line}")
                    .and_then(|()| stdout.flush())
                    .is_err()
                {
                    return Next::Leave;
                }
            }
        }
        Next::Wait(None)
    }
}
