//! Semantic tokens.

use tower_lsp::lsp_types::{
    SemanticToken, SemanticTokenModifier, SemanticTokenType, SemanticTokens, SemanticTokensLegend,
};

use super::positions;
use super::scene::Scene;
use crate::report::editor_tokens::{TokenSort, tokens};
use crate::text::Span;

/// Our sorts under the protocol's names, which every colour scheme knows; the order is that of the legend.
const TYPES: [(TokenSort, SemanticTokenType); 14] = [
    (TokenSort::Keyword, SemanticTokenType::KEYWORD),
    (TokenSort::Material, SemanticTokenType::CLASS),
    (TokenSort::Crystal, SemanticTokenType::STRUCT),
    (TokenSort::Value, SemanticTokenType::VARIABLE),
    (TokenSort::Measure, SemanticTokenType::VARIABLE),
    (TokenSort::Atom, SemanticTokenType::PARAMETER),
    (TokenSort::Quantity, SemanticTokenType::PROPERTY),
    (TokenSort::Unit, SemanticTokenType::TYPE),
    (TokenSort::Function, SemanticTokenType::FUNCTION),
    (TokenSort::Choice, SemanticTokenType::ENUM_MEMBER),
    (TokenSort::Rule, SemanticTokenType::DECORATOR),
    (TokenSort::Number, SemanticTokenType::NUMBER),
    (TokenSort::Text, SemanticTokenType::STRING),
    (TokenSort::Comment, SemanticTokenType::COMMENT),
];

/// The names that the tokens' numbers stand for.
pub(super) fn legend() -> SemanticTokensLegend {
    SemanticTokensLegend {
        token_types: TYPES.iter().map(|(_, name)| name.clone()).collect(),
        token_modifiers: vec![SemanticTokenModifier::DEFINITION],
    }
}

/// The tokens that touch `within`, or all.
pub(super) fn semantic(scene: &Scene, within: Option<Span>) -> SemanticTokens {
    let encoding = scene.abilities.encoding();
    let lines = scene.view.file.lines();
    let mut last = tower_lsp::lsp_types::Position::default();
    let mut data = Vec::new();
    for token in tokens(scene.tree()) {
        if within
            .is_some_and(|within| token.span.end < within.start || within.end < token.span.start)
        {
            continue;
        }
        let range = positions::range(lines, token.span, encoding);
        let line = range.start.line - last.line;
        let start = if line == 0 {
            range.start.character - last.character
        } else {
            range.start.character
        };
        let number = TYPES
            .iter()
            .position(|(sort, _)| *sort == token.sort)
            .unwrap_or_default();
        data.push(SemanticToken {
            delta_line: line,
            delta_start: start,
            length: range.end.character.saturating_sub(range.start.character),
            token_type: u32::try_from(number).unwrap_or_default(),
            token_modifiers_bitset: u32::from(token.defines),
        });
        last = range.start;
    }
    SemanticTokens {
        result_id: None,
        data,
    }
}
