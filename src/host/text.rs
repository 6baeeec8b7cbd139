//! Makes untrusted text fit to be shown.

/// At most `limit` characters of `text`, without control characters: fit for a terminal and for a log.
pub fn clean(text: &str, limit: usize) -> String {
    text.chars().filter(|c| !c.is_control()).take(limit).collect::<String>().trim().to_owned()
}

#[cfg(test)]
mod tests {
    use super::clean;

    #[test]
    fn cleaned_text_is_short_and_harmless() {
        assert_eq!(clean("\u{1b}[31mred\n\0\ttext ", 100), "[31mredtext");
        assert_eq!(clean("äöü", 2), "äö");
    }
}
