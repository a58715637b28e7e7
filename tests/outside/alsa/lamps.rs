//! A controller with lights, pulled out and put back: what alsa_lamps.sh did in the guest.

use super::guest::Guest;
use crate::support::receiver::Stream;
use std::path::Path;

const LAMPS: &str = r#"
stage: Lamps
keyboards:
  keys: {port: "VirMIDI ?-0"}
synths:
  organ: {port: virtual}
cues:
  - {when: {note: D2}, do: plain, while: held}
lamps:
  - {show: plain, send: {note: E2, to: keys}}
  - {show: song 1, send: {controller: 20, to: keys, value: 5}}
set:
  - {song: Lantern hymn, tuning: quarter-comma-meantone}
"#;

pub fn write(folder: &Path) {
    std::fs::write(folder.join("lamps.yaml"), LAMPS).unwrap();
}

pub fn judge(guest: &Guest) {
    let told = |file: &str| Stream::default().cut(&guest.bytes(file));
    let log = guest.text("lamps.log");
    let at_first = [vec![0x80, 40, 0], vec![0xB0, 20, 5]];
    let mut before = at_first.to_vec();
    before.push(vec![0x90, 40, 127]);
    assert_eq!(told("lamps.before"), before, "{log}");
    // The button came up with the cable; all is told anew, and at the end what is lit goes out.
    let mut after = at_first.to_vec();
    after.push(vec![0xB0, 20, 0]);
    assert_eq!(told("lamps.after"), after, "{log}");
    assert_eq!(guest.text("lamps.exit").trim(), "0", "{log}");
}
