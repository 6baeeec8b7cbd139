//! Times, globs and table names as `ledger show` takes them.

use std::time::{Duration, UNIX_EPOCH};

use crate::ledger::groups::{DAY_MS, Dimension};

/// A time on the command line.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Moment {
    /// An instant, Unix milliseconds.
    At(u64),
    /// A whole day by UTC; its begin, Unix milliseconds.
    Day(u64),
    /// So long before now.
    Ago(Duration),
}

impl Moment {
    /// Where what begins then begins, Unix milliseconds.
    pub fn begin_ms(self, now_ms: u64) -> u64 {
        match self {
            Moment::At(ms) | Moment::Day(ms) => ms,
            Moment::Ago(ago) => now_ms.saturating_sub(u64::try_from(ago.as_millis()).unwrap_or(u64::MAX)),
        }
    }

    /// Where what lasts until then ends; a day counts whole.
    pub fn end_ms(self, now_ms: u64) -> u64 {
        match self {
            Moment::Day(ms) => ms.saturating_add(DAY_MS),
            other => other.begin_ms(now_ms),
        }
    }
}

/// Reads a day, a time by UTC (RFC 3339), or how long ago.
pub fn parse_moment(text: &str) -> Result<Moment, String> {
    let instant = |text: &str| {
        let time = humantime::parse_rfc3339(text).ok()?;
        u64::try_from(time.duration_since(UNIX_EPOCH).ok()?.as_millis()).ok()
    };
    if let Some(ms) = instant(text) {
        return Ok(Moment::At(ms));
    }
    if text.len() == 10
        && let Some(ms) = instant(&format!("{text}T00:00:00Z"))
    {
        return Ok(Moment::Day(ms));
    }
    let remedy = "write a day such as 2025-03-01, a time such as 2025-03-01T06:30:00Z, or how long ago such as 7d";
    if !text.is_empty() && text.chars().all(|c| c.is_ascii_digit()) {
        return Err(format!("no unit; {remedy}"));
    }
    humantime::parse_duration(text).map(Moment::Ago).map_err(|_| format!("no such time; {remedy}"))
}

/// Reads a glob of kernel ids.
pub fn parse_glob(text: &str) -> Result<glob::Pattern, String> {
    glob::Pattern::new(text).map_err(|why| format!("{why}; try 'fma.*'"))
}

/// Reads the name of a table.
pub fn parse_dimension(text: &str) -> Result<Dimension, String> {
    Dimension::ALL.iter().find(|(_, word)| *word == text).map(|(d, _)| *d).ok_or_else(|| {
        let known: Vec<&str> = Dimension::ALL.iter().map(|(_, word)| *word).collect();
        format!("no such table; known are {}", known.join(", "))
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    /// From GNU coreutils: `date -u -d '2025-03-01 06:30' +%s` is 1740810600.
    #[test]
    fn days_times_and_spans_are_read() {
        assert_eq!(parse_moment("2025-03-01"), Ok(Moment::Day(1_740_787_200_000)));
        assert_eq!(parse_moment("2025-03-01T06:30:00Z"), Ok(Moment::At(1_740_810_600_000)));
        let week = parse_moment("7d").unwrap();
        assert_eq!((week.begin_ms(604_800_001), week.end_ms(604_800_001)), (1, 1));
        assert_eq!(week.begin_ms(5), 0);
        let day = Moment::Day(86_400_000);
        assert_eq!((day.begin_ms(0), day.end_ms(0)), (86_400_000, 172_800_000));
        for bad in ["", "2025", "2025-3-1", "2025-02-30", "1969-12-31", "yesterday", "7", "-7d", "2025-03-01T25:00:00Z"]
        {
            let why = parse_moment(bad).unwrap_err();
            assert!(why.contains("2025-03-01") && why.contains("7d"), "{bad}: {why}");
        }
    }

    #[test]
    fn every_table_is_read_by_its_word() {
        for (dimension, word) in Dimension::ALL {
            assert_eq!(parse_dimension(word), Ok(dimension));
        }
        assert!(parse_dimension("cor").unwrap_err().contains("cpu, core, kernel"));
        assert!(parse_glob("[a").is_err());
    }
}
