//! The desk's view of the sequencer: what is there, and connecting it. Through a client of its own without ports,
//! because the score thread's may not be shared.

use super::{address, broken, open_sequencer, text};
use crate::ports::hotplug::THROUGH;
use crate::ports::names::{Address, Port};
use crate::ports::{Broken, Patchbay};
use alsa::Seq;
use alsa::seq::{
    ClientInfo, ClientIter, PortCap, PortInfo, PortIter, PortSubscribe, PortSubscribeIter,
    QuerySubsType,
};
use std::path::{Path, PathBuf};

/// A look at all ports of the machine.
#[derive(Debug)]
pub struct Desk {
    seq: Seq,
    /// Clients of this name are trued's as well: another one that runs.
    family: String,
    ours: Vec<i32>,
}

impl Desk {
    /// # Errors
    /// There is no sequencer, or it may not be used.
    pub fn open(family: &str) -> Result<Desk, Broken> {
        let seq = open_sequencer()?;
        seq.set_client_name(&text(&format!("{family} desk")))
            .map_err(broken)?;
        let own = seq.client_id().map_err(broken)?;
        Ok(Desk {
            seq,
            family: family.to_string(),
            ours: vec![own],
        })
    }

    /// Counts a client's ports as ours from now on.
    pub fn add_ours(&mut self, client: i32) {
        self.ours.push(client);
    }

    fn port(&self, client: &ClientInfo, port: &PortInfo) -> Option<Port> {
        let can = port.get_capability();
        if can.contains(PortCap::NO_EXPORT) {
            return None;
        }
        let sends = can.contains(PortCap::READ | PortCap::SUBS_READ);
        let hears = can.contains(PortCap::WRITE | PortCap::SUBS_WRITE);
        let device = client.get_name().unwrap_or_default().to_string();
        (sends || hears).then(|| Port {
            address: Address {
                client: port.get_client(),
                port: port.get_port(),
            },
            name: port.get_name().unwrap_or_default().to_string(),
            socket: client.get_card().ok().and_then(socket),
            aliases: Vec::new(),
            sends,
            hears,
            ours: device == self.family || self.ours.contains(&port.get_client()),
            device,
        })
    }
}

impl Patchbay for Desk {
    /// By client and port number; those of the system itself left out.
    fn ports(&self) -> Vec<Port> {
        ClientIter::new(&self.seq)
            .filter(|client| client.get_client() != alsa::seq::Addr::system_timer().client)
            .flat_map(|client| {
                PortIter::new(&self.seq, client.get_client())
                    .filter_map(|port| self.port(&client, &port))
                    .collect::<Vec<Port>>()
            })
            .collect()
    }

    fn shown(&self, address: Address) -> String {
        format!("{}:{}", address.client, address.port)
    }

    fn connect(&self, from: Address, to: Address) -> Result<(), Broken> {
        let subscription = PortSubscribe::empty().map_err(broken)?;
        subscription.set_sender(super::addr(from));
        subscription.set_dest(super::addr(to));
        match self.seq.subscribe_port(&subscription) {
            Err(error) if error.errno() != libc::EBUSY => Err(broken(error)),
            _ => Ok(()),
        }
    }

    fn disconnect(&self, from: Address, to: Address) -> Result<(), Broken> {
        match (self.seq).unsubscribe_port(super::addr(from), super::addr(to)) {
            Err(error) if error.errno() != libc::ENOENT => Err(broken(error)),
            _ => Ok(()),
        }
    }

    fn cut_loops(&self, keyboard: Address, synths: &[Address]) -> Vec<Address> {
        let own = |address: Address| self.ours.contains(&address.client);
        let fed = synths.iter().any(|synth| {
            PortSubscribeIter::new(&self.seq, super::addr(*synth), QuerySubsType::READ)
                .any(|found| found.get_dest().client == THROUGH)
        });
        let senders =
            PortSubscribeIter::new(&self.seq, super::addr(keyboard), QuerySubsType::WRITE);
        let mut cut: Vec<Address> = senders.map(|found| address(found.get_sender())).collect();
        cut.retain(|sender| own(*sender) || fed && sender.client == THROUGH);
        cut.retain(|sender| {
            let undone = (self.seq).unsubscribe_port(super::addr(*sender), super::addr(keyboard));
            undone.is_ok()
        });
        cut
    }
}

/// The USB place of a sound card.
fn socket(card: i32) -> Option<String> {
    if card < 0 {
        return None;
    }
    let link = PathBuf::from(format!("/sys/class/sound/card{card}/device"));
    usb_place(&std::fs::canonicalize(link).ok()?)
}

/// The innermost part of a device's path that is a USB place: `1-1.3` in `…/usb1/1-1/1-1.3/1-1.3:1.0`.
fn usb_place(path: &Path) -> Option<String> {
    path.iter()
        .rev()
        .filter_map(|part| part.to_str())
        .find(|part| {
            let Some((bus, way)) = part.split_once('-') else {
                return false;
            };
            let number = |text: &str| !text.is_empty() && text.bytes().all(|b| b.is_ascii_digit());
            number(bus) && way.split('.').all(number)
        })
        .map(str::to_string)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn usb_places_by_the_path_of_the_device() {
        let place = |path: &str| usb_place(Path::new(path));
        assert_eq!(
            place("/sys/devices/pci0000:00/0000:00:14.0/usb1/1-1/1-1.3/1-1.3:1.0"),
            Some("1-1.3".to_string())
        );
        assert_eq!(
            place("/sys/devices/pci0000:00/0000:00:14.0/usb3/3-4/3-4:1.0"),
            Some("3-4".to_string())
        );
        assert_eq!(place("/sys/devices/platform/snd_virmidi.0"), None);
    }
}
