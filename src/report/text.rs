//! Plain tables: columns as wide as their contents, numbers to the right.

/// A table under construction.
pub struct Table {
    rows: Vec<Vec<String>>,
}

impl Table {
    /// With these headings.
    pub fn new(headings: &[&str]) -> Table {
        Table { rows: vec![headings.iter().map(|h| (*h).to_owned()).collect()] }
    }

    /// Adds a row.
    pub fn row(&mut self, cells: impl IntoIterator<Item = String>) {
        self.rows.push(cells.into_iter().collect());
    }

    /// The table; a column is aligned to the right where everything below its heading starts with a digit.
    pub fn text(&self) -> String {
        let columns = self.rows.first().map_or(0, Vec::len);
        let width = |c: usize| self.rows.iter().filter_map(|r| r.get(c)).map(|t| t.chars().count()).max().unwrap_or(0);
        let number = |t: &String| t.chars().next().is_none_or(|c| c.is_ascii_digit() || c == '-');
        let right = |c: usize| self.rows.iter().skip(1).filter_map(|r| r.get(c)).all(number);
        let shape: Vec<(usize, bool)> = (0..columns).map(|c| (width(c), right(c))).collect();
        let mut out = String::new();
        for row in &self.rows {
            let line: Vec<String> = row
                .iter()
                .zip(&shape)
                .map(|(t, (w, right))| if *right { format!("{t:>w$}") } else { format!("{t:<w$}") })
                .collect();
            out.push_str(line.join("  ").trim_end());
            out.push('\n');
        }
        out
    }
}

/// Text from outside without anything that a terminal would obey.
pub fn printable(text: &str) -> String {
    text.chars().map(|c| if c.is_control() { '\u{fffd}' } else { c }).collect()
}

/// Columns of a text report.
const COLUMNS: usize = 100;

/// Prose folded at spaces to the width of a report, later lines indented. Figures of a table stay as they are.
pub fn folded(text: &str) -> String {
    textwrap::fill(text, textwrap::Options::new(COLUMNS).subsequent_indent("  ").break_words(false))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn columns_line_up_and_numbers_stand_right() {
        let mut table = Table::new(&["cpu", "verdict"]);
        table.row(["0".into(), "clear".into()]);
        table.row(["128".into(), "watch".into()]);
        assert_eq!(table.text(), "cpu  verdict\n  0  clear\n128  watch\n");
        let long = folded(&"seventeen letters ".repeat(12));
        assert!(long.lines().count() == 3 && long.lines().all(|l| l.chars().count() <= 100), "{long}");
        assert_eq!(printable("a\x1b[2Jb"), "a\u{fffd}[2Jb");
    }
}
