//! Which port a device of the stage file gets, by name.
//!
//! Numbers that the system deals out (client and port) change with every plugging and are never looked at.

/// Where a port is now. Changes with every plugging.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Address {
    pub client: i32,
    pub port: i32,
}

/// A port that is there.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Port {
    pub address: Address,
    pub device: String,
    pub name: String,
    /// Other names that it goes by.
    pub aliases: Vec<String>,
    /// USB place such as `1-1.3`, for what hangs on one.
    pub socket: Option<String>,
    /// Sends to us: may be a keyboard.
    pub sends: bool,
    /// Hears us: may be a synth.
    pub hears: bool,
    /// One of trued's own.
    pub ours: bool,
}

/// Which port a device wants.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Wish {
    Any,
    /// A port of our own; others come to it.
    Virtual,
    Named {
        globs: Vec<String>,
        socket: Option<String>,
    },
    /// The way back to the device that plays as the keyboard of this place.
    BackTo(usize),
}

impl Wish {
    /// Whether a port is one that may be had.
    fn fits(&self, port: &Port) -> bool {
        match self {
            Wish::Any => !port.ours,
            Wish::Virtual | Wish::BackTo(_) => false,
            Wish::Named { globs, socket } => globs.iter().any(|glob| port.fits(glob, socket)),
        }
    }
}

/// A device of the stage file and its wish.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Wanted {
    pub name: String,
    pub wish: Wish,
}

/// Who is connected to what: one entry for each keyboard and each synth, in the order of the stage file.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Choice {
    pub keyboards: Vec<Vec<Address>>,
    pub synths: Vec<Option<Address>>,
    /// What a player may want to know: a glob that fits several ports.
    pub remarks: Vec<String>,
}

impl Port {
    /// `Device: port`, or just one of them if they say the same.
    pub fn full_name(&self) -> String {
        let (device, name) = (self.device.trim(), self.name.trim());
        if device.is_empty() || name.starts_with(device) {
            name.to_string()
        } else if name.is_empty() || device.starts_with(name) {
            device.to_string()
        } else {
            format!("{device}: {name}")
        }
    }

    /// The system's own loop from all to all.
    pub fn is_through(&self) -> bool {
        let through = |name: &str| {
            name.to_lowercase()
                .replace('-', " ")
                .contains("midi through")
        };
        through(&self.device) || through(&self.name) || self.aliases.iter().any(|a| through(a))
    }

    fn fits(&self, glob: &str, socket: &Option<String>) -> bool {
        let places_agree = socket.is_none() || self.socket == *socket;
        let through = !self.is_through() || glob.to_lowercase().contains("through");
        let names = [&self.name, &self.device, &self.full_name()]
            .into_iter()
            .chain(&self.aliases)
            .any(|name| matches(glob, name) || matches(glob, without_numbers(name)));
        !self.ours && places_agree && through && names
    }
}

/// A glob with nothing but stars: it means "whatever is there" and not a device by name.
fn is_bare(glob: &str) -> bool {
    glob.chars().all(|c| c == '*' || c == '?')
}

/// Cuts off what counts twins and ports: `Keys MIDI 1` and `Keys 24:0` are `Keys MIDI` and `Keys`.
pub fn without_numbers(name: &str) -> &str {
    let cut = name.trim_end_matches(|c: char| c.is_ascii_digit() || matches!(c, ':' | '-' | ' '));
    if cut.is_empty() { name } else { cut }
}

/// Whether a glob fits a whole name, in any case: `*` is any run of letters, `?` any one.
pub fn matches(glob: &str, name: &str) -> bool {
    let glob: Vec<char> = glob.to_lowercase().chars().collect();
    let name: Vec<char> = name.to_lowercase().chars().collect();
    let (mut g, mut n) = (0, 0);
    // Where to go on if what follows the last star does not fit: behind the star, and one letter further on.
    let mut star: Option<(usize, usize)> = None;
    while n < name.len() {
        if g < glob.len() && glob[g] == '*' {
            star = Some((g + 1, n));
            g += 1;
        } else if g < glob.len() && (glob[g] == '?' || glob[g] == name[n]) {
            g += 1;
            n += 1;
        } else if let Some((after, from)) = star {
            star = Some((after, from + 1));
            g = after;
            n = from + 1;
        } else {
            return false;
        }
    }
    glob[g..].iter().all(|c| *c == '*')
}

/// Gives every device its port. What a device has already, it keeps while the port is there; so a better port that
/// comes later takes nothing away from a player.
pub fn choose(ports: &[Port], keyboards: &[Wanted], synths: &[Wanted], held: &Choice) -> Choice {
    let mut choice = Choice {
        keyboards: vec![Vec::new(); keyboards.len()],
        synths: vec![None; synths.len()],
        remarks: Vec::new(),
    };
    // Numbers are dealt out anew: where a port was, another may stand now.
    let still_fits = |wanted: &Wanted, address: Address| {
        let port = ports.iter().find(|port| port.address == address);
        port.is_some_and(|port| wanted.wish.fits(port))
    };
    for (index, wanted) in synths.iter().enumerate() {
        let held = held.synths.get(index).copied().flatten();
        choice.synths[index] = held.filter(|address| still_fits(wanted, *address));
    }
    // Those that say a name choose first.
    for (index, wanted) in synths.iter().enumerate() {
        if choice.synths[index].is_none() {
            choice.synths[index] = named_synth(ports, wanted, &mut choice.remarks);
        }
    }
    for (index, wanted) in synths.iter().enumerate() {
        if choice.synths[index].is_none() && wanted.wish == Wish::Any {
            choice.synths[index] = any_synth(ports, &choice.synths);
        }
    }
    for (index, wanted) in keyboards.iter().enumerate() {
        let held: Vec<Address> = held.keyboards.get(index).cloned().unwrap_or_default();
        let kept = held.into_iter().find(|a| still_fits(wanted, *a));
        choice.keyboards[index] = match (&wanted.wish, kept) {
            (Wish::Virtual | Wish::BackTo(_), _) => Vec::new(),
            (Wish::Any, _) => ports
                .iter()
                .filter(|port| port.sends && is_free(port, &choice.synths))
                .map(|port| port.address)
                .collect(),
            (Wish::Named { .. }, Some(kept)) => vec![kept],
            (Wish::Named { .. }, None) => {
                let Choice {
                    synths, remarks, ..
                } = &mut choice;
                let port = first_named(ports, wanted, remarks, |port, glob| {
                    port.sends && (!is_bare(glob) || is_free(port, synths))
                });
                port.into_iter().collect()
            }
        };
    }
    refuse_loops(ports, keyboards, &mut choice);
    for (index, wanted) in synths.iter().enumerate() {
        if let Wish::BackTo(keyboard) = wanted.wish {
            let taken = choice.keyboards.get(keyboard).into_iter().flatten();
            let wish = keyboards.get(keyboard).map(|keyboard| &keyboard.wish);
            let back = taken.zip(wish.into_iter().cycle());
            let mut back = back.filter_map(|(from, wish)| way_back(ports, *from, wish));
            choice.synths[index] = back.next();
        }
    }
    choice
}

/// The port by which a keyboard's device hears: the one that it sends by, where ports go both ways; else the one of the
/// same name but for `playback` in place of `capture`, as JACK has them; else the one that fits the keyboard's globs, of
/// several that one which stands among them where the keyboard's own port stands among those that send.
fn way_back(ports: &[Port], from: Address, wish: &Wish) -> Option<Address> {
    let port = ports.iter().find(|port| port.address == from)?;
    if port.hears {
        return Some(from);
    }
    let hearing = || ports.iter().filter(|port| port.hears && !port.ours);
    let turned = |port: &Port| port.full_name().replace("capture", "playback");
    let mut others = hearing();
    if let Some(back) =
        others.find(|other| port.full_name() != turned(port) && other.full_name() == turned(port))
    {
        return Some(back.address);
    }
    if !matches!(wish, Wish::Named { .. }) {
        return None;
    }
    let sending = ports.iter().filter(|port| port.sends && wish.fits(port));
    let place = sending.map(|port| port.address).position(|a| a == from)?;
    let back = hearing().filter(|port| wish.fits(port)).nth(place);
    back.map(|port| port.address)
}

/// Midi Through as keyboard and as synth would play trued's notes back to it for ever.
fn refuse_loops(ports: &[Port], keyboards: &[Wanted], choice: &mut Choice) {
    let is_through = |address: &Address| {
        let port = ports.iter().find(|port| port.address == *address);
        port.is_some_and(Port::is_through)
    };
    if !choice.synths.iter().flatten().any(is_through) {
        return;
    }
    for (taken, wanted) in choice.keyboards.iter_mut().zip(keyboards) {
        let before = taken.len();
        taken.retain(|address| !is_through(address));
        if taken.len() < before {
            choice.remarks.push(format!(
                "keyboard {} is not connected to Midi Through, which a synth uses: every note would come back and go \
                 round for ever; give one of them another port",
                wanted.name
            ));
        }
    }
}

/// Neither ours, nor a through port, nor used as a synth.
fn is_free(port: &Port, synths: &[Option<Address>]) -> bool {
    !port.ours && !port.is_through() && !synths.contains(&Some(port.address))
}

fn named_synth(ports: &[Port], wanted: &Wanted, remarks: &mut Vec<String>) -> Option<Address> {
    first_named(ports, wanted, remarks, |port, _| port.hears)
}

/// The first output port; one that cannot be a keyboard comes before one that can, so that a keyboard with a socket
/// both ways stays a keyboard.
fn any_synth(ports: &[Port], taken: &[Option<Address>]) -> Option<Address> {
    ports
        .iter()
        .filter(|port| port.hears && is_free(port, taken))
        .min_by_key(|port| port.sends)
        .map(|port| port.address)
}

/// The first port that fits the first glob that any port fits.
fn first_named(
    ports: &[Port],
    wanted: &Wanted,
    remarks: &mut Vec<String>,
    may: impl Fn(&Port, &str) -> bool,
) -> Option<Address> {
    let Wish::Named { globs, socket } = &wanted.wish else {
        return None;
    };
    globs.iter().find_map(|glob| {
        let mut fitting = ports
            .iter()
            .filter(|port| may(port, glob) && port.fits(glob, socket));
        let first = fitting.next()?;
        let others: Vec<String> = fitting
            .map(|port| format!("\"{}\"", port.full_name()))
            .collect();
        if !others.is_empty() {
            remarks.push(format!(
                "{glob} for {} fits several ports: \"{}\" is taken, not {}",
                wanted.name,
                first.full_name(),
                others.join(" or ")
            ));
        }
        Some(first.address)
    })
}

#[cfg(test)]
mod tests;
