//! The files that are typed into: as many lines and definitions in each language. All are invented.

/// Lines of each file.
pub const LINES: usize = 5000;
/// What the editor calls our language.
pub const OURS: &str = "crenate";
/// Definitions in each file.
pub const DEFINITIONS: usize = 300;

/// A file, the digits that are typed in it, and what is to come of each.
pub struct Sample {
    /// What the editor calls the file.
    pub uri: &'static str,
    /// What the editor calls its language.
    pub language: &'static str,
    /// The text, each digit at its sound value.
    pub text: String,
    /// Line and character of each digit.
    pub digits: Vec<(usize, usize)>,
    /// With this digit there is a finding, with `sound` there is none.
    pub wrong: &'static str,
    /// See `wrong`.
    pub sound: &'static str,
    /// What stands behind the digit in its number.
    pub fraction: &'static str,
    /// The finding's code.
    pub code: &'static str,
    /// The finding starts at most so many lines below the digit.
    pub reach: usize,
    /// Where to hover, from the digit: lines above it, and the character; `None` where the server has no hover.
    pub hover: Option<(usize, usize)>,
    /// What the hover must hold once all is known.
    pub hovered: &'static str,
}

/// Crystals of two layers a cell; with 2 the well is so thin that the target on the gap is met, with 9 it is missed.
pub fn crystals() -> Sample {
    let head = [
        "material basin",
        "  mass 0.067 me",
        "  edge 0 meV",
        "",
        "material wall",
        "  mass 0.092 me",
        "  edge 235 meV",
        "",
    ];
    let (text, digits) = file(&head, "  # nothing more to say", |index| {
        let lines = vec![
            format!("# Crystal number {index}, like the others and yet its own."),
            format!("crystal tern_{index}"),
            format!("  title \"number {index}\""),
            "  layer 2.4 nm of basin".to_owned(),
            format!("  layer 2.{:03} nm of wall", 500 + index),
            "  layer 1.1 nm of basin".to_owned(),
            "  layer 0.9 nm of wall".to_owned(),
            "  bands 4".to_owned(),
            "  filling 2".to_owned(),
            "  measure line = level 2 at centre - level 1 at centre".to_owned(),
            "  require gap 1 >= 100 meV".to_owned(),
            "  require width 1 <= 900 meV".to_owned(),
        ];
        (lines, (3, "  layer ".len()))
    });
    Sample {
        uri: "file:///bench/large.cren",
        language: OURS,
        text,
        digits,
        wrong: "9",
        sound: "2",
        fraction: ".4",
        code: "target-missed",
        reach: 9,
        hover: Some((2, 9)),
        hovered: "gap 1",
    }
}

/// Functions that format two values; with 9 the format asks for a tenth.
pub fn formats() -> Sample {
    let (text, digits) = functions("    label = \"{1} {0}\".format(kept, scale)", 14);
    Sample {
        code: "F524",
        hover: None,
        ..python(text, digits)
    }
}

/// Functions that take a part of a pair; with 9 they ask for the tenth.
pub fn pairs() -> Sample {
    let (text, digits) = functions("    label = f\"{pair[1]} {kept}\"", 20);
    Sample {
        code: "reportGeneralTypeIssues",
        hover: Some((1, 5)),
        hovered: "kept",
        ..python(text, digits)
    }
}

fn python(text: String, digits: Vec<(usize, usize)>) -> Sample {
    Sample {
        uri: "file:///bench/large.py",
        language: "python",
        text,
        digits,
        wrong: "9",
        sound: "1",
        fraction: "",
        code: "",
        reach: 1,
        hover: None,
        hovered: "",
    }
}

/// Functions with such a line in them, and the digit's character in it.
fn functions(line: &str, character: usize) -> (String, Vec<(usize, usize)>) {
    file(
        &["\"\"\"Functions.\"\"\"", ""],
        "    # nothing more to say",
        |index| {
            let lines = vec![
                String::new(),
                String::new(),
                format!("def tern_{index}(scale: float) -> str:"),
                format!("    \"\"\"Number {index}, like the others and yet its own.\"\"\""),
                format!("    pair = (scale, \"number {index}\")"),
                format!("    kept = pair[0] * 2.{:03}", 500 + index),
                line.to_owned(),
                "    if kept > 100:".to_owned(),
                "        return \"long\"".to_owned(),
                "    total = 0.0".to_owned(),
                "    for step in range(4):".to_owned(),
                "        total += step * kept".to_owned(),
                "    return f\"{label} {total}\"".to_owned(),
            ];
            (lines, (6, character))
        },
    )
}

/// A text of [`LINES`] lines: the head, then [`DEFINITIONS`] parts, each filled up with the same line.
fn file(
    head: &[&str],
    filler: &str,
    part: impl Fn(usize) -> (Vec<String>, (usize, usize)),
) -> (String, Vec<(usize, usize)>) {
    let mut lines: Vec<String> = head.iter().map(|line| (*line).to_owned()).collect();
    let mut digits = Vec::new();
    for index in 0..DEFINITIONS {
        let (part, (line, character)) = part(index);
        digits.push((lines.len() + line, character));
        lines.extend(part);
        let wanted = (index + 1) * (LINES - head.len()) / DEFINITIONS + head.len();
        lines.resize(wanted.max(lines.len()), filler.to_owned());
    }
    (lines.join("\n") + "\n", digits)
}
