//! Columns of text that line up.

/// How a column stands.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Stand {
    /// Words.
    Left,
    /// Numbers.
    Right,
}

/// Lays rows out in columns two blanks apart, each line behind `indent` blanks; empty columns vanish.
#[must_use]
pub fn lay(stands: &[Stand], rows: &[Vec<String>], indent: usize) -> String {
    let widths: Vec<usize> = (0..stands.len())
        .map(|column| width(rows, column))
        .collect();
    let mut text = String::new();
    for row in rows {
        let mut line = " ".repeat(indent);
        let columns = stands.iter().zip(&widths).enumerate();
        for (index, (stand, width)) in columns.filter(|(_, (_, width))| **width > 0) {
            let cell = row.get(index).map_or("", String::as_str);
            let blanks = " ".repeat(width - length(cell));
            line += &match stand {
                Stand::Left => format!("{cell}{blanks}"),
                Stand::Right => format!("{blanks}{cell}"),
            };
            line += "  ";
        }
        text += line.trim_end();
        text.push('\n');
    }
    text
}

fn width(rows: &[Vec<String>], column: usize) -> usize {
    let cells = rows.iter().filter_map(|row| row.get(column));
    cells.map(|cell| length(cell)).max().unwrap_or(0)
}

fn length(cell: &str) -> usize {
    cell.chars().count()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn columns_line_up_and_empty_ones_vanish() {
        let rows = vec![
            vec!["a".to_owned(), String::new(), "12.3".to_owned()],
            vec!["bcd".to_owned(), String::new(), "−4".to_owned()],
        ];
        let text = lay(&[Stand::Left, Stand::Left, Stand::Right], &rows, 1);
        assert_eq!(text, " a    12.3\n bcd    −4\n");
    }
}
