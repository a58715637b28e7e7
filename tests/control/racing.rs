//! Daemons of one name that start at one moment: one has the socket, and the others know.

use super::evening::Daemon;
use super::stand::{Folder, STAGE, patiently, trued};
use std::os::unix::net::{UnixListener, UnixStream};
use std::sync::{Arc, Barrier};
use trued::daemon::socket::{Socket, Unopened};

const STARTERS: usize = 8;
const ROUNDS: usize = 300;

#[test]
fn of_many_that_open_one_socket_at_once_one_has_it() {
    let folder = Folder::new("race");
    let path = folder.at("trued.sock");
    for round in 0..ROUNDS {
        // As after SIGKILL: a socket that nobody listens at.
        if round % 2 == 0 {
            drop(UnixListener::bind(&path).expect("bound"));
        }
        let at_once = Arc::new(Barrier::new(STARTERS));
        let starters: Vec<_> = (0..STARTERS)
            .map(|_| {
                let (path, at_once) = (path.clone(), at_once.clone());
                std::thread::spawn(move || {
                    at_once.wait();
                    Socket::open(&path)
                })
            })
            .collect();
        // Nothing is closed until all have tried.
        let opened: Vec<Result<Socket, Unopened>> = starters
            .into_iter()
            .map(|s| s.join().expect("no panic"))
            .collect();
        let have = opened.iter().filter(|opened| opened.is_ok()).count();
        let taken = |opened: &&Result<Socket, Unopened>| matches!(opened, Err(Unopened::Taken));
        let know = opened.iter().filter(taken).count();
        assert_eq!((have, know), (1, STARTERS - 1), "round {round}");
        assert!(
            UnixStream::connect(&path).is_ok(),
            "it can be called, round {round}"
        );
        drop(opened);
        assert!(!path.exists(), "the place is left clean");
    }
}

#[test]
fn of_many_daemons_that_start_at_once_one_plays() {
    let folder = Folder::new("race-run");
    std::fs::write(folder.at("stage.yaml"), STAGE).expect("written");
    let mut daemons: Vec<Daemon> = (0..6).map(|_| Daemon::start(&folder, &[])).collect();
    let mut codes = Vec::new();
    patiently("all but one to give up", || {
        codes.extend(daemons.iter_mut().filter_map(Daemon::newly_ended));
        codes.len() >= 5
    });
    assert_eq!(codes, [69; 5]);
    // It may still be opening its ports, and on a busy machine longer than `tell` waits.
    patiently("the one that is left to follow", || {
        trued(&folder, &["tell", "--socket", "trued.sock", "song 2"]).0 == 0
    });
}
