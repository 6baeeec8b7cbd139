//! Names of the files in a ledger's folder, and the limits that reader and writer share.

/// Marks a folder as a ledger.
pub const MARKER: &str = "ledger.json";
/// The marker while it is being made; only ever seen after a crash in that instant.
pub const MARKER_NEW: &str = "ledger.json.new";
/// Held exclusively by the one writer; always empty.
pub const LOCK: &str = "ledger.lock";
/// What the marker's schema has to be.
pub const SCHEMA: &str = "proofhouse/ledger/1";
/// What every version's schema starts with.
pub const SCHEMA_FAMILY: &str = "proofhouse/ledger/";
/// Version of the line format.
pub const LINE_VERSION: u64 = 1;
/// A line, its newline left out, is never longer than this many bytes.
pub const LINE_BYTES: usize = 4 << 20;
/// A line that would make a segment longer than this many bytes starts the next segment.
pub const SEGMENT_BYTES: u64 = 16 << 20;
/// A segment longer than this was not written by us and is not read into memory.
pub const SEGMENT_BYTES_READ: u64 = 64 << 20;

/// `segment-000001.jsonl` and so on; more digits when six are spent.
pub fn segment(number: u32) -> String {
    format!("segment-{number:06}.jsonl")
}

/// The number of a segment, if `name` is exactly the name of one.
pub fn segment_number(name: &str) -> Option<u32> {
    let number = name.strip_prefix("segment-")?.strip_suffix(".jsonl")?.parse().ok()?;
    (number > 0 && segment(number) == name).then_some(number)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_and_numbers_are_one_to_one() {
        for number in [1, 2, 999_999, 1_000_000, u32::MAX] {
            assert_eq!(segment_number(&segment(number)), Some(number));
        }
        for other in [
            "segment-000000.jsonl",
            "segment-1.jsonl",
            "segment-0000001.jsonl",
            "segment-+00001.jsonl",
            "segment-000001.jsonl~",
            "x",
        ] {
            assert_eq!(segment_number(other), None, "{other}");
        }
    }
}
