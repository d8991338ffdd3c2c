//! The statements of a text, and the numbers in them, found by their letters alone: no code of the project reads here.

/// A statement's line.
#[derive(Clone, Debug)]
pub struct Line {
    /// From 0.
    pub index: usize,
    /// Without comment and line end.
    pub text: String,
    /// Its first word.
    pub word: String,
    /// The index of the heading that it stands under; `None` in the preamble.
    pub heading: Option<usize>,
}

/// A number with a unit: byte ranges of the line.
#[derive(Clone, Debug)]
pub struct Number {
    pub start: usize,
    pub end: usize,
    pub value: f64,
    /// Empty where there is none.
    pub unit: String,
    pub unit_start: usize,
    pub unit_end: usize,
    /// Whether it stands behind `±` or `within`.
    pub tolerance: bool,
}

const UNITS: [&str; 15] = [
    "nm", "um", "pm", "angstrom", "meV", "eV", "ueV", "me", "u", "K", "ML", "Er", "deg", "%", "Ry",
];

pub fn statements(text: &str) -> Vec<Line> {
    let mut heading = None;
    let mut lines = Vec::new();
    for (index, line) in text.lines().enumerate() {
        let code = code(line);
        let Some(word) = code.split_whitespace().next() else {
            continue;
        };
        if word == "crystal" || word == "material" {
            heading = Some(index);
        }
        lines.push(Line {
            index,
            text: code.trim_end().to_owned(),
            word: word.to_owned(),
            heading,
        });
    }
    lines
}

/// A line without its comment; no string of the models holds a `#`.
fn code(line: &str) -> &str {
    line.split('#').next().unwrap_or("")
}

/// The text with line `index` replaced, taken out, or followed by more.
pub fn replaced(text: &str, index: usize, new: Option<&str>) -> String {
    let mut lines: Vec<&str> = text.lines().collect();
    match new {
        Some(new) => lines[index] = new,
        None => {
            lines.remove(index);
        }
    }
    lines.join("\n") + "\n"
}

/// The numbers of a line, strings left out.
pub fn numbers(line: &str) -> Vec<Number> {
    let bytes = line.as_bytes();
    let mut found = Vec::new();
    let mut at = 0;
    let mut quoted = false;
    let mut tolerance = false;
    while at < bytes.len() {
        if bytes[at] == b'"' {
            quoted = !quoted;
        }
        if line[at..].starts_with("±") || line[at..].starts_with("within") {
            tolerance = true;
            at += "±".len();
            while !line.is_char_boundary(at) {
                at += 1;
            }
            continue;
        }
        let before = at.checked_sub(1).map_or(b' ', |before| bytes[before]);
        let starts = bytes[at].is_ascii_digit()
            && !before.is_ascii_alphanumeric()
            && before != b'_'
            && before != b'.';
        if quoted || !starts {
            at += 1;
            while !line.is_char_boundary(at) {
                at += 1;
            }
            continue;
        }
        let number = number(line, at, tolerance);
        at = number.unit_end.max(number.end);
        found.push(number);
    }
    found
}

fn number(line: &str, start: usize, tolerance: bool) -> Number {
    let rest = &line[start..];
    let length = rest
        .find(|sign: char| !sign.is_ascii_digit() && sign != '.')
        .unwrap_or(rest.len());
    let end = start + length;
    let blanks = line[end..].len() - line[end..].trim_start().len();
    let unit_start = end + blanks;
    let tail = &line[unit_start..];
    let letters = tail
        .find(|sign: char| !sign.is_alphabetic() && sign != '%')
        .unwrap_or(tail.len());
    let unit = &tail[..letters];
    let known = UNITS.contains(&unit);
    Number {
        start,
        end,
        value: line[start..end].parse().unwrap_or(f64::NAN),
        unit: if known {
            unit.to_owned()
        } else {
            String::new()
        },
        unit_start,
        unit_end: if known { unit_start + letters } else { end },
        tolerance,
    }
}

/// The line with bytes replaced.
pub fn spliced(line: &str, start: usize, end: usize, new: &str) -> String {
    format!("{}{new}{}", &line[..start], &line[end..])
}

/// A number as one writes it.
pub fn written(value: f64) -> String {
    let text = format!("{value:.7}");
    text.trim_end_matches('0').trim_end_matches('.').to_owned()
}
