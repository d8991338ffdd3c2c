//! The edits that bring a text into the one standard layout.

use super::tidy::tidy;
use crate::syntax::Tree;
use crate::text::Span;

/// Replacements in order, none overlapping another; none where the layout is the standard one.
///
/// Only lines that change are touched, so that an editor keeps the cursor and
/// what it knows of the others.
#[must_use]
pub fn edits(tree: &Tree) -> Vec<(Span, String)> {
    let new = tidy(tree);
    match by_line(&tree.text, &new) {
        Some(edits) => edits,
        None => vec![(narrow(0, tree.text.len()), new)],
    }
}

/// Line by line, as far as both texts hold the same lines in the same order, layout aside; else nothing.
fn by_line(old: &str, new: &str) -> Option<Vec<(Span, String)>> {
    let (old, new) = (lines(old), lines(new));
    let mut edits: Vec<(Span, String)> = Vec::new();
    let (mut old, mut new) = (old.into_iter().peekable(), new.into_iter().peekable());
    let mut end = 0;
    loop {
        match (old.peek().copied(), new.peek().copied()) {
            (None, None) => return Some(edits),
            (Some((start, before)), Some((_, after))) if same(before, after) => {
                end = start + before.len();
                if before != after {
                    edits.push((narrow(start, end), after.to_owned()));
                }
                old.next();
                new.next();
            }
            (_, Some((_, after))) if after.trim().is_empty() => {
                edits.push((narrow(end, end), after.to_owned()));
                new.next();
            }
            (Some((start, before)), _) if before.trim().is_empty() => {
                end = start + before.len();
                edits.push((narrow(start, end), String::new()));
                old.next();
            }
            _ => return None,
        }
    }
}

/// Each line with its terminator, and where it starts.
fn lines(text: &str) -> Vec<(usize, &str)> {
    let mut position = 0;
    let cut = text.split_inclusive('\n').map(|line| {
        let start = position;
        position += line.len();
        (start, line)
    });
    cut.collect()
}

/// Whether two lines are the same, blanks aside.
fn same(one: &str, other: &str) -> bool {
    let inked = |character: &char| !character.is_whitespace();
    one.chars().filter(inked).eq(other.chars().filter(inked))
}

fn narrow(start: usize, end: usize) -> Span {
    let narrow = |byte| u32::try_from(byte).unwrap_or(u32::MAX);
    Span::new(narrow(start), narrow(end))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::syntax::read;

    /// The text with its edits applied.
    fn applied(text: &str) -> String {
        let mut result = text.to_owned();
        for (span, new) in edits(&read(text)).into_iter().rev() {
            result.replace_range(span.start as usize..span.end as usize, &new);
        }
        result
    }

    #[test]
    fn the_edits_give_the_standard_layout() {
        for text in [
            "",
            "\n\n\nlet a=1 nm\n",
            "crystal a\nlayer 5 nm of b\n\n\n\nlayer   2 nm of c # why",
            "material b\r\n mass 1 me\r\ncrystal c\r\n  like\r\n",
            "# only\n#  comments\n\n",
            "crystal a\n  layer 5 nm \\\n of b\ncrystal d\n",
        ] {
            assert_eq!(applied(text), tidy(&read(text)), "{text:?}");
            assert_eq!(edits(&read(&tidy(&read(text)))), [], "{text:?}");
        }
    }

    #[test]
    fn lines_in_order_are_left_alone() {
        let text = "crystal a\n  layer     5 nm of b\n layer 6 nm of c\n";
        let edits = edits(&read(text));
        assert_eq!(edits.len(), 1, "{edits:?}");
        assert!(edits.iter().all(|(span, _)| span.start > 20));
    }
}
