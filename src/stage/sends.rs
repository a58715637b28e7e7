//! `send`: what a song says to the synths when it begins.

use super::complaint::Complaints;
use super::node::{At, Fields};
use super::rig::synth_named;
use super::songs::Desk;
use crate::engine::plan::SynthId;
use crate::limits::SYSEX_BYTES_MAX;
use crate::midi::{is_reset, status};

const FORMS: &str = "write {program: 20, to: organ}, {controller: 7, value: 100, to: organ} or {sysex: F0 7D 01 F7, to: organ}";

/// Whole messages, each with the synth it goes to.
pub fn read(at: &At<'_>, desk: &mut Desk<'_, '_>) -> Vec<(SynthId, Box<[u8]>)> {
    let programs_from = i64::from(desk.programs_from);
    let complaints = &mut desk.found.complaints;
    let mut sends = Vec::new();
    for item in at.items() {
        let wanted = "a map such as `{program: 20, to: organ}`";
        let Some(mut fields) = item.fields(wanted, complaints) else {
            continue;
        };
        let to = match fields.take("to") {
            Some(at) => synth_named(&at, desk.rig, complaints),
            None => SynthId::new(0),
        };
        let bytes = message(&mut fields, &item, programs_from, complaints);
        fields.finish(complaints);
        sends.extend(to.zip(bytes));
    }
    sends
}

/// One of `program`, `controller` with its `value`, and `sysex`.
fn message(
    fields: &mut Fields<'_>,
    item: &At<'_>,
    programs_from: i64,
    complaints: &mut Complaints,
) -> Option<Box<[u8]>> {
    let (program, controller) = (fields.take("program"), fields.take("controller"));
    let (value, sysex) = (fields.take("value"), fields.take("sysex"));
    let wrong = match (program, controller, value, sysex) {
        (Some(at), None, None, None) => {
            let range = programs_from..=127 + programs_from;
            let program = at.whole("a program", range, complaints)?;
            return Some(Box::new([status::PROGRAM, (program - programs_from) as u8]));
        }
        (None, Some(at), Some(value), None) => {
            let number = at.whole("a controller", 0..=119, complaints);
            let value = value.whole("its value", 0..=127, complaints);
            return Some(Box::new([status::CONTROLLER, number? as u8, value? as u8]));
        }
        (None, None, None, Some(at)) => return exclusive(&at, complaints),
        (None, Some(_), None, None) => "this controller has no value",
        (None, None, Some(_), None) => "this value belongs to no controller",
        (None, None, None, None) => "it is not clear what to send",
        _ => "one entry sends one message",
    };
    complaints.add(&item.trail, wrong, FORMS);
    None
}

/// A whole system exclusive message, in hexadecimal.
fn exclusive(at: &At<'_>, complaints: &mut Complaints) -> Option<Box<[u8]>> {
    let text = at.text("bytes such as F0 7D 01 F7", complaints)?;
    let byte = |word| {
        u8::from_str_radix(word, 16)
            .ok()
            .filter(|_| word.len() == 2)
    };
    let bytes: Option<Vec<u8>> = text.split_whitespace().map(byte).collect();
    let wrong = match bytes.as_deref() {
        None => format!("`{text}` is not written in bytes"),
        Some([0xF0, data @ .., 0xF7]) if data.iter().any(|byte| *byte > 0x7F) => {
            format!("`{text}` has a byte above 7F in its middle")
        }
        Some([0xF0, .., 0xF7]) if bytes.as_ref()?.len() > SYSEX_BYTES_MAX => {
            format!("this message is longer than {SYSEX_BYTES_MAX} bytes")
        }
        Some(whole @ [0xF0, .., 0xF7]) if is_reset(whole) => {
            let wrong =
                "this resets the synth, and it forgets its bend range and all else it was told";
            complaints.add(&at.trail, wrong, "leave it out");
            return None;
        }
        Some([0xF0, _, .., 0xF7]) => return bytes.map(Vec::into_boxed_slice),
        Some(_) => format!("`{text}` is not a whole system exclusive message"),
    };
    let right = "write each byte with two digits, from F0 to F7, as in F0 7D 01 F7";
    complaints.add(&at.trail, wrong, right);
    None
}
