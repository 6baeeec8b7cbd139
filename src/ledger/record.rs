//! One line of a segment: the envelope, its encoder and its decoder.
//!
//! Byte layout, no space anywhere outside strings of the body, keys in this order, ended by one `\n` (0x0a):
//!
//! ```text
//! {"v":1,"seq":S,"prev":"P","sha":"H","body":B}
//! ```
//!
//! | part | bytes |
//! |---|---|
//! | `1` | version of this layout, decimal, no leading zero; read before anything else, so that a later layout is refused by its number |
//! | `S` | number of the line in the ledger, decimal, no leading zero; 0 for the first, then one more each |
//! | `P` | SHA-256 over the previous line's bytes without its `\n`, 64 lowercase hexadecimal digits; for seq 0 over all bytes of the marker file |
//! | `H` | SHA-256 over the bytes of `B`, 64 lowercase hexadecimal digits |
//! | `B` | the event, a JSON object with a `kind`, UTF-8, no raw control character |
//!
//! The decoder takes this layout by its bytes and not as any JSON that means the same. So every byte of a line is
//! either fixed, or a number that the place of the line determines, or under a hash: no byte can change unnoticed,
//! not even in the last line, which no successor covers.
//!
//! A line without its `\n` is at most [`LINE_BYTES`] long: checked before anything is parsed or allocated. Nesting is
//! limited by the JSON parser (128 levels).

use serde::Deserialize;

use crate::event::Event;
use crate::ledger::condition::Because;
use crate::ledger::digest::Digest;
use crate::ledger::names::{LINE_BYTES, LINE_VERSION};

/// The body of a line as this program understands it.
#[derive(Clone, Debug, PartialEq)]
#[expect(clippy::large_enum_variant, reason = "nearly every record is an event; a box each would only cost")]
pub enum Record {
    /// An event of a kind that this program knows.
    Event(Event),
    /// A kind that a later program of the same line version added. Kept and counted, without meaning.
    Unknown {
        /// Its kind.
        kind: String,
    },
}

/// A line whose own bytes are in order; whether it follows from the one before is for the reader to say.
#[derive(Clone, Debug, PartialEq)]
pub struct Line {
    /// Its number.
    pub seq: u64,
    /// What it states as hash of the line before.
    pub prev: Digest,
    /// Hash of this line, for the next.
    pub hash: Digest,
    /// Its body.
    pub record: Record,
}

/// Kinds that this program knows, as [`kind`] spells them.
pub const KINDS: [&str; 8] = ["opened", "intent", "slice", "mismatch", "lost", "finding", "remark", "closed"];

/// The `kind` of an event on its line.
pub fn kind(event: &Event) -> &'static str {
    match event {
        Event::Opened(_) => "opened",
        Event::Intent(_) => "intent",
        Event::Slice(_) => "slice",
        Event::Mismatch(_) => "mismatch",
        Event::Lost(_) => "lost",
        Event::Finding(_) => "finding",
        Event::Remark(_) => "remark",
        Event::Closed(_) => "closed",
    }
}

/// Host clock of an event in Unix milliseconds.
pub fn wall_ms(event: &Event) -> u64 {
    match event {
        Event::Opened(e) => e.wall_ms,
        Event::Intent(e) => e.wall_ms,
        Event::Slice(e) => e.wall_ms,
        Event::Mismatch(e) => e.wall_ms,
        Event::Lost(e) => e.wall_ms,
        Event::Finding(e) => e.wall_ms,
        Event::Remark(e) => e.wall_ms,
        Event::Closed(e) => e.wall_ms,
    }
}

/// The bytes of a line without its newline.
pub fn encode(seq: u64, prev: Digest, body: &[u8]) -> Vec<u8> {
    let mut line = Vec::with_capacity(body.len() + 200);
    line.extend_from_slice(format!("{{\"v\":{LINE_VERSION},\"seq\":{seq},\"prev\":\"").as_bytes());
    line.extend_from_slice(&prev.to_hex());
    line.extend_from_slice(b"\",\"sha\":\"");
    line.extend_from_slice(&Digest::of(body).to_hex());
    line.extend_from_slice(b"\",\"body\":");
    line.extend_from_slice(body);
    line.push(b'}');
    line
}

/// Takes a line, its newline left out, apart and checks all that can be checked without the line before it.
pub fn decode(line: &[u8]) -> Result<Line, Because> {
    let (seq, prev, body) = envelope(line)?;
    Ok(Line { seq, prev, hash: Digest::of(line), record: understand(body)? })
}

/// Whether these bytes are a line that was once written whole, by its own hash.
pub fn stands_alone(line: &[u8]) -> bool {
    envelope(line).is_ok()
}

/// The envelope: number, hash of the line before, and the body's bytes, which have the stated hash.
fn envelope(line: &[u8]) -> Result<(u64, Digest, &str), Because> {
    if line.len() > LINE_BYTES {
        return Err(Because::LineTooLong);
    }
    let rest = line.strip_prefix(b"{\"v\":").ok_or(Because::Layout("its start"))?;
    let (version, rest) = number(rest).ok_or(Because::Layout("v"))?;
    if version != LINE_VERSION {
        return Err(Because::Version(version));
    }
    let rest = rest.strip_prefix(b",\"seq\":").ok_or(Because::Layout("seq"))?;
    let (seq, rest) = number(rest).ok_or(Because::Layout("seq"))?;
    let (prev, rest) = hash(rest, b",\"prev\":\"").ok_or(Because::Layout("prev"))?;
    let (sha, rest) = hash(rest, b",\"sha\":\"").ok_or(Because::Layout("sha"))?;
    let rest = rest.strip_prefix(b",\"body\":").ok_or(Because::Layout("body"))?;
    let body = rest.strip_suffix(b"}").ok_or(Because::Layout("its end"))?;
    if Digest::of(body) != sha {
        return Err(Because::BodyHash);
    }
    let body = std::str::from_utf8(body).map_err(|_| Because::Layout("body is not UTF-8"))?;
    Ok((seq, prev, body))
}

/// A decimal number without leading zeros, and what follows it.
fn number(bytes: &[u8]) -> Option<(u64, &[u8])> {
    let digits = bytes.iter().take_while(|b| b.is_ascii_digit()).count();
    if digits == 0 || (digits > 1 && bytes[0] == b'0') {
        return None;
    }
    let text = std::str::from_utf8(&bytes[..digits]).ok()?;
    Some((text.parse().ok()?, &bytes[digits..]))
}

/// A hash after `key`, its closing quote taken off, and what follows it.
fn hash<'a>(bytes: &'a [u8], key: &[u8]) -> Option<(Digest, &'a [u8])> {
    let (hex, rest) = bytes.strip_prefix(key)?.split_at_checked(64)?;
    Some((Digest::from_hex(hex)?, rest.strip_prefix(b"\"")?))
}

fn understand(body: &str) -> Result<Record, Because> {
    // nearly all lines are slices: this spares them the detour of a tagged enum through a tree of its content
    if body.starts_with(r#"{"kind":"slice","#)
        && let Ok(slice) = serde_json::from_str(body)
    {
        return Ok(Record::Event(Event::Slice(slice)));
    }
    let error = match serde_json::from_str(body) {
        Ok(event) => return Ok(Record::Event(event)),
        Err(error) => error,
    };
    #[derive(Deserialize)]
    struct OnlyKind {
        kind: String,
    }
    match serde_json::from_str::<OnlyKind>(body) {
        Ok(OnlyKind { kind }) if !KINDS.contains(&kind.as_str()) => Ok(Record::Unknown { kind }),
        _ => Err(Because::Record(error.to_string())),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::event::Remark;

    fn remark(text: &str) -> Event {
        Event::Remark(Remark { job_id: 1, wall_ms: 2, text: text.into() })
    }

    fn line_of(body: &str) -> Vec<u8> {
        encode(7, Digest::of(b"before"), body.as_bytes())
    }

    /// Hashes from `printf %s … | sha256sum` (GNU coreutils 9.1).
    #[test]
    fn bytes_are_those_of_the_table() {
        let body = serde_json::to_string(&remark("x")).unwrap();
        assert_eq!(body, r#"{"kind":"remark","job_id":1,"wall_ms":2,"text":"x"}"#);
        let expected = concat!(
            r#"{"v":1,"seq":7,"prev":"6db7d803e74f1ffa7d8f5adc0bf95b3e15bf4c8373fffadf546227cc6c6742cb","#,
            r#""sha":"7d639bef44eda9fc8488404277d0dd2a67755043ce411c172ebc7612b959a638","#,
            r#""body":{"kind":"remark","job_id":1,"wall_ms":2,"text":"x"}}"#
        );
        assert_eq!(String::from_utf8(line_of(&body)).unwrap(), expected);
        assert_eq!(decode(&line_of(&body)).unwrap().record, Record::Event(remark("x")));
    }

    #[test]
    fn unknown_kinds_are_kept_and_known_ones_must_be_understood() {
        let unknown = decode(&line_of(r#"{"kind":"novelty","depth":[[1]]}"#)).unwrap();
        assert_eq!(unknown.record, Record::Unknown { kind: "novelty".into() });
        for bad in [r#"{"kind":"remark"}"#, r#"{"x":1}"#, "[]", "", r#"{"kind":"novelty""#] {
            assert!(matches!(decode(&line_of(bad)), Err(Because::Record(_))), "{bad}");
        }
    }

    #[test]
    fn deep_nesting_ends_neither_the_stack_nor_the_program() {
        let deep = "[".repeat(1 << 20);
        for body in [format!("{{\"kind\":\"slice\",\"x\":{deep}"), format!("{{\"kind\":\"novelty\",\"x\":{deep}"), deep]
        {
            assert!(matches!(decode(&line_of(&body)), Err(Because::Record(_))));
        }
    }

    #[test]
    fn longest_line_is_refused_before_it_is_looked_at() {
        let line = vec![b'x'; LINE_BYTES + 1];
        assert_eq!(decode(&line), Err(Because::LineTooLong));
        assert_eq!(decode(&line[1..]), Err(Because::Layout("its start")));
    }

    #[test]
    fn other_spellings_of_the_same_json_are_refused() {
        let good = String::from_utf8(line_of(r#"{"kind":"remark","job_id":1,"wall_ms":2,"text":"x"}"#)).unwrap();
        decode(good.as_bytes()).unwrap();
        for (from, to) in [
            ("\"seq\":7", "\"seq\":07"),
            ("{\"v\"", "{ \"v\""),
            (",\"body\"", ", \"body\""),
            ("}}", "}} "),
            ("\"v\":1", "\"v\":01"),
        ] {
            let other = good.replacen(from, to, 1);
            assert_ne!(other, good);
            assert!(matches!(decode(other.as_bytes()), Err(Because::Layout(_))), "{other}");
        }
        assert_eq!(decode(good.replacen("\"v\":1", "\"v\":2", 1).as_bytes()), Err(Because::Version(2)));
    }

    #[test]
    fn every_known_kind_is_on_the_list() {
        assert_eq!(kind(&remark("")), "remark");
        // the parser names all kinds that it knows in its refusal
        let said = serde_json::from_str::<Event>(r#"{"kind":"novelty"}"#).unwrap_err().to_string();
        let known: Vec<&str> = said.split('`').skip(3).step_by(2).collect();
        assert_eq!(known, KINDS);
    }
}
