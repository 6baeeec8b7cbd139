//! Words that firmware carries in the place of a serial number that nobody filled in. They are the same on many
//! hosts, so nothing may be keyed by them. The list is from memory of common firmware defaults.

/// Whole values that identify nothing, in lower case.
const WORDS: [&str; 26] = [
    "to be filled by o.e.m.",
    "to be filled by o.e.m",
    "o.e.m.",
    "oem",
    "default string",
    "default",
    "system serial number",
    "base board serial number",
    "chassis serial number",
    "serial number",
    "system product name",
    "not specified",
    "not applicable",
    "not available",
    "not provided",
    "no asset tag",
    "none",
    "n/a",
    "na",
    "unknown",
    "undefined",
    "uninitialized",
    "empty",
    "invalid",
    "localhost",
    "(none)",
];

/// UUIDs that whole product lines share, in lower case without hyphens.
const UUIDS: [&str; 2] = ["03000200040005000006000700080009", "123456781234567890abcddeefaabbcc"];

/// Whether `value` identifies nothing: a placeholder, one character over and over, a plain count, or too short.
pub fn is_placeholder(value: &str) -> bool {
    let value = value.trim().to_lowercase();
    let bare: String = value.chars().filter(|c| c.is_alphanumeric()).collect();
    let uniform = bare.chars().all(|c| bare.starts_with(c));
    // "0123456789", "123456789", "12345678" …
    let counting = bare.len() >= 3 && "0123456789012345678901234567890123456789".contains(&bare);
    bare.chars().count() < 3 || uniform || counting || WORDS.contains(&value.as_str()) || UUIDS.contains(&bare.as_str())
}

#[cfg(test)]
mod tests {
    use super::is_placeholder;

    #[test]
    fn defaults_of_firmware_are_no_identity() {
        for value in [
            "To Be Filled By O.E.M.",
            "To be filled by O.E.M.",
            "Default string",
            "  default string ",
            "System Serial Number",
            "Not Specified",
            "None",
            "N/A",
            "",
            "0",
            "00000000-0000-0000-0000-000000000000",
            "FFFFFFFF-FFFF-FFFF-FFFF-FFFFFFFFFFFF",
            "03000200-0400-0500-0006-000700080009",
            "0123456789",
            "123456789",
            "XXXXXXXXXX",
            "..........",
            "uninitialized",
        ] {
            assert!(is_placeholder(value), "{value:?}");
        }
    }

    #[test]
    fn serial_numbers_are_identity() {
        for value in [
            "4c4c4544-0042-3510-8052-b4c04f4d3332",
            "C07XQ1ABJYVW",
            "7D2K9R3",
            "3d1219c7c4c5404aaa1f6d2a48adfda4",
            "NONESUCH42",
            "1002003",
        ] {
            assert!(!is_placeholder(value), "{value:?}");
        }
    }
}
