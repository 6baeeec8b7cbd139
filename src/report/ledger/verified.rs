//! What `ledger verify` says.

use std::fmt::Write;

use serde::Serialize;

use crate::ledger::{Condition, Summary};
use crate::report::text::printable;

/// The document `proofhouse/ledger-verify/1`.
#[derive(Clone, Debug, Serialize)]
pub struct Verified<'a> {
    schema: &'static str,
    ledger: &'a str,
    sound: bool,
    #[serde(flatten)]
    summary: &'a Summary,
}

impl<'a> Verified<'a> {
    /// From how reading a ledger came out.
    pub fn new(ledger: &'a str, summary: &'a Summary) -> Verified<'a> {
        let sound = !matches!(summary.condition, Condition::Broken { .. });
        Verified { schema: "proofhouse/ledger-verify/1", ledger, sound, summary }
    }

    /// Whether every line can be relied on.
    pub fn sound(&self) -> bool {
        self.sound
    }

    /// The text for people.
    pub fn text(&self) -> String {
        let s = self.summary;
        let mut out = format!("{}: {}\n", self.ledger, printable(&s.condition.to_string()));
        let _ = writeln!(out, "{} lines in {} segments", s.lines, s.segments);
        if let Some(head) = &s.head {
            let _ = writeln!(out, "last line: seq {}, SHA-256 {}", head.seq, head.sha256);
        }
        out
    }
}
