//! A supervisor in systemd's place: a datagram socket that hears what sd_notify(3) says it should.

use super::stand::{Folder, Stand, patiently};
use std::os::linux::net::SocketAddrExt;
use std::os::unix::net::{SocketAddr, UnixDatagram};
use std::time::Duration;
use trued::daemon::systemd::Systemd;
use trued::time::Span;

pub struct Supervisor(UnixDatagram);

impl Supervisor {
    pub fn at(path: &std::path::Path) -> Supervisor {
        let socket = UnixDatagram::bind(path).unwrap();
        socket.set_nonblocking(true).unwrap();
        Supervisor(socket)
    }

    /// The next thing heard, if there is one.
    fn next(&self) -> Option<String> {
        let mut buffer = [0; 4_096];
        let count = self.0.recv(&mut buffer).ok()?;
        Some(String::from_utf8(buffer[..count].to_vec()).expect("UTF-8"))
    }

    /// Gives what was heard before it.
    pub fn waits_for(&self, wanted: &str) -> Vec<String> {
        let mut before = Vec::new();
        patiently(wanted, || {
            let mut heard = std::iter::from_fn(|| self.next());
            heard.any(|heard| {
                let is = heard == wanted;
                before.push(heard);
                is
            })
        });
        before.pop();
        before
    }

    /// The first that fits.
    pub fn waits_for_some(&self, what: &str, fits: impl Fn(&str) -> bool) -> String {
        let mut found = None;
        patiently(what, || {
            found = std::iter::from_fn(|| self.next()).find(|heard| fits(heard));
            found.is_some()
        });
        found.expect("it came")
    }

    /// What has been heard and not been asked for yet.
    pub fn everything(&self) -> Vec<String> {
        std::iter::from_fn(|| self.next()).collect()
    }

    fn pings(&self) -> usize {
        let heard = std::iter::from_fn(|| self.next());
        heard.filter(|heard| heard == "WATCHDOG=1").count()
    }
}

#[test]
fn ready_then_pings_while_the_score_thread_answers_then_stopping() {
    let folder = Folder::new("notify");
    let supervisor = Supervisor::at(&folder.at("notify"));
    let watchdog = Span::from_millis(1_000);
    let address = folder.at("notify").into_os_string();
    let systemd = Systemd::new(Some(address), Some(watchdog));
    let stand = Stand::supervised(&folder.at("trued.sock"), systemd);
    assert_eq!(
        supervisor.next().as_deref(),
        Some(
            "STATUS=song 1 of 3: Lantern hymn; 0 of 1 keyboards connected, 1 of 1 synths connected"
        )
    );
    assert_eq!(supervisor.next().as_deref(), Some("READY=1"));
    for _ in 0..3 {
        supervisor.waits_for("WATCHDOG=1");
    }

    // The desk goes on, but nobody plays.
    stand.hang(true);
    let settled = stand.looks() + 40; // two seconds: what had been answered before is told within half of one
    patiently("what was under way", || stand.looks() >= settled);
    supervisor.pings();
    let long = stand.looks() + 40;
    patiently("two spans of the watchdog", || stand.looks() >= long);
    assert_eq!(
        supervisor.pings(),
        0,
        "pinged for a score thread that hangs"
    );
    stand.hang(false);
    supervisor.waits_for("WATCHDOG=1");

    stand.stop();
    supervisor.waits_for("STOPPING=1");
    patiently("the end", || stand.has_ended());
}

#[test]
fn an_abstract_address_and_no_watchdog() {
    let name = format!("trued-test-{}", std::process::id());
    let address = SocketAddr::from_abstract_name(&name).unwrap();
    let socket = UnixDatagram::bind_addr(&address).unwrap();
    socket
        .set_read_timeout(Some(Duration::from_secs(60)))
        .unwrap();
    let mut systemd = Systemd::new(Some(format!("@{name}").into()), None);
    systemd.ready();
    let mut buffer = [0; 100];
    let count = socket.recv(&mut buffer).unwrap();
    assert_eq!(&buffer[..count], b"READY=1");
    assert!(!systemd.ping(trued::time::Time::from_millis(5_000)));
}
