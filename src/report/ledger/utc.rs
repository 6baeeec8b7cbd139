//! The host's clock for people: always UTC, whatever the reader's place.

use std::time::{Duration, UNIX_EPOCH};

use crate::ledger::groups::DAY_MS;

/// The first instant that has no date of four digits in its year: 10000-01-01.
const BEYOND_MS: u64 = 253_402_300_800_000;

/// `2025-03-01 12:00:03`.
pub fn second(wall_ms: u64) -> String {
    if wall_ms >= BEYOND_MS {
        return "after 9999".to_owned();
    }
    let time = UNIX_EPOCH + Duration::from_millis(wall_ms);
    humantime::format_rfc3339_seconds(time).to_string().replace('T', " ").replace('Z', "")
}

/// `2025-03-01 12:00`.
pub fn minute(wall_ms: u64) -> String {
    second(wall_ms).chars().take(16).collect()
}

/// `2025-03-01`, from the number of days since 1970-01-01.
pub fn day(number: u64) -> String {
    second(number.saturating_mul(DAY_MS)).chars().take(10).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    /// From GNU coreutils: `date -u -d @1740787199 '+%F %T'` and so on.
    #[test]
    fn days_begin_at_midnight_by_utc() {
        assert_eq!(second(1_740_787_199_999), "2025-02-28 23:59:59");
        assert_eq!(second(1_740_787_200_000), "2025-03-01 00:00:00");
        assert_eq!((day(20_148).as_str(), minute(1_740_787_199_999).as_str()), ("2025-03-01", "2025-02-28 23:59"));
        assert_eq!((second(u64::MAX).as_str(), day(u64::MAX).as_str()), ("after 9999", "after 9999"));
    }
}
