//! Sequences that set registered parameters. Each ends with the null parameter, so that a stray data entry later can
//! change nothing (GM2 3.4.5).

use super::{controller, status};

/// Bytes of [`bend_range`] and [`registered`].
pub const PARAMETER_BYTES: usize = 18;

/// RPN 0, pitch bend sensitivity: whole semitones, no cents (MIDI 1.0, p. 18).
pub fn bend_range(channel: u8, semitones: u8) -> [u8; PARAMETER_BYTES] {
    registered(channel, [0, 0], [semitones, 0])
}

/// RPN 6, MPE configuration: `members` channels in the zone of this manager; 0 turns it off (MPE 1.1, 2.2.1).
pub fn zone(manager: u8, members: u8) -> [u8; PARAMETER_BYTES] {
    registered(manager, [0, 6], [members, 0])
}

/// Any registered parameter, most significant bytes first.
pub fn registered(channel: u8, parameter: [u8; 2], data: [u8; 2]) -> [u8; PARAMETER_BYTES] {
    sequence(
        channel,
        [controller::RPN_MSB, controller::RPN_LSB],
        parameter,
        data,
    )
}

/// Any non-registered parameter, most significant bytes first.
pub fn non_registered(channel: u8, parameter: [u8; 2], data: [u8; 2]) -> [u8; PARAMETER_BYTES] {
    sequence(
        channel,
        [controller::NRPN_MSB, controller::NRPN_LSB],
        parameter,
        data,
    )
}

fn sequence(
    channel: u8,
    select: [u8; 2],
    parameter: [u8; 2],
    data: [u8; 2],
) -> [u8; PARAMETER_BYTES] {
    let s = status::CONTROLLER | channel;
    [
        s,
        select[0],
        parameter[0],
        s,
        select[1],
        parameter[1],
        s,
        controller::DATA_MSB,
        data[0],
        s,
        controller::DATA_LSB,
        data[1],
        s,
        controller::RPN_MSB,
        0x7F,
        s,
        controller::RPN_LSB,
        0x7F,
    ]
}
