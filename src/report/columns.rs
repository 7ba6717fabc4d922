//! Plain text in columns and paragraphs that fit a terminal.

/// Widest line of a text report, characters.
pub(super) const WIDTH: usize = 100;

/// Which edge of a column its cells touch.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Align {
    Left,
    Right,
}

/// Rows of cells as lines with two blanks between columns, indented by two; short rows end early.
pub(super) fn columns(rows: &[Vec<String>], align: &[Align]) -> String {
    let width = |column: usize| rows.iter().filter_map(|row| row.get(column)).map(|cell| cell.chars().count()).max().unwrap_or(0);
    let widths: Vec<usize> = (0..align.len()).map(width).collect();
    rows.iter().map(|row| line(row, align, &widths)).collect()
}

fn line(row: &[String], align: &[Align], widths: &[usize]) -> String {
    let mut line = String::new();
    for ((cell, align), width) in row.iter().zip(align).zip(widths) {
        let padding = " ".repeat(width.saturating_sub(cell.chars().count()));
        line.push_str("  ");
        match align {
            Align::Left => line.extend([cell, padding.as_str()]),
            Align::Right => line.extend([padding.as_str(), cell]),
        }
    }
    format!("{}\n", line.trim_end())
}

/// Words as lines of at most `width` characters: the first begins with `first`, the others with as many blanks.
///
/// A word longer than the line is broken, so that no line is ever too wide.
pub(super) fn paragraph(first: &str, text: &str, width: usize) -> String {
    let indent = first.chars().count();
    let room = width.saturating_sub(indent).max(1);
    let lines = wrapped(text, room);
    let mut out = String::new();
    for (i, line) in lines.iter().enumerate() {
        let start = if i == 0 { first.to_owned() } else { " ".repeat(indent) };
        out.push_str(format!("{start}{line}").trim_end());
        out.push('\n');
    }
    out
}

/// Words as lines of at most `width` characters.
pub(super) fn wrapped(text: &str, width: usize) -> Vec<String> {
    let width = width.max(1);
    let mut lines = vec![String::new()];
    let mut used = 0;
    for word in text.split_whitespace().flat_map(|word| pieces(word, width)) {
        let length = word.chars().count();
        if used > 0 && used + 1 + length > width {
            lines.push(String::new());
            used = 0;
        }
        let Some(line) = lines.last_mut() else { continue };
        if used > 0 {
            line.push(' ');
            used += 1;
        }
        line.push_str(&word);
        used += length;
    }
    lines
}

fn pieces(word: &str, width: usize) -> Vec<String> {
    let letters: Vec<char> = word.chars().collect();
    letters.chunks(width).map(|piece| piece.iter().collect()).collect()
}

/// At most `width` characters; a longer text ends in "..".
pub(super) fn shortened(text: &str, width: usize) -> String {
    if text.chars().count() <= width {
        return text.to_owned();
    }
    let start: String = text.chars().take(width.saturating_sub(2)).collect();
    format!("{}..", start.trim_end())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn columns_line_up_by_character_not_by_byte() {
        let rows = vec![vec!["µ".to_owned(), "1".to_owned()], vec!["mm".to_owned(), "22".to_owned()]];
        assert_eq!(columns(&rows, &[Align::Left, Align::Right]), "  µ    1\n  mm  22\n");
        assert_eq!(columns(&[], &[Align::Left]), "");
    }

    #[test]
    fn paragraphs_hang_and_never_exceed_the_width() {
        assert_eq!(paragraph("- ", "one two three", 9), "- one two\n  three\n");
        assert_eq!(paragraph("- ", "", 9), "-\n");
        assert!(paragraph("", &"x".repeat(250), 100).lines().all(|line| line.len() <= 100));
    }

    #[test]
    fn shortened_says_that_it_is_short() {
        assert_eq!(shortened("outside the lattice", 19), "outside the lattice");
        assert_eq!(shortened("outside the lattice", 12), "outside th..");
    }
}
