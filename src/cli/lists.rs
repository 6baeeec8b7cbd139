//! Lists of quantities: `3,0,1` as written, `@FILE`, or `-` for standard input; one value or a row of values a line,
//! `#` begins a comment. What is wrong is told by file and line.

use std::io::Read;

use super::quantity::brief;
use crate::error::Error;

/// Bytes of a list, wherever it comes from.
const MOST_BYTES: u64 = 4 << 20;

/// A list of at most `most` quantities: `text` itself, the file after `@`, or standard input for `-`.
///
/// # Errors
/// One line that names the option, and the file and line or the entry, and what `item` has to say about it.
pub fn list<T>(
    option: &str,
    text: &str,
    most: usize,
    item: impl Fn(&str) -> Result<T, String>,
) -> Result<Vec<T>, Error> {
    let refuse = |why: String| Error::Usage(format!("{option}: {why}"));
    let (place, content) = match text.strip_prefix('@') {
        _ if text.trim() == "-" => (Some("standard input"), read(std::io::stdin().lock(), "standard input")),
        Some(path) => {
            (Some(path), std::fs::File::open(path).map_err(|why| unreadable(path, &why)).and_then(|f| read(f, path)))
        }
        None => (None, Ok(text.to_owned())),
    };
    let content = content.map_err(refuse)?;
    let mut values = Vec::new();
    for (number, line) in content.lines().enumerate() {
        let line = line.split_once('#').map_or(line, |(before, _)| before).trim();
        if line.is_empty() {
            continue;
        }
        for entry in line.split(',') {
            if values.len() == most {
                return Err(refuse(format!("more than {most} values, which is the most that are taken at once")));
            }
            let value = item(entry.trim()).map_err(|why| {
                let at = place.map_or_else(
                    || format!("entry {}", values.len() + 1),
                    |name| format!("{} line {}", brief(name), number + 1),
                );
                refuse(format!("{at}: '{}': {why}", brief(entry.trim())))
            })?;
            values.push(value);
        }
    }
    if values.is_empty() {
        let at = place.map_or("the list".to_owned(), brief);
        return Err(refuse(format!("{at} has no values; give some, such as 3,0,1")));
    }
    Ok(values)
}

fn read(from: impl Read, name: &str) -> Result<String, String> {
    let mut content = String::new();
    from.take(MOST_BYTES + 1).read_to_string(&mut content).map_err(|why| unreadable(name, &why))?;
    if content.len() as u64 > MOST_BYTES {
        return Err(format!("{} is longer than {} MiB; give fewer values", brief(name), MOST_BYTES >> 20));
    }
    Ok(content)
}

fn unreadable(name: &str, why: &std::io::Error) -> String {
    format!("{} cannot be read: {why}; name a text file with one value or a row of values a line", brief(name))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::cli::quantity::count;

    #[test]
    fn lists_from_the_line_and_from_files() {
        assert_eq!(list("--counts", "3,0, 1,12", 4, count).unwrap(), [3, 0, 1, 12]);
        let file = tempfile::NamedTempFile::new().unwrap();
        std::fs::write(file.path(), "# by cpu\n3, 0\n\n1 # late\n12\n").unwrap();
        let name = format!("@{}", file.path().display());
        assert_eq!(list("--counts", &name, 4, count).unwrap(), [3, 0, 1, 12]);
        std::fs::write(file.path(), "3\n# none\n4,x\n").unwrap();
        let why = list("--counts", &name, 4, count).unwrap_err().to_string();
        assert!(why.contains("--counts") && why.contains("line 3") && why.contains("'x'"), "{why}");
        let why = |text: &str| list("--counts", text, 4, count).unwrap_err().to_string();
        assert!(why("1,2,3,4,5").contains("more than 4"));
        assert!(why("1,,2").contains("entry 2"));
        assert!(why("").contains("no values") && why("# none").contains("no values"));
        assert!(why("@/nonexistent").contains("/nonexistent cannot be read"));
        assert!(why("@/dev/zero").contains("MiB") || why("@/dev/zero").contains("line"), "{}", why("@/dev/zero"));
        assert!(why(&"9".repeat(1000)).len() < 300);
    }
}
