//! Quantities as people write them: counts, times, rates, confidences. Lists of them are read by `lists`.
//!
//! | written | read as |
//! |---|---|
//! | `3`, `1_000_000`, `1e9` | a count: whole, 0 to 2^53 |
//! | `12.5h`, `90m`, `1h30m`, `7d` | a time |
//! | `1/500h`, `0.002/h`, `3/30m`, `2e-6/s` | a rate per hour |
//! | `1e-9`, `1/1000000` | a probability per run |
//! | `5/100h`, `5/1000000` | events in hours, events in runs |
//! | `95%`, `0.95` | a share above 0 and below 1 |
//!
//! A parser of one quantity answers with a fragment that says what is wrong and what to write; the caller names the
//! option.

use crate::report::reckon::{Exposure, Observation, Rate};

/// Counts up to here are exact in a double.
const MOST_COUNT: f64 = 9_007_199_254_740_992.0;
/// Hours that somebody can mean: 4 µs to every core of a million hosts for a century.
const HOURS: std::ops::RangeInclusive<f64> = 1e-9..=1e12;
/// Rates per hour that somebody can mean.
const PER_HOUR: std::ops::RangeInclusive<f64> = 1e-12..=1e15;

/// A finite number; underscores may stand between digits.
pub fn number(text: &str) -> Result<f64, String> {
    let refuse = || "not a number; write digits such as 12.5, 1_000 or 1e9".to_owned();
    let plain = text.trim();
    let (value, rest) = leading_number(plain).ok_or_else(refuse)?;
    if rest.is_empty() { Ok(value) } else { Err(refuse()) }
}

/// A whole number from 0 to 2^53.
pub fn count(text: &str) -> Result<u64, String> {
    let refuse = || "not a whole number from 0 to 2^53; write 3, 1_000 or 1e9".to_owned();
    let value = number(text).map_err(|_| refuse())?;
    // 2^53 + 1 would be read as 2^53: the digits themselves have to fit
    let digits: String = text.trim().chars().filter(|c| *c != '_').collect();
    let fits = digits.parse::<u64>().map_or(true, |whole| whole as f64 <= MOST_COUNT && whole as f64 as u64 == whole);
    let whole = value >= 0.0 && value.fract() == 0.0 && value <= MOST_COUNT;
    if whole && fits { Ok(value as u64) } else { Err(refuse()) }
}

/// A count of at least 1.
pub fn some(text: &str) -> Result<u64, String> {
    match count(text)? {
        0 => Err("nothing can be told from 0; give at least 1".to_owned()),
        value => Ok(value),
    }
}

/// A number above 0, at most 1e15.
pub fn positive(text: &str) -> Result<f64, String> {
    let value = number(text)?;
    if value > 0.0 && (1e-15..=1e15).contains(&value) {
        Ok(value)
    } else {
        Err("not from 1e-15 to 1e15; give a positive number".to_owned())
    }
}

/// A share above 0 and below 1, in percent or as a fraction.
pub fn share(text: &str) -> Result<f64, String> {
    let remedy = "write 95% or 0.95";
    let plain = text.trim();
    let value = match plain.strip_suffix('%').map(str::trim) {
        // by the digits: 99.9 / 100 is not 0.999
        Some(percent) if !percent.contains(['e', 'E']) => {
            number(percent).and_then(|_| number(&format!("{percent}e-2")))
        }
        Some(percent) => number(percent).map(|value| value / 100.0),
        None => number(plain),
    };
    let value = value.map_err(|_| format!("not a number; {remedy}"))?;
    if value > 0.0 && value < 1.0 { Ok(value) } else { Err(format!("not above 0 % and below 100 %; {remedy}")) }
}

/// A p-value: 0 to 1, both included.
pub fn p_value(text: &str) -> Result<f64, String> {
    let value = number(text)?;
    if (0.0..=1.0).contains(&value) { Ok(value) } else { Err("not from 0 to 1, as p-values are".to_owned()) }
}

/// Hours. Without a unit hours are meant: for options that say so in their name.
pub fn hours(text: &str) -> Result<f64, String> {
    match number(text) {
        Ok(value) => meant_hours(value),
        Err(_) => time(text),
    }
}

/// A time with its unit, in hours: `12.5h`, `1h30m`.
pub fn time(text: &str) -> Result<f64, String> {
    let remedy = "write a time such as 12.5h, 90m, 3600s, 7d or 1h30m";
    let mut rest = text.trim();
    let mut sum = 0.0;
    while sum == 0.0 || !rest.is_empty() {
        let (value, after) = leading_number(rest).ok_or_else(|| format!("not a time; {remedy}"))?;
        let after = after.trim_start();
        let end = after.find(|c: char| !c.is_alphabetic()).unwrap_or(after.len());
        let (unit, next) = after.split_at(end);
        let scale = unit_hours(unit).ok_or_else(|| match unit {
            "" => format!("no unit; {remedy}"),
            _ => format!("unknown unit '{}'; the units are d, h, m, s, ms; {remedy}", brief(unit)),
        })?;
        if value <= 0.0 {
            return Err(format!("a time that is not above 0; {remedy}"));
        }
        (sum, rest) = (sum + value * scale, next.trim_start());
    }
    meant_hours(sum)
}

/// Seconds: `60s`, `5m`.
pub fn seconds(text: &str) -> Result<f64, String> {
    time(text).map(|hours| hours * 3600.0)
}

/// A rate per hour, `1/500h` or `0.002/h`, or a probability per run, `1e-9` or `1/1000000`.
pub fn rate(text: &str) -> Result<Rate, String> {
    let remedy = "write 1/500h or 0.002/h for a rate, 1e-9 or 1/1000000 for a probability per run";
    if text.trim().ends_with('%') {
        return share(text).map(Rate::PerRun);
    }
    let (events, over) = text.split_once('/').unwrap_or((text, "1"));
    let events = number(events).map_err(|_| format!("not a rate; {remedy}"))?;
    if let Ok(runs) = number(over) {
        let share = events / runs;
        return if runs > 0.0 && share > 0.0 && share < 1.0 {
            Ok(Rate::PerRun(share))
        } else {
            Err(format!("not above 0 and below 1 per run; {remedy}"))
        };
    }
    let hours = match unit_hours(over.trim()) {
        Some(one) => one,
        None => time(over)?,
    };
    let rate = events / hours;
    if PER_HOUR.contains(&rate) {
        Ok(Rate::PerHour(rate))
    } else {
        Err(format!("not from {:e} to {:e} per hour; {remedy}", PER_HOUR.start(), PER_HOUR.end()))
    }
}

/// What was seen, `5/100h` or `5/1000000` (runs).
pub fn observation(text: &str) -> Result<Observation, String> {
    let remedy = "write events/time such as 5/100h, or events/runs such as 5/1000000";
    let (events, over) = text.split_once('/').ok_or_else(|| format!("no exposure; {remedy}"))?;
    let events = count(events).map_err(|_| format!("the events are not a whole number; {remedy}"))?;
    let exposure = if number(over).is_ok() {
        let runs = some(over).map_err(|why| format!("the runs: {why}"))?;
        if events > runs {
            return Err(format!("{events} events in {runs} runs; count at most one a run"));
        }
        Exposure::Runs(runs)
    } else {
        Exposure::Hours(time(over)?)
    };
    Ok(Observation { events, exposure })
}

/// Events in a time at a temperature, `3/10h@61`: events, hours, °C.
pub fn reading(text: &str) -> Result<(u64, f64, f64), String> {
    let remedy = "write events/time@celsius such as 3/10h@61";
    let (seen, at) = text.split_once('@').ok_or_else(|| format!("no temperature; {remedy}"))?;
    let Observation { events, exposure: Exposure::Hours(hours) } = observation(seen)? else {
        return Err(format!("the exposure has no unit; {remedy}"));
    };
    let celsius = celsius(at).map_err(|why| format!("the temperature: {why}"))?;
    Ok((events, hours, celsius))
}

/// A temperature in °C.
pub fn celsius(text: &str) -> Result<f64, String> {
    let plain = text.trim().trim_end_matches("°C").trim_end_matches('C');
    match number(plain) {
        Ok(celsius) if (-100.0..=300.0).contains(&celsius) => Ok(celsius),
        _ => Err("not a temperature from -100 to 300 °C; write 61 or 61.5".to_owned()),
    }
}

/// Two sums that belong together, `3/10`.
pub fn pair(text: &str) -> Result<(f64, f64), String> {
    let remedy = "write two numbers such as 3/10, the second above 0";
    let (above, below) = text.split_once('/').ok_or_else(|| format!("no pair; {remedy}"))?;
    let [above, below] = [above, below].map(|n| number(n).ok().filter(|n| (0.0..=1e15).contains(n)));
    match (above, below) {
        (Some(above), Some(below)) if below >= 1e-15 => Ok((above, below)),
        _ => Err(format!("not a pair of numbers up to 1e15; {remedy}")),
    }
}

/// A piece of what was given that fits into a line.
pub fn brief(text: &str) -> String {
    let mut piece: String = text.chars().take(60).collect();
    if piece.len() < text.len() {
        piece.push('…');
    }
    piece
}

fn meant_hours(hours: f64) -> Result<f64, String> {
    if HOURS.contains(&hours) {
        Ok(hours)
    } else {
        Err(format!("not from {:e} to {:e} hours; write a time such as 12.5h, 90m or 7d", HOURS.start(), HOURS.end()))
    }
}

/// Hours in one unit.
fn unit_hours(unit: &str) -> Option<f64> {
    Some(match unit {
        "d" => 24.0,
        "h" => 1.0,
        "m" | "min" => 1.0 / 60.0,
        "s" => 1.0 / 3600.0,
        "ms" => 1.0 / 3.6e6,
        _ => return None,
    })
}

/// The number that `text` begins with, and what follows it.
fn leading_number(text: &str) -> Option<(f64, &str)> {
    let bytes = text.as_bytes();
    let digit = |at: usize| bytes.get(at).is_some_and(u8::is_ascii_digit);
    let mut end = usize::from(matches!(bytes.first(), Some(b'-' | b'+')));
    let digits = |mut at: usize| {
        while digit(at) || (bytes.get(at) == Some(&b'_') && at > 0 && digit(at - 1) && digit(at + 1)) {
            at += 1;
        }
        at
    };
    end = digits(end);
    if bytes.get(end) == Some(&b'.') {
        end = digits(end + 1);
    }
    if matches!(bytes.get(end), Some(b'e' | b'E')) {
        let sign = usize::from(matches!(bytes.get(end + 1), Some(b'-' | b'+')));
        if digit(end + 1 + sign) {
            end = digits(end + 1 + sign);
        }
    }
    let (number, rest) = text.split_at(end);
    let value = number.replace('_', "").parse::<f64>().ok().filter(|value| value.is_finite())?;
    Some((value, rest))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn counts() {
        for (text, value) in [("0", 0), (" 3 ", 3), ("1_000_000", 1_000_000), ("1e9", 1_000_000_000), ("1.5e1", 15)] {
            assert_eq!(count(text), Ok(value), "{text}");
        }
        assert_eq!(count("9007199254740992"), Ok(1 << 53));
        for text in ["", "-1", "1.5", "1e300", "9007199254740993", "inf", "NaN", "1e", "1__0", "_1", "1_", "0x10", "3h"]
        {
            assert!(count(text).unwrap_err().contains("whole number"), "{text}");
        }
        assert_eq!(some("1"), Ok(1));
        assert!(some("0").is_err());
    }

    #[test]
    fn times() {
        let cases = [("12.5h", 12.5), ("90m", 1.5), ("90min", 1.5), ("3600s", 1.0), ("7d", 168.0), ("1h30m", 1.5)];
        for (text, value) in cases {
            assert!((time(text).unwrap() - value).abs() < 1e-12, "{text}");
            assert_eq!(hours(text), time(text));
        }
        assert_eq!(hours("1e3"), Ok(1000.0));
        assert!(time("1000").unwrap_err().contains("no unit"));
        assert!(time("5 fortnights").unwrap_err().contains("d, h, m, s"));
        assert!(time("5parsec").unwrap_err().contains("parsec"));
        for text in ["", "h", "0h", "-3h", "1h-30m", "1e300h", "1e400h", "NaNh", "infh", "1h 30", "1e-30h"] {
            assert!(time(text).is_err(), "{text}");
        }
        assert!(hours("0").is_err() && hours("-1").is_err() && hours("inf").is_err());
    }

    #[test]
    fn rates_are_per_hour_or_per_run() {
        let per_hour = [("1/500h", 0.002), ("0.002/h", 0.002), ("3/30m", 6.0), ("2e-6/s", 0.0072), ("1/d", 1.0 / 24.0)];
        for (text, value) in per_hour {
            let Ok(Rate::PerHour(rate)) = rate(text) else { panic!("{text}") };
            assert!((rate - value).abs() < 1e-15, "{text}: {rate}");
        }
        assert_eq!(rate("1e-9"), Ok(Rate::PerRun(1e-9)));
        assert_eq!(rate("1/1_000"), Ok(Rate::PerRun(1e-3)));
        assert_eq!(rate("0.1%"), Ok(Rate::PerRun(1e-3)));
        for text in
            ["", "/", "1/", "/h", "0/h", "-1/h", "1/0h", "1/0", "2", "1", "0", "1e300/h", "1/h/h", "x", "1/fortnight"]
        {
            assert!(rate(text).is_err(), "{text}");
        }
    }

    #[test]
    fn observations_and_readings() {
        assert_eq!(observation("5/100h"), Ok(Observation { events: 5, exposure: Exposure::Hours(100.0) }));
        assert_eq!(observation("5/1e6"), Ok(Observation { events: 5, exposure: Exposure::Runs(1_000_000) }));
        for text in ["5", "5/", "5/0", "5/0h", "-5/1h", "1.5/1h", "6/5", "5/1x", "5/1e300", "/1h"] {
            assert!(observation(text).is_err(), "{text}");
        }
        assert_eq!(reading("3/10h@61"), Ok((3, 10.0, 61.0)));
        assert_eq!(reading("0/30m@-5.5°C"), Ok((0, 0.5, -5.5)));
        for text in ["3/10h", "3/10@61", "3/10h@", "3/10h@hot", "3/10h@1e9"] {
            assert!(reading(text).is_err(), "{text}");
        }
        assert_eq!(pair("3/10"), Ok((3.0, 10.0)));
        assert!(pair("3").is_err() && pair("3/0").is_err() && pair("3/NaN").is_err() && pair("-1/3").is_err());
    }

    #[test]
    fn shares_lie_between_nothing_and_all() {
        assert_eq!(share("95%"), Ok(0.95));
        assert_eq!(share("0.95"), Ok(0.95));
        assert_eq!(share("99.9 %"), Ok(0.999));
        for text in ["0", "1", "0%", "100%", "95", "-5%", "NaN", "inf", "", "%", "0.99999999999999999999"] {
            assert!(share(text).is_err(), "{text}");
        }
        assert_eq!((p_value("0"), p_value("1")), (Ok(0.0), Ok(1.0)));
        assert!(p_value("1.01").is_err() && p_value("-0.1").is_err());
    }
}
