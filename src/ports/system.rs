//! The few things that the system only gives to unsafe code: a wait with a fine deadline, a bell to end it, priority,
//! a lock, the machine's count of microseconds, and who we are.

use super::Ring;
use crate::time::Span;
use libc::{POLLIN, c_int, pollfd};
use std::fs::File;
use std::io::{self, Read, Write};
use std::os::fd::{AsRawFd, FromRawFd, RawFd};
use std::sync::Arc;

/// Ends another thread's [`wait`] early. Any number of rings before it looks count as one.
#[derive(Clone, Debug)]
pub struct Bell(Arc<File>);

impl Bell {
    /// # Errors
    /// The system has no file descriptor left.
    pub fn new() -> io::Result<Bell> {
        // SAFETY: eventfd takes plain numbers and touches no memory of ours.
        let fd = unsafe { libc::eventfd(0, libc::EFD_NONBLOCK | libc::EFD_CLOEXEC) };
        if fd < 0 {
            return Err(io::Error::last_os_error());
        }
        // SAFETY: the descriptor was just made and belongs to nobody else, so the File may close it.
        Ok(Bell(Arc::new(unsafe { File::from_raw_fd(fd) })))
    }

    pub fn ring(&self) {
        // It can only fail if it has been rung 2^64 times unheard.
        let _ = (&*self.0).write(&1u64.to_ne_bytes());
    }

    /// Rings it, whoever has it.
    pub fn ringer(&self) -> Arc<dyn Fn() + Send + Sync> {
        let bell = self.clone();
        Arc::new(move || bell.ring())
    }

    /// Makes it silent again.
    pub fn hush(&self) {
        let _ = (&*self.0).read(&mut [0; 8]);
    }

    pub fn fd(&self) -> RawFd {
        self.0.as_raw_fd()
    }
}

impl Ring for Bell {
    fn ring(&self) {
        Bell::ring(self);
    }
}

/// Waits until one of the descriptors can be read, the time is over (`None`: for ever), or a signal comes.
///
/// # Errors
/// Whatever the system says, except interruption by a signal.
pub fn wait(descriptors: &mut [pollfd], at_most: Option<Span>) -> io::Result<()> {
    let timeout = at_most.map(|span| libc::timespec {
        tv_sec: (span.nanos() / 1_000_000_000) as libc::time_t,
        tv_nsec: (span.nanos() % 1_000_000_000) as libc::c_long,
    });
    let timeout = timeout
        .as_ref()
        .map_or(std::ptr::null(), std::ptr::from_ref);
    // SAFETY: the slice is ours for the whole call and its true length is given; `timeout` is null or points at a
    // timespec that lives to the end of this function; a null signal mask is allowed and changes none.
    let result = unsafe {
        libc::ppoll(
            descriptors.as_mut_ptr(),
            descriptors.len() as libc::nfds_t,
            timeout,
            std::ptr::null(),
        )
    };
    let error = io::Error::last_os_error();
    if result < 0 && error.kind() != io::ErrorKind::Interrupted {
        return Err(error);
    }
    Ok(())
}

/// A descriptor to be waited on.
pub fn readable(fd: RawFd) -> pollfd {
    pollfd {
        fd,
        events: POLLIN,
        revents: 0,
    }
}

/// Below the threaded sound interrupts (50 by default), above everything ordinary.
const PRIORITY: c_int = 45;

/// Lets the calling thread run before all ordinary ones; threads that it starts later are ordinary again.
///
/// # Errors
/// Not allowed for this user.
pub fn hurry() -> io::Result<()> {
    if is_hurried() {
        return Ok(()); // a unit file gave it, and may have forbidden us to ask
    }
    // SAFETY: all zero is a valid sched_param (plain numbers).
    let mut parameter: libc::sched_param = unsafe { std::mem::zeroed() };
    parameter.sched_priority = PRIORITY;
    // SAFETY: 0 means the calling thread; `parameter` lives through the call.
    let result = unsafe {
        libc::sched_setscheduler(0, libc::SCHED_FIFO | libc::SCHED_RESET_ON_FORK, &parameter)
    };
    if result < 0 {
        return Err(io::Error::last_os_error());
    }
    Ok(())
}

/// Whether the calling thread runs before all ordinary ones, by our doing or by that of whoever started us.
pub fn is_hurried() -> bool {
    // SAFETY: 0 means the calling thread; no memory is touched.
    let policy = unsafe { libc::sched_getscheduler(0) };
    policy >= 0 && policy & !libc::SCHED_RESET_ON_FORK != libc::SCHED_OTHER
}

/// Keeps everybody else who asks out of what this file or folder stands for, until it is closed. False: somebody is
/// inside.
///
/// # Errors
/// It cannot be locked at all.
pub fn lock(file: &File) -> io::Result<bool> {
    // SAFETY: the descriptor is open as long as `file` is borrowed; no memory is touched.
    if unsafe { libc::flock(file.as_raw_fd(), libc::LOCK_EX | libc::LOCK_NB) } == 0 {
        return Ok(true);
    }
    let error = io::Error::last_os_error();
    match error.kind() {
        io::ErrorKind::WouldBlock | io::ErrorKind::Interrupted => Ok(false),
        _ => Err(error),
    }
}

/// The machine's own count of microseconds, CLOCK_MONOTONIC, which other programs go by too.
pub(super) fn monotonic_micros() -> u64 {
    let mut time = libc::timespec {
        tv_sec: 0,
        tv_nsec: 0,
    };
    // SAFETY: `time` lives through the call. It cannot fail: the clock is always there.
    unsafe { libc::clock_gettime(libc::CLOCK_MONOTONIC, &mut time) };
    time.tv_sec as u64 * 1_000_000 + time.tv_nsec as u64 / 1_000
}

/// The number of the user we act for.
pub fn user() -> u32 {
    // SAFETY: takes nothing, touches no memory, cannot fail.
    unsafe { libc::geteuid() }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_bell_ends_a_wait_and_is_silent_after() {
        let bell = Bell::new().unwrap();
        let other = bell.clone();
        other.ring();
        other.ring();
        let mut fds = [readable(bell.fd())];
        wait(&mut fds, None).unwrap();
        assert_eq!(fds[0].revents, POLLIN);
        bell.hush();
        wait(&mut fds, Some(Span::from_nanos(1000))).unwrap();
        assert_eq!(fds[0].revents, 0);
    }
}
