//! Cuts bytes into messages, by the receiver's buffer rules of MIDI 1.0 (p. A-2). Written apart from trued's own.

/// Running status, real-time bytes inside others, system exclusive up to its end.
#[derive(Debug, Default)]
pub struct Stream {
    status: u8,
    data: Vec<u8>,
    /// Bytes that made no message: a sender must never cause any.
    pub stray_bytes: u64,
}

impl Stream {
    pub fn cut(&mut self, bytes: &[u8]) -> Vec<Vec<u8>> {
        bytes.iter().filter_map(|byte| self.push(*byte)).collect()
    }

    fn push(&mut self, byte: u8) -> Option<Vec<u8>> {
        if byte >= 0xF8 {
            return Some(vec![byte]);
        }
        if byte == 0xF7 && self.status == 0xF0 {
            let mut whole = std::mem::take(&mut self.data);
            whole.insert(0, 0xF0);
            whole.push(0xF7);
            self.status = 0;
            return Some(whole);
        }
        if byte >= 0x80 {
            self.stray_bytes += self.data.len() as u64;
            self.data.clear();
            self.status = byte;
        } else if self.status == 0 {
            self.stray_bytes += 1;
            return None;
        } else {
            self.data.push(byte);
        }
        self.finished()
    }

    fn finished(&mut self) -> Option<Vec<u8>> {
        let wanted = match self.status {
            0x80..=0xBF | 0xE0..=0xEF | 0xF2 => 2,
            0xC0..=0xDF | 0xF1 | 0xF3 => 1,
            0xF6 => 0,
            0xF0 => return None,
            _ => {
                self.stray_bytes += 1;
                self.status = 0;
                return None;
            }
        };
        if self.data.len() < wanted {
            return None;
        }
        let mut whole = vec![self.status];
        whole.append(&mut self.data);
        if self.status >= 0xF0 {
            self.status = 0;
        }
        Some(whole)
    }
}

#[test]
fn running_status_real_time_and_sysex_are_cut_apart() {
    // MIDI 1.0 p. A-1 (three notes on one status), p. A-2 (clock inside), p. 29 (clock inside system exclusive).
    let cut = |bytes: &[u8]| Stream::default().cut(bytes);
    assert_eq!(
        cut(&[0x90, 0x3C, 0x27, 0x40, 0xF8, 0x2B]),
        [vec![0x90, 0x3C, 0x27], vec![0xF8], vec![0x90, 0x40, 0x2B]]
    );
    assert_eq!(
        cut(&[0xF0, 0x7E, 0xF8, 0x7F, 0xF7, 0xC0, 5, 6]),
        [
            vec![0xF8],
            vec![0xF0, 0x7E, 0x7F, 0xF7],
            vec![0xC0, 5],
            vec![0xC0, 6]
        ]
    );
}

#[test]
fn what_makes_no_message_is_counted() {
    let mut stream = Stream::default();
    assert_eq!(
        stream.cut(&[0x3C, 0x90, 0x3C, 0x80, 0x3C, 0x40]),
        [vec![0x80, 0x3C, 0x40]]
    );
    assert_eq!(stream.stray_bytes, 2);
}
