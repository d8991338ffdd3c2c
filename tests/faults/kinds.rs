//! The classes of faults: what each does to a text, which rules may find it, and on which lines.

use super::lines::{Line, Number, numbers, replaced, spliced, statements, written};
use super::models::Models;

/// A class of faults.
pub struct Class {
    pub name: &'static str,
    /// The rules that may find it on a line of its own.
    pub rules: &'static [&'static str],
    /// Whether a target that is no longer met counts: the fault is in a size, and sizes are known by what they do.
    pub by_target: bool,
    /// All faults of this class in some models.
    pub faults: fn(&Models) -> Vec<Fault>,
}

/// One fault.
#[derive(Clone)]
pub struct Fault {
    /// Which file is broken.
    pub file: usize,
    /// Its text then.
    pub text: String,
    /// Where it may be found.
    pub lines: Lines,
    /// What was done.
    pub what: String,
}

/// Where a fault may be found.
#[derive(Clone)]
pub enum Lines {
    /// On one of these lines, from 0, of the broken file.
    These(Vec<usize>),
    /// On any line, of any file, that holds this text.
    Holding(String),
}

/// Every class.
pub const CLASSES: &[Class] = &[
    class(
        "unit a thousand times off",
        &[
            "unit-slip",
            "wrong-unit",
            "thin-layer",
            "odd-mass",
            "open-cell",
            "off-lattice-wave",
            "lone-component",
        ],
        true,
        thousand,
    ),
    class(
        "number ten times off",
        &[
            "unit-slip",
            "thin-layer",
            "odd-mass",
            "open-cell",
            "off-lattice-wave",
            "lone-component",
            "overlapping-pieces",
            "part-monolayer",
        ],
        true,
        ten,
    ),
    class("mass ten times off", &["unit-slip", "odd-mass"], true, mass),
    class(
        "sign swapped",
        &[
            "odd-mass",
            "open-cell",
            "flat-lattice",
            "lone-component",
            "wrong-unit",
            "not-finite",
            "thin-layer",
            "join-step",
            "seam-step",
            "join-kink",
            "seam-kink",
            "unit-slip",
        ],
        true,
        sign,
    ),
    class(
        "wrong dimension",
        &["wrong-unit", "unreadable-line", "unknown-unit"],
        false,
        dimension,
    ),
    class(
        "unit left out",
        &["missing-unit", "wrong-unit", "unit-slip"],
        false,
        unitless,
    ),
    class("unit misspelt", &["unknown-unit"], false, unit_misspelt),
    class("name misspelt", &["unknown-name"], false, name_misspelt),
    class(
        "statement or clause misspelt",
        &[
            "unknown-statement",
            "unreadable-line",
            "unknown-unit",
            "unknown-name",
        ],
        false,
        word_misspelt,
    ),
    class(
        "layer dropped or doubled beside a lattice",
        &["open-cell", "missing-lattice"],
        false,
        layer_beside_lattice,
    ),
    class(
        "layer dropped or doubled",
        &["open-cell", "missing-lattice", "closed-gap"],
        true,
        layer,
    ),
    class(
        "partner missing or unequal",
        &["lone-component"],
        false,
        partner,
    ),
    class(
        "wave off the lattice",
        &[
            "off-lattice-wave",
            "seam-step",
            "seam-kink",
            "join-step",
            "join-kink",
        ],
        false,
        off_lattice,
    ),
    class(
        "step at a seam or join",
        &["seam-step", "join-step", "open-cell", "sharp-sample"],
        false,
        step,
    ),
    class(
        "kink at a seam or join",
        &["seam-kink", "join-kink"],
        false,
        kink,
    ),
    class(
        "material renamed or left over",
        &["unknown-name", "unused-name"],
        false,
        stale,
    ),
    class("filled too high", &["filled-past-bands"], true, filling),
    class("tolerance too wide", &["target-at-risk"], true, tolerance),
    class(
        "target missed",
        &["target-missed", "clashing-targets"],
        false,
        target,
    ),
    class("atoms clashing", &["clashing-atoms"], false, atoms),
    class(
        "line half deleted",
        &[
            "unreadable-line",
            "unknown-statement",
            "missing-unit",
            "unknown-unit",
            "unknown-name",
            "reasonless-waiver",
            "wrong-unit",
            "odd-mass",
            "unit-slip",
            "flat-lattice",
            "stray-character",
            "missing-file",
            "missing-lattice",
        ],
        false,
        half,
    ),
    class(
        "foreign line pasted",
        &[
            "unreadable-line",
            "unknown-statement",
            "stray-character",
            "misplaced-statement",
            "repeated-statement",
        ],
        false,
        foreign,
    ),
    class(
        "name that stands for itself",
        &["circular-name", "circular-use"],
        false,
        circle,
    ),
];

const fn class(
    name: &'static str,
    rules: &'static [&'static str],
    by_target: bool,
    faults: fn(&Models) -> Vec<Fault>,
) -> Class {
    Class {
        name,
        rules,
        by_target,
        faults,
    }
}

/// Statements that say how a structure is made.
const STRUCTURE: [&str; 16] = [
    "layer",
    "lattice",
    "mass",
    "edge",
    "depth",
    "cosine",
    "fourier",
    "site",
    "delta",
    "profile",
    "monolayer",
    "nonparabolic",
    "let",
    "recoil",
    "formfactor",
    "temperature",
];

fn each_line(models: &Models, mut of: impl FnMut(usize, &str, &Line)) {
    for (file, (name, text)) in models.files.iter().enumerate() {
        if name.ends_with(".cren") {
            for line in statements(text) {
                of(file, text, &line);
            }
        }
    }
}

/// Where a fault on a line shows: there, or, of a named value, wherever the name stands.
fn shows(line: &Line) -> Lines {
    match line.word.as_str() {
        "let" => Lines::Holding(line.text.split_whitespace().nth(1).unwrap().to_owned()),
        _ => Lines::These(vec![line.index]),
    }
}

/// Faults that replace a line by others.
fn by_line(models: &Models, new: impl Fn(&Line) -> Vec<String>) -> Vec<Fault> {
    let mut faults = Vec::new();
    each_line(models, |file, text, line| {
        for new in new(line) {
            faults.push(Fault {
                file,
                text: replaced(text, line.index, Some(&new)),
                lines: shows(line),
                what: format!("{} → {}", line.text.trim(), new.trim()),
            });
        }
    });
    faults
}

fn is_structure(line: &Line) -> bool {
    STRUCTURE.contains(&line.word.as_str())
}

/// A line's own sizes: no tolerances, no zeros.
fn sizes(line: &Line) -> Vec<Number> {
    let all = numbers(&line.text).into_iter();
    all.filter(|number| !number.tolerance && !number.unit.is_empty() && number.value != 0.0)
        .collect()
}

fn with_unit(line: &Line, number: &Number, unit: &str) -> String {
    spliced(&line.text, number.unit_start, number.unit_end, unit)
}

fn with_value(line: &Line, number: &Number, value: f64) -> String {
    spliced(&line.text, number.start, number.end, &written(value))
}

fn thousand(models: &Models) -> Vec<Fault> {
    let off = |unit: &str| -> &[&str] {
        match unit {
            "meV" => &["eV", "ueV"],
            "eV" => &["meV", "keV"],
            "nm" => &["um", "pm"],
            "me" => &["u"],
            "u" => &["me"],
            "K" => &["mK"],
            _ => &[],
        }
    };
    by_line(models, |line| match is_structure(line) {
        true => sizes(line)
            .iter()
            .flat_map(|number| {
                off(&number.unit)
                    .iter()
                    .map(|unit| with_unit(line, number, unit))
            })
            .collect(),
        false => Vec::new(),
    })
}

fn ten(models: &Models) -> Vec<Fault> {
    by_line(models, |line| {
        if !is_structure(line) || line.word == "mass" {
            return Vec::new();
        }
        let sizes = sizes(line);
        let sizes = sizes.iter().filter(|number| number.unit != "deg");
        sizes
            .flat_map(|number| {
                [10.0, 0.1].map(|factor| with_value(line, number, number.value * factor))
            })
            .collect()
    })
}

fn mass(models: &Models) -> Vec<Fault> {
    by_line(models, |line| {
        let behind = line.text.rfind("mass").unwrap_or(usize::MAX);
        let states = is_structure(line) || line.text.contains("let atom");
        let masses = sizes(line).into_iter();
        masses
            .filter(|number| states && (number.start > behind || line.word == "let"))
            .filter(|number| number.unit == "me" || number.unit == "u")
            .flat_map(|number| {
                [10.0, 0.1].map(|factor| with_value(line, &number, number.value * factor))
            })
            .collect()
    })
}

fn sign(models: &Models) -> Vec<Fault> {
    by_line(models, |line| {
        if !is_structure(line) {
            return Vec::new();
        }
        let swapped =
            sizes(line)
                .into_iter()
                .map(|number| match line.text[..number.start].ends_with('-') {
                    true => spliced(&line.text, number.start - 1, number.start, ""),
                    false => spliced(&line.text, number.start, number.start, "-"),
                });
        swapped.collect()
    })
}

fn dimension(models: &Models) -> Vec<Fault> {
    let other = |unit: &str| match unit {
        "nm" | "ML" | "um" => Some("meV"),
        "meV" | "eV" | "Er" | "K" => Some("nm"),
        "me" | "u" => Some("K"),
        _ => None,
    };
    by_line(models, |line| {
        let numbers = numbers(&line.text);
        let wrong = numbers
            .iter()
            .filter_map(|number| other(&number.unit).map(|unit| with_unit(line, number, unit)));
        wrong.collect()
    })
}

fn unitless(models: &Models) -> Vec<Fault> {
    by_line(models, |line| {
        let numbers = numbers(&line.text);
        let bare = numbers
            .iter()
            .filter(|number| !number.unit.is_empty() && number.unit != "%" && number.value != 0.0)
            .map(|number| spliced(&line.text, number.end, number.unit_end, ""));
        bare.collect()
    })
}

fn unit_misspelt(models: &Models) -> Vec<Fault> {
    let swapped = |unit: &str| -> String {
        unit.chars()
            .map(|letter| match letter.is_lowercase() {
                true => letter.to_ascii_uppercase(),
                false => letter.to_ascii_lowercase(),
            })
            .collect()
    };
    let mut faults = by_line(models, |line| {
        let numbers = numbers(&line.text);
        let named = numbers
            .iter()
            .filter(|number| !number.unit.is_empty() && number.unit != "%");
        named
            .flat_map(|number| {
                let doubled = format!("{0}{1}", number.unit, number.unit.chars().last().unwrap());
                [doubled, swapped(&number.unit)].map(|unit| with_unit(line, number, &unit))
            })
            .collect()
    });
    // A unit that is not one is wrong where it stands, in a `let` too.
    for fault in &mut faults {
        if let Lines::Holding(name) = &fault.lines {
            let at = fault
                .text
                .lines()
                .position(|line| line.trim().starts_with(&format!("let {name}")));
            fault.lines = Lines::These(vec![at.unwrap()]);
        }
    }
    faults
}

/// The names that models define: of values, materials, crystals, measures.
fn names(models: &Models) -> Vec<String> {
    let mut names = Vec::new();
    each_line(models, |_, _, line| {
        if ["let", "material", "crystal", "measure"].contains(&line.word.as_str()) {
            names.extend(line.text.split_whitespace().nth(1).map(str::to_owned));
        }
    });
    names.sort();
    names.dedup();
    names
}

/// Byte ranges of a word in a line, strings left out.
fn occurrences(line: &str, word: &str) -> Vec<usize> {
    let whole = |at: usize| {
        let part =
            |sign: Option<char>| sign.is_some_and(|sign| sign.is_alphanumeric() || sign == '_');
        let quoted = line[..at].matches('"').count() % 2 == 1;
        !quoted && !part(line[..at].chars().last()) && !part(line[at + word.len()..].chars().next())
    };
    line.match_indices(word)
        .map(|(at, _)| at)
        .filter(|at| whole(*at))
        .collect()
}

/// Two ways to misspell a word: a letter left out, two letters swapped.
fn misspelt(word: &str) -> Vec<String> {
    let letters: Vec<char> = word.chars().collect();
    let middle = letters.len() / 2;
    let mut short = letters.clone();
    short.remove(middle);
    let mut swapped = letters.clone();
    if middle > 0 {
        swapped.swap(middle - 1, middle);
    }
    let made: [String; 2] = [short, swapped].map(|letters| letters.into_iter().collect());
    made.into_iter()
        .filter(|made| made != word && !made.is_empty())
        .collect()
}

fn name_misspelt(models: &Models) -> Vec<Fault> {
    let names = names(models);
    by_line(models, |line| {
        let defines = ["let", "material", "crystal", "measure"].contains(&line.word.as_str());
        let own = line.text.split_whitespace().nth(1).filter(|_| defines);
        let mut made = Vec::new();
        for name in names.iter().filter(|name| own != Some(name.as_str())) {
            for at in occurrences(&line.text, name) {
                let wrong = misspelt(name)
                    .into_iter()
                    .filter(|wrong| !names.contains(wrong));
                made.extend(wrong.map(|wrong| spliced(&line.text, at, at + name.len(), &wrong)));
            }
        }
        made
    })
}

fn word_misspelt(models: &Models) -> Vec<Fault> {
    let clauses = [
        "of", "at", "by", "to", "in", "and", "within", "between", "phase", "sigma", "like",
        "because", "chain", "square", "gap", "width", "direct",
    ];
    let names = names(models);
    let mut faults = by_line(models, |line| {
        let mut made = Vec::new();
        let start = line.text.len() - line.text.trim_start().len();
        for wrong in misspelt(&line.word) {
            made.push(spliced(&line.text, start, start + line.word.len(), &wrong));
        }
        for clause in clauses {
            for at in occurrences(&line.text, clause)
                .into_iter()
                .filter(|at| *at > start)
            {
                let wrong = misspelt(clause)
                    .into_iter()
                    .filter(|wrong| !names.contains(wrong));
                made.extend(wrong.map(|wrong| spliced(&line.text, at, at + clause.len(), &wrong)));
            }
        }
        made
    });
    for fault in &mut faults {
        if let Lines::Holding(_) = &fault.lines {
            let original = statements(&models.files[fault.file].1);
            let changed = original.iter().find(|line| {
                fault.text.lines().nth(line.index).map(|new| new.trim_end())
                    != Some(line.text.as_str())
                    && line.word == "let"
            });
            fault.lines = Lines::These(vec![changed.unwrap().index]);
        }
    }
    faults
}

/// A line taken out, and the same line twice.
fn dropped_and_doubled(text: &str, line: &Line) -> [(String, &'static str); 2] {
    let twice = format!("{0}\n{0}", line.text);
    [
        (replaced(text, line.index, None), "dropped"),
        (replaced(text, line.index, Some(&twice)), "doubled"),
    ]
}

fn layers_of(all: &[Line], heading: Option<usize>) -> impl Iterator<Item = &Line> {
    all.iter()
        .filter(move |line| line.heading == heading && line.word == "layer")
}

fn layer_beside_lattice(models: &Models) -> Vec<Fault> {
    let mut faults = Vec::new();
    each_line(models, |file, text, line| {
        let all = statements(text);
        let lattice = all
            .iter()
            .find(|other| other.heading == line.heading && other.word == "lattice");
        if line.word != "layer" || lattice.is_none() {
            return;
        }
        for (text, what) in dropped_and_doubled(text, line) {
            let after = statements(&text);
            let near = after.iter().filter(|other| {
                other.heading == line.heading && ["layer", "lattice"].contains(&other.word.as_str())
            });
            faults.push(Fault {
                file,
                lines: Lines::These(near.map(|line| line.index).collect()),
                text,
                what: format!("{what}: {}", line.text.trim()),
            });
        }
    });
    faults
}

fn layer(models: &Models) -> Vec<Fault> {
    let mut faults = Vec::new();
    each_line(models, |file, text, line| {
        let all = statements(text);
        let states = all
            .iter()
            .any(|other| other.heading == line.heading && other.word == "lattice");
        if line.word != "layer" || states {
            return;
        }
        for (text, what) in dropped_and_doubled(text, line) {
            let after = statements(&text);
            let mut lines: Vec<usize> = layers_of(&after, line.heading)
                .map(|line| line.index)
                .collect();
            lines.extend(line.heading);
            faults.push(Fault {
                file,
                text,
                lines: Lines::These(lines),
                what: format!("{what}: {}", line.text.trim()),
            });
        }
    });
    faults
}

fn partner(models: &Models) -> Vec<Fault> {
    let mut faults = Vec::new();
    each_line(models, |file, text, line| {
        if line.word != "fourier" {
            return;
        }
        let stated = numbers(&line.text);
        let energy = stated.iter().find(|number| number.unit == "meV").unwrap();
        let phase = stated.last().unwrap();
        let index = stated.first().unwrap();
        for text in [
            replaced(text, line.index, None),
            replaced(
                text,
                line.index,
                Some(&with_value(line, energy, energy.value * 1.1)),
            ),
            replaced(
                text,
                line.index,
                Some(&with_value(line, phase, phase.value + 0.1)),
            ),
            replaced(
                text,
                line.index,
                Some(&with_value(line, index, index.value + 2.0)),
            ),
        ] {
            let after = statements(&text);
            let others = after
                .iter()
                .filter(|other| other.heading == line.heading && other.word == "fourier");
            let lines = others.map(|line| line.index).collect();
            faults.push(Fault {
                file,
                text,
                lines: Lines::These(lines),
                what: line.text.trim().to_owned(),
            });
        }
    });
    faults
}

fn off_lattice(models: &Models) -> Vec<Fault> {
    let mut faults = by_line(models, |line| {
        if line.word != "profile" || !line.text.contains("sin") {
            return Vec::new();
        }
        let (clause, formula) = line.text.split_once('=').unwrap();
        let changed = ["1.1*pi", "1.5*pi", "0.7*pi", "3"]
            .map(|wrong| format!("{clause}={}", formula.replace("pi", wrong)));
        changed.to_vec()
    });
    // A piece that does not fit its stretch shows at either of its ends.
    for fault in &mut faults {
        let Lines::These(own) = &fault.lines else {
            continue;
        };
        let all = statements(&models.files[fault.file].1);
        let line = all.iter().find(|line| own.contains(&line.index)).unwrap();
        fault.lines = Lines::These(family(&models.files[fault.file].1, line));
    }
    // The lattice moves on under a profile in nanometres.
    each_line(models, |file, text, line| {
        let all = statements(text);
        let fixed = all.iter().find(|other| {
            other.heading == line.heading
                && other.word == "profile"
                && other.text.contains("sin(pi*x/6 nm)")
        });
        if let (Some(profile), "lattice") = (fixed, line.word.as_str()) {
            for length in ["6.5", "5", "7"] {
                let new = line.text.replace('6', length);
                faults.push(Fault {
                    file,
                    text: replaced(text, line.index, Some(&new)),
                    lines: Lines::These(vec![profile.index, line.index]),
                    what: new,
                });
            }
        }
    });
    faults
}

/// The lines of the same statement in the same section.
fn family(text: &str, line: &Line) -> Vec<usize> {
    let all = statements(text);
    let same = all
        .iter()
        .filter(|other| other.heading == line.heading && other.word == line.word);
    same.map(|line| line.index).collect()
}

fn profiles(models: &Models, added: &[&str]) -> Vec<Fault> {
    let mut faults = Vec::new();
    each_line(models, |file, text, line| {
        if line.word == "profile" {
            for added in added {
                let new = format!("{} + {added}", line.text);
                faults.push(Fault {
                    file,
                    text: replaced(text, line.index, Some(&new)),
                    lines: Lines::These(family(text, line)),
                    what: new.trim().to_owned(),
                });
            }
        }
    });
    faults
}

fn step(models: &Models) -> Vec<Fault> {
    let mut faults = profiles(
        models,
        &["8 meV*x/period", "30 meV*x/period", "20 meV*(x/period)^3"],
    );
    // The last sample of a table is another than the first.
    for (file, (name, text)) in models.files.iter().enumerate() {
        if !name.ends_with(".csv") {
            continue;
        }
        let last = text.lines().count() - 1;
        let (position, energy) = text.lines().last().unwrap().split_once(',').unwrap();
        let energy: f64 = energy.parse().unwrap();
        for more in [5.0, 20.0, -10.0] {
            let row = format!("{position},{:.4}", energy + more);
            faults.push(Fault {
                file,
                text: replaced(text, last, Some(&row)),
                lines: Lines::Holding(format!("\"{name}\"")),
                what: format!("{name}: the last sample {more} higher"),
            });
        }
    }
    faults
}

fn kink(models: &Models) -> Vec<Fault> {
    let whole = "20 meV*(x/period)*(1 - x/period)";
    let second = "20 meV*(x/period - 0.5)*(1 - x/period)";
    let first = "20 meV*(x/period)*(0.5 - x/period)";
    let kinks = profiles(models, &[whole, second, first]).into_iter();
    // Each fits the piece that it vanishes at both ends of; the bowls are meant to have a kink.
    kinks
        .filter(|fault| {
            let piece = fault.what.split('=').next().unwrap_or("");
            match piece {
                _ if piece.contains("0 to period ") => fault.what.ends_with(whole),
                _ if piece.contains("0 to period/2 ") && !piece.contains('-') => {
                    fault.what.ends_with(first)
                }
                _ if piece.contains("period/2 to period ") => fault.what.ends_with(second),
                _ => false,
            }
        })
        .collect()
}

fn stale(models: &Models) -> Vec<Fault> {
    let mut faults = Vec::new();
    let names = names(models);
    each_line(models, |file, text, line| {
        if line.word != "material" {
            return;
        }
        let name = line.text.split_whitespace().nth(1).unwrap();
        let mut used = false;
        each_line(models, |_, _, other| {
            used |= other.word != "material" && !occurrences(&other.text, name).is_empty();
        });
        for wrong in misspelt(name)
            .into_iter()
            .filter(|wrong| used && !names.contains(wrong))
        {
            faults.push(Fault {
                file,
                text: replaced(text, line.index, Some(&line.text.replacen(name, &wrong, 1))),
                lines: Lines::Holding(format!("of {name}")),
                what: format!("material {name} is now {wrong}"),
            });
        }
    });
    for (file, (name, text)) in models.files.iter().enumerate() {
        let crystals = statements(text).iter().any(|line| line.word == "crystal");
        if name.ends_with(".cren") && crystals {
            {
                let old = "material old_bank\n  mass 0.09 me\n  edge 210 meV\n";
                let lines = text.lines().count();
                faults.push(Fault {
                    file,
                    text: format!("{text}{old}"),
                    lines: Lines::These(vec![lines]),
                    what: "a material that nothing uses".to_owned(),
                });
            }
            let named = format!("let old_well = 5 nm\n{text}");
            if !text.starts_with("use") {
                faults.push(Fault {
                    file,
                    text: named,
                    lines: Lines::These(vec![0]),
                    what: "a value that nothing uses".to_owned(),
                });
            }
        }
    }
    faults
}

fn filling(models: &Models) -> Vec<Fault> {
    let mut faults = Vec::new();
    each_line(models, |file, text, line| {
        if line.word != "filling" {
            return;
        }
        let stated = numbers(&line.text).remove(0);
        let all = statements(text);
        let bands = all
            .iter()
            .find(|other| other.heading == line.heading && other.word == "bands");
        let most = bands.map_or(6.0, |bands| 2.0 * numbers(&bands.text)[0].value);
        for more in [0.5, 1.0, 2.0, 6.0] {
            let new = with_value(line, &stated, most + more);
            let new = match bands {
                Some(_) => new,
                None => format!("{new}\n  bands 3"),
            };
            let section = statements(text)
                .into_iter()
                .filter(|other| other.heading == line.heading);
            faults.push(Fault {
                file,
                text: replaced(text, line.index, Some(&new)),
                lines: Lines::These(
                    section
                        .filter(|other| ["filling", "bands"].contains(&other.word.as_str()))
                        .map(|line| line.index)
                        .collect(),
                ),
                what: new.trim().replace('\n', ";"),
            });
        }
        // Another class: whole bands turn into a half-filled one, and the other way round.
        let other = if stated.value.fract() == 0.0 {
            stated.value + 1.0
        } else {
            2.0
        };
        faults.push(Fault {
            file,
            text: replaced(text, line.index, Some(&with_value(line, &stated, other))),
            lines: Lines::These(vec![line.index]),
            what: format!("filling {other}"),
        });
    });
    faults
}

/// How wide a tolerance is tried.
pub const WIDE: f64 = 0.4;

fn tolerance(models: &Models) -> Vec<Fault> {
    by_line(models, |line| {
        let may = is_structure(line)
            && ![
                "profile",
                "formfactor",
                "temperature",
                "monolayer",
                "recoil",
            ]
            .contains(&line.word.as_str());
        if !may || line.text.contains('±') {
            return Vec::new();
        }
        let sizes = sizes(line)
            .into_iter()
            .filter(|number| number.unit != "deg");
        sizes
            .map(|number| {
                let end = match line.text[number.unit_end..].starts_with("*nm") {
                    true => number.unit_end + 3,
                    false => number.unit_end,
                };
                spliced(&line.text, end, end, &format!(" ± {} %", 100.0 * WIDE))
            })
            .collect()
    })
}

/// The same fault without the tolerance, at one of its ends: what the wide tolerance allows.
pub fn ends_of_tolerance(models: &Models, fault: &Fault) -> Vec<String> {
    let mark = format!(" ± {} %", 100.0 * WIDE);
    let original = &models.files[fault.file].1;
    let index = fault
        .text
        .lines()
        .position(|line| line.contains(&mark) && !original.lines().any(|old| old == line))
        .unwrap();
    let line = fault.text.lines().nth(index).unwrap().to_owned();
    let at = line.find(&mark).unwrap();
    let plain = line.replacen(&mark, "", 1);
    let number = numbers(&plain)
        .into_iter()
        .rfind(|number| number.start < at)
        .unwrap();
    [1.0 - WIDE, 1.0 + WIDE]
        .map(|factor| {
            let new = spliced(
                &plain,
                number.start,
                number.end,
                &written(number.value * factor),
            );
            replaced(&fault.text, index, Some(&new))
        })
        .to_vec()
}

/// Targets are moved by what their values are: see the test.
fn target(_: &Models) -> Vec<Fault> {
    Vec::new()
}

fn atoms(models: &Models) -> Vec<Fault> {
    let mut faults = Vec::new();
    each_line(models, |file, text, line| {
        if line.word != "atom" {
            return;
        }
        let all = statements(text);
        let lines = family(text, line);
        let Some(other) = all.iter().find(|other| {
            other.word == "atom" && other.heading == line.heading && other.index != line.index
        }) else {
            return;
        };
        let (head, own) = line.text.split_once(" at ").unwrap();
        let (_, position) = other.text.split_once(" at ").unwrap();
        let moved = position.replacen("0.5", "1.5", 1).replacen("(0,", "(1,", 1);
        let mut more = lines.clone();
        more.push(line.index + 1);
        more.push(lines.iter().max().unwrap() + 1);
        let third = format!("{}\n  atom      A at {own}", line.text);
        for (new, lines) in [
            (format!("{head} at {position}"), lines.clone()),
            (format!("{head} at {moved}"), lines.clone()),
            (third, more),
        ] {
            faults.push(Fault {
                file,
                text: replaced(text, line.index, Some(&new)),
                lines: Lines::These(lines),
                what: new.replace('\n', ";"),
            });
        }
    });
    faults
}

fn half(models: &Models) -> Vec<Fault> {
    let mut faults = Vec::new();
    each_line(models, |file, text, line| {
        let plain = line.text.trim_end();
        let start = plain.len() - plain.trim_start().len();
        let mut middle = start + (plain.len() - start) / 2;
        while !plain.is_char_boundary(middle) {
            middle += 1;
        }
        let last = plain
            .trim_start()
            .rfind(char::is_whitespace)
            .map(|at| start + at);
        for cut in [Some(middle), last].into_iter().flatten() {
            let left = plain[..cut].trim_end();
            faults.push(Fault {
                file,
                text: replaced(text, line.index, Some(left)),
                lines: match line.word.as_str() {
                    "let" if left.contains('=') => shows(line),
                    _ => Lines::These(vec![line.index]),
                },
                what: format!("{} → {}", plain.trim(), left.trim()),
            });
        }
    });
    faults
}

fn foreign(models: &Models) -> Vec<Fault> {
    let anywhere = [
        "<<<<<<< ours",
        "=======",
        "for (i = 0; i < n; i++) {",
        "{\"mass\": 0.067}",
        "- name: build",
        "The wall is 2.6 nm thick.",
        "x = linspace(0, 8, 100)",
        "0.5, 1.2, 3.4",
        "mass: 0.067",
        "import materials",
    ];
    let crystal = [
        "edge 0 meV",
        "nonparabolic 700 meV",
        "use \"other.cren\"",
        "rate 1",
        "layers 5 nm of basin",
    ];
    let material = [
        "filling 2",
        "layer 5 nm of basin",
        "require gap 1 >= 60 meV",
        "lattice chain 8 nm",
        "cosine 1 = 3 meV",
    ];
    let mut faults = Vec::new();
    each_line(models, |file, text, line| {
        if !["crystal", "material"].contains(&line.word.as_str()) {
            return;
        }
        let own = if line.word == "crystal" {
            crystal
        } else {
            material
        };
        for pasted in anywhere.iter().chain(&own) {
            faults.push(Fault {
                file,
                text: replaced(
                    text,
                    line.index,
                    Some(&format!("{}\n  {pasted}", line.text)),
                ),
                lines: Lines::These(vec![line.index + 1]),
                what: format!("{}: {pasted}", line.text.trim()),
            });
        }
    });
    faults
}

fn circle(models: &Models) -> Vec<Fault> {
    by_line(models, |line| {
        let words: Vec<&str> = line.text.split_whitespace().collect();
        match words.as_slice() {
            ["let", name, ..] => vec![
                format!("let {name} = 2*{name}"),
                format!("let {name} = {name} + 1 nm"),
            ],
            ["crystal" | "material", name, ..] => vec![format!("{} {name} like {name}", line.word)],
            _ => Vec::new(),
        }
    })
}
