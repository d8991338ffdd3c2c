//! Cutting a byte stream into messages.
//!
//! A message is a block of header fields, an empty line and a body of the
//! length that `Content-Length` says. After anything else the framer looks for
//! the next `Content-Length` and goes on there: one bad message costs itself
//! and no other.

/// Longest body that is accepted, in bytes.
const LONGEST_BODY: usize = 256 << 20;
/// Longest header block that is accepted, in bytes.
const LONGEST_HEADER: usize = 4096;
/// The field that says how long a body is, in lower case.
const LENGTH_FIELD: &[u8] = b"content-length:";

/// What the framer cut off the stream.
#[derive(Debug, PartialEq, Eq)]
pub(super) enum Frame {
    /// The body of a message.
    Body(Vec<u8>),
    /// Bytes that are no message were left out; why.
    Broken(&'static str),
}

/// Collects bytes and gives out messages.
#[derive(Default)]
pub(super) struct Framer {
    buffer: Vec<u8>,
    /// Bytes of `buffer` already given out.
    position: usize,
    /// Length of the body whose header has been read.
    expecting: Option<usize>,
    /// Whether the bytes before `position` were junk that has been reported.
    lost: bool,
}

impl Framer {
    /// Adds bytes from the stream.
    pub(super) fn push(&mut self, bytes: &[u8]) {
        self.buffer.drain(..self.position);
        self.position = 0;
        if let Some(length) = self.expecting {
            self.buffer
                .reserve(length.saturating_sub(self.buffer.len()));
        }
        self.buffer.extend_from_slice(bytes);
    }

    /// The next message, if all of it has arrived.
    pub(super) fn next(&mut self) -> Option<Frame> {
        loop {
            if let Some(length) = self.expecting {
                let body = self.rest().get(..length)?.to_vec();
                self.position += length;
                self.expecting = None;
                return Some(Frame::Body(body));
            }
            match self.read_header()? {
                Ok(length) => {
                    self.expecting = Some(length);
                    self.lost = false;
                }
                Err(why) => {
                    self.resynchronise();
                    if !std::mem::replace(&mut self.lost, true) {
                        return Some(Frame::Broken(why));
                    }
                }
            }
        }
    }

    /// Takes back the part of a body that holds the header of a later message.
    ///
    /// For a body that is no JSON: its length was wrong and it swallowed what
    /// followed. A raw line break cannot stand in a JSON string, so a header
    /// found in it is never part of a sound message.
    pub(super) fn reclaim(&mut self, body: &[u8]) {
        let mut from = 1;
        while let Some(start) = find_length_field(body, from) {
            let tail = body.get(start..).unwrap_or_default();
            let digits = tail.get(LENGTH_FIELD.len()..).unwrap_or_default();
            let digits = digits.trim_ascii_start();
            let count = digits
                .iter()
                .take_while(|byte| byte.is_ascii_digit())
                .count();
            let ends = digits.get(count..).unwrap_or_default();
            if count > 0 && (ends.starts_with(b"\r\n") || ends.is_empty()) {
                let mut buffer = tail.to_vec();
                buffer.extend_from_slice(self.rest());
                self.buffer = buffer;
                self.position = 0;
                return;
            }
            from = start + 1;
        }
    }

    fn rest(&self) -> &[u8] {
        self.buffer.get(self.position..).unwrap_or_default()
    }

    /// The body's length from a whole header block; `None` while it has not all arrived.
    fn read_header(&mut self) -> Option<Result<usize, &'static str>> {
        let rest = self.rest();
        let Some((block, skip)) = split_header(rest) else {
            let endless = rest.len() > LONGEST_HEADER;
            return endless.then_some(Err("a header without an end"));
        };
        let length = parse_header(block);
        if length.is_ok() {
            self.position += skip;
        }
        Some(length)
    }

    /// Drops bytes up to the next `Content-Length`, or all but what may be the start of one.
    fn resynchronise(&mut self) {
        let rest = self.rest();
        let keep = LENGTH_FIELD.len() - 1;
        let skip = find_length_field(rest, 1).unwrap_or(rest.len().saturating_sub(keep).max(1));
        self.position = (self.position + skip).min(self.buffer.len());
    }
}

/// The header block at the start of `bytes`, and where the body starts.
fn split_header(bytes: &[u8]) -> Option<(&[u8], usize)> {
    let end = bytes
        .windows(4)
        .take(LONGEST_HEADER)
        .position(|four| four == b"\r\n\r\n")?;
    Some((bytes.get(..end)?, end + 4))
}

fn parse_header(block: &[u8]) -> Result<usize, &'static str> {
    let block = std::str::from_utf8(block).map_err(|_| "a header that is not text")?;
    let mut length = None;
    for line in block.split("\r\n") {
        let (name, value) = line
            .split_once(':')
            .ok_or("a header line without a colon")?;
        if !name
            .bytes()
            .all(|byte| byte.is_ascii_alphanumeric() || byte == b'-')
        {
            return Err("a header field with an odd name");
        }
        if name.eq_ignore_ascii_case("content-length") {
            length = Some(
                value
                    .trim()
                    .parse()
                    .map_err(|_| "a length that is no number")?,
            );
        }
    }
    match length {
        Some(length) if length <= LONGEST_BODY => Ok(length),
        Some(_) => Err("a message that is too long"),
        None => Err("a header without a length"),
    }
}

/// Where `Content-Length:` next stands in `bytes`, at `from` or after.
fn find_length_field(bytes: &[u8], from: usize) -> Option<usize> {
    let tail = bytes.get(from..)?;
    let found = tail
        .windows(LENGTH_FIELD.len())
        .position(|window| window.eq_ignore_ascii_case(LENGTH_FIELD))?;
    Some(from + found)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn message(body: &str) -> String {
        format!("Content-Length: {}\r\n\r\n{body}", body.len())
    }

    fn body(text: &str) -> Frame {
        Frame::Body(text.as_bytes().to_vec())
    }

    /// All frames of `stream`, handed over in pieces of `size` bytes.
    fn frames(stream: &str, size: usize) -> Vec<Frame> {
        let mut framer = Framer::default();
        let mut found = Vec::new();
        for piece in stream.as_bytes().chunks(size) {
            framer.push(piece);
            while let Some(frame) = framer.next() {
                found.push(frame);
            }
        }
        found
    }

    /// The bodies alone, and how often something was broken.
    fn bodies(stream: &str, size: usize) -> (Vec<Frame>, usize) {
        let all = frames(stream, size);
        let count = all.len();
        let sound: Vec<Frame> = all
            .into_iter()
            .filter(|frame| matches!(frame, Frame::Body(_)))
            .collect();
        let broken = count - sound.len();
        (sound, broken)
    }

    #[test]
    fn pieces_of_any_size_give_the_same_messages() {
        let stream = message("{\"a\":1}") + &message("") + &message("µ");
        for size in 1..stream.len() {
            assert_eq!(
                frames(&stream, size),
                [body("{\"a\":1}"), body(""), body("µ")]
            );
        }
    }

    #[test]
    fn other_fields_and_any_case_are_read() {
        let stream = "content-type: application/json\r\ncontent-LENGTH:2\r\n\r\n{}";
        assert_eq!(frames(stream, 7), [body("{}")]);
    }

    #[test]
    fn a_bad_header_costs_one_message_only() {
        for bad in [
            "Content-Length: many\r\n\r\n{}",
            "Content-Length: -2\r\n\r\n{}",
            "Content-Length: 99999999999999999999\r\n\r\n{}",
            "Content-Length: 999999999\r\n\r\n{}",
            "Length: 2\r\n\r\n{}",
            "hello there",
            "\r\n\r\n\r\n",
            "Content-Length 2\r\n\r\n{}",
        ] {
            let stream = format!("{}{bad}{}{}", message("1"), message("2"), message("3"));
            for size in [1, 5, 1000] {
                let (sound, broken) = bodies(&stream, size);
                assert_eq!(
                    sound,
                    [body("1"), body("2"), body("3")],
                    "{bad:?} in pieces of {size}"
                );
                assert!(broken >= 1, "{bad:?} was not reported");
            }
        }
    }

    #[test]
    fn endless_junk_is_not_kept() {
        let mut framer = Framer::default();
        for _ in 0..100 {
            framer.push(&[b'x'; 10_000]);
            while framer.next().is_some() {}
        }
        assert!(
            framer.buffer.len() <= 20_000,
            "{} bytes kept",
            framer.buffer.len()
        );
        framer.push(message("{}").as_bytes());
        assert_eq!(framer.next(), Some(body("{}")));
    }

    #[test]
    fn a_swallowed_message_is_taken_back() {
        let mut framer = Framer::default();
        framer.push(b"Content-Length: 30\r\n\r\n{\"half\":");
        framer.push(message("{\"whole\":2}").as_bytes());
        let Some(Frame::Body(wrong)) = framer.next() else {
            panic!("a body was expected");
        };
        framer.reclaim(&wrong);
        assert_eq!(framer.next(), Some(body("{\"whole\":2}")));
    }
}
