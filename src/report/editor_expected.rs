//! What a number stands for where it is written: so that its own units alone are proposed.

use crate::model::Dimension;
use crate::syntax::words;

/// The dimension of a number that follows these words of its line; `None` where the form of the statement does not tell.
pub(super) fn dimension_after(typed: &[&str]) -> Option<Dimension> {
    let (first, _) = typed.split_first()?;
    let before = typed.last()?;
    if *first == "site" {
        return match *before {
            shape if words::SHAPES.contains(&shape) => Some(Dimension::ENERGY),
            "sigma" | "width" | "size" | "radius" | "by" | "at" => Some(Dimension::LENGTH),
            _ => None,
        };
    }
    let form = match (*first, typed) {
        ("lattice", [_, kind, ..]) => words::lattice(kind)?.form,
        _ => words::statement(first)?.form,
    };
    let letters: Vec<&str> = form
        .split([' ', '[', ']', ',', '…'])
        .filter(|word| !word.is_empty())
        .collect();
    let pairs = letters.windows(2);
    let mut meant = pairs.filter_map(|pair| match pair {
        [word, letter] if word == before => dimension_of(letter),
        _ => None,
    });
    // A material's name may be written with the letter of a mass.
    meant.next().filter(|_| *before != "of")
}

/// The dimension of a letter of the reference's forms.
fn dimension_of(letter: &str) -> Option<Dimension> {
    match letter {
        "L" | "X" => Some(Dimension::LENGTH),
        "E" => Some(Dimension::ENERGY),
        "S" => Some(Dimension::ENERGY_LENGTH),
        "M" => Some(Dimension::MASS),
        "T" => Some(Dimension::TEMPERATURE),
        "A" => Some(Dimension::NUMBER),
        _ => None,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_have_the_dimension_of_their_place() {
        let after = |line: &str| dimension_after(&line.split(' ').collect::<Vec<_>>());
        for (line, wanted) in [
            ("edge", Some(Dimension::ENERGY)),
            ("mass", Some(Dimension::MASS)),
            ("layer", Some(Dimension::LENGTH)),
            ("layer 5 nm at", Some(Dimension::ENERGY)),
            ("layer 5 nm at 3 eV mass", Some(Dimension::MASS)),
            ("stack 20 times", Some(Dimension::LENGTH)),
            ("lattice oblique 3 nm by", Some(Dimension::LENGTH)),
            (
                "lattice oblique 3 nm by 4 nm angle",
                Some(Dimension::NUMBER),
            ),
            ("lattice fcc", Some(Dimension::LENGTH)),
            ("cosine 1 =", Some(Dimension::ENERGY)),
            ("cosine 1 = 5 meV phase", Some(Dimension::NUMBER)),
            ("site gaussian", Some(Dimension::ENERGY)),
            ("site gaussian 5 meV sigma", Some(Dimension::LENGTH)),
            ("temperature", Some(Dimension::TEMPERATURE)),
            ("require gap 1 >=", None),
            ("let a =", None),
            ("layer 5 nm of", None),
        ] {
            assert_eq!(after(line), wanted, "{line}");
        }
    }
}
