//! The parser that pest derives from `grammar/crenate.pest`.

#![allow(missing_docs)]

use std::sync::LazyLock;

use pest::iterators::Pair;
use pest::pratt_parser::{Assoc, Op, PrattParser};
use pest_derive::Parser;

/// Reads one logical line by one of its rules.
#[derive(Parser)]
#[grammar = "grammar/crenate.pest"]
pub(super) struct LineParser;

/// Binding of the operators, loosest first.
pub(super) static OPERATORS: LazyLock<PrattParser<Rule>> = LazyLock::new(|| {
    PrattParser::new()
        .op(Op::infix(Rule::add, Assoc::Left) | Op::infix(Rule::subtract, Assoc::Left))
        .op(Op::infix(Rule::multiply, Assoc::Left) | Op::infix(Rule::divide, Assoc::Left))
        .op(Op::prefix(Rule::negative))
        .op(Op::infix(Rule::caret, Assoc::Right))
});

/// The rule that reads a line beginning with `word`, if it is a statement's or a heading's.
pub(super) fn line_rule(word: &str) -> Option<Rule> {
    Some(match word {
        "material" => Rule::material_line,
        "crystal" => Rule::crystal_line,
        "use" => Rule::use_line,
        "let" => Rule::let_line,
        "waive" => Rule::waive_line,
        "mass" | "edge" | "monolayer" | "nonparabolic" | "rate" | "filling" | "temperature"
        | "recoil" => Rule::value_line,
        "source" | "title" => Rule::text_line,
        "degeneracy" | "bands" => Rule::count_line,
        "carriers" => Rule::carriers_line,
        "lattice" => Rule::lattice_line,
        "layer" => Rule::layer_line,
        "stack" => Rule::stack_line,
        "delta" => Rule::delta_line,
        "profile" => Rule::profile_line,
        "table" => Rule::table_line,
        "cosine" | "depth" | "fourier" => Rule::wave_line,
        "site" => Rule::site_line,
        "atom" => Rule::atom_line,
        "formfactor" => Rule::formfactor_line,
        "measure" => Rule::measure_line,
        "require" => Rule::require_line,
        _ => return None,
    })
}

/// First byte and first byte past the last leaf of a pair: without the blanks that an absent optional part leaves behind it.
pub(super) fn extent(pair: &Pair<'_, Rule>) -> (usize, usize) {
    let start = pair.as_span().start();
    let mut last = pair.clone();
    while let Some(inner) = last.clone().into_inner().next_back() {
        last = inner;
    }
    (start, last.as_span().end())
}
