//! Columns of text that line up.

/// How a column is aligned.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Align {
    /// At its left edge.
    Left,
    /// At its right edge: numbers.
    Right,
}

/// Rows of cells with two blanks between columns and `indent` before the first; a missing cell is empty.
pub fn columns(rows: &[Vec<String>], align: &[Align], indent: usize) -> String {
    laid(rows, align, &widths(rows, Vec::new()), indent)
}

/// The letters of the longest cell of each column, those that are known already included.
pub fn widths(rows: &[Vec<String>], mut known: Vec<usize>) -> Vec<usize> {
    for row in rows {
        known.resize(known.len().max(row.len()), 0);
        known.iter_mut().zip(row).for_each(|(width, cell)| *width = cell.chars().count().max(*width));
    }
    known
}

/// Rows of cells in columns of these widths.
pub fn laid(rows: &[Vec<String>], align: &[Align], widths: &[usize], indent: usize) -> String {
    let mut text = String::new();
    for row in rows {
        let mut line = " ".repeat(indent);
        for (column, &width) in widths.iter().enumerate() {
            let cell = row.get(column).map_or("", String::as_str);
            let blank = " ".repeat(width.saturating_sub(cell.chars().count()));
            match align.get(column).copied().unwrap_or(Align::Left) {
                Align::Left => line.push_str(&format!("{cell}{blank}  ")),
                Align::Right => line.push_str(&format!("{blank}{cell}  ")),
            }
        }
        text.push_str(line.trim_end());
        text.push('\n');
    }
    text
}

/// `text` in lines of at most `width` characters (longer words stay whole), each after `indent` blanks.
pub fn wrapped(text: &str, width: usize, indent: usize) -> String {
    let mut out = String::new();
    let mut length = 0;
    for word in text.split_whitespace() {
        let letters = word.chars().count();
        if length > 0 && length + 1 + letters > width {
            out.push('\n');
            length = 0;
        }
        if length == 0 {
            out.push_str(&" ".repeat(indent));
            length = indent;
        } else {
            out.push(' ');
            length += 1;
        }
        out.push_str(word);
        length += letters;
    }
    out.push('\n');
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Source of truth: counting blanks by hand.
    #[test]
    fn cells_line_up() {
        let rows = [
            vec!["a".to_string(), "1".to_string()],
            vec!["größe".to_string(), "12".to_string(), "x".to_string()],
        ];
        assert_eq!(columns(&rows, &[Align::Left, Align::Right], 2), "  a       1\n  größe  12  x\n");
        assert_eq!(wrapped("one two three", 8, 2), "  one\n  two\n  three\n");
        assert_eq!(wrapped("one two three", 9, 0), "one two\nthree\n");
    }
}
