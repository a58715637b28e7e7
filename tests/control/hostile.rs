//! Clients that mean no good, or are merely broken. The desk goes on looking up, and an honest `tell` gets through.

use super::stand::{Folder, Stand, patiently, trued};
use std::io::{ErrorKind, Read, Write};
use std::os::unix::net::UnixStream;
use std::time::{Duration, Instant};

fn call(stand: &Stand) -> UnixStream {
    UnixStream::connect(stand.socket()).expect("the daemon listens")
}

/// An honest player gets an answer while whatever it is goes on.
fn tell_gets_through(folder: &Folder, stand: &Stand) {
    let before = stand.looks();
    let began = Instant::now();
    let (code, out, err) = trued(folder, &["tell", "--socket", &stand.socket(), "song 1"]);
    assert_eq!(
        (code, out.as_str()),
        (0, "song 1 of 3: Lantern hymn\n"),
        "{err} after {:?}",
        began.elapsed()
    );
    patiently("the desk to look up", || stand.looks() > before);
}

#[test]
fn garbage_and_endless_lines_are_told_so_and_hung_up_on() {
    let folder = Folder::new("garbage");
    let stand = Stand::begin(&folder.at("trued.sock"));
    let mut client = call(&stand);
    client
        .write_all(b"GET / HTTP/1.1\r\n\x00\xff\xfe\n\nstatus xml\ntell\ntell \xf0\x28\nstatus\n")
        .unwrap();
    client.shutdown(std::net::Shutdown::Write).unwrap();
    let mut answers = Vec::new();
    client.read_to_end(&mut answers).unwrap();
    let answers = String::from_utf8_lossy(&answers).into_owned();
    let codes: Vec<&str> = answers
        .split("\n\n")
        .filter_map(|answer| answer.split(' ').next())
        .filter(|code| !code.is_empty())
        .collect();
    assert_eq!(
        codes,
        ["64", "64", "64", "64", "64", "64", "0"],
        "{answers}"
    );

    // A line without an end: either an answer and a hang-up, or a hang-up while it is still being sent.
    let mut client = call(&stand);
    client
        .set_write_timeout(Some(Duration::from_secs(60)))
        .unwrap();
    let sent = client.write_all(&vec![b'x'; 8 << 20]);
    assert!(sent.is_err(), "eight megabytes were swallowed");
    tell_gets_through(&folder, &stand);
}

#[test]
fn two_hundred_connections_that_say_nothing() {
    let folder = Folder::new("crowd");
    let stand = Stand::begin(&folder.at("trued.sock"));
    let mut crowd: Vec<UnixStream> = (0..200).map(|_| call(&stand)).collect();
    tell_gets_through(&folder, &stand);
    for (index, client) in crowd.iter_mut().enumerate() {
        // Half a line from some, follow from others; most have been hung up on.
        let _ = client.write_all(if index % 2 == 0 {
            b"tell ne"
        } else {
            b"follow\n"
        });
    }
    tell_gets_through(&folder, &stand);
    let hung_up = |client: &mut UnixStream| {
        client.set_nonblocking(true).unwrap();
        let mut buffer = [0; 65_536];
        loop {
            match client.read(&mut buffer) {
                Ok(0) => return true,
                Ok(_) => {}
                Err(error) => return error.kind() != ErrorKind::WouldBlock,
            }
        }
    };
    let left = crowd
        .iter_mut()
        .filter_map(|c| (!hung_up(c)).then_some(()))
        .count();
    assert!(left <= trued::daemon::socket::CLIENTS, "{left} are kept");
}

#[test]
fn who_asks_and_never_reads_loses_the_line() {
    let folder = Folder::new("deaf");
    let stand = Stand::begin(&folder.at("trued.sock"));
    let mut deaf = call(&stand);
    deaf.set_nonblocking(true).unwrap();
    let ask = "status\n".repeat(100);
    patiently("the line to be cut", || match deaf.write(ask.as_bytes()) {
        Ok(_) => false,
        Err(error) => error.kind() != ErrorKind::WouldBlock,
    });
    tell_gets_through(&folder, &stand);
}

#[test]
fn a_score_thread_that_hangs_is_reported_and_holds_nobody() {
    let folder = Folder::new("hang");
    let stand = Stand::begin(&folder.at("trued.sock"));
    stand.hang(true);
    let (code, _, err) = trued(&folder, &["tell", "--socket", &stand.socket(), "next"]);
    assert_eq!(
        (code, err.as_str()),
        (69, "the score thread does not answer\n")
    );
    let (code, out, _) = trued(&folder, &["status", "--socket", &stand.socket()]);
    assert_eq!(code, 0);
    assert!(out.contains("Now song 1 of 3"), "{out}");
    stand.hang(false);
    tell_gets_through(&folder, &stand);
}
