//! Says in plain words what would have been readable at a place, and what stands there.

use super::grammar::Rule;
use super::tokens::{Token, TokenKind};

/// Longest piece of the user's text that a message quotes, in characters.
const QUOTE_LIMIT: usize = 24;

/// Where reading stopped: the tokens around it and what the grammar tried there.
pub(super) struct Stop<'t> {
    /// The line's first word.
    pub(super) statement: &'t str,
    /// The tokens before, the nearest last.
    pub(super) before: &'t [Token<'t>],
    /// The offending token; none at the end of the line.
    pub(super) token: Option<Token<'t>>,
    /// What the grammar tried.
    pub(super) tried: &'t [Rule],
}

/// What stands there, shortened and quoted.
pub(super) fn found(token: Option<Token<'_>>) -> String {
    let Some(token) = token else {
        return "the end of the line".to_owned();
    };
    let mut shown: String = token.text.chars().take(QUOTE_LIMIT).collect();
    if shown.len() < token.text.len() {
        shown.push('…');
    }
    format!("`{shown}`")
}

impl Stop<'_> {
    /// What would have been readable.
    pub(super) fn expected(&self) -> String {
        if let Some(words) = self.special() {
            return words;
        }
        let mut words = self.alternatives();
        // Words to type come before words that describe.
        words.sort_by_key(|word| !word.starts_with('`'));
        let operator = self.tried.iter().any(|rule| is_operator(*rule));
        if words.is_empty() && operator {
            words.push("an operator".to_owned());
        }
        if self.tried.contains(&Rule::EOI) {
            words.push("the end of the line".to_owned());
        }
        if words.is_empty() {
            words.push("something else".to_owned());
        }
        join(&words)
    }

    fn previous(&self, back: usize) -> Option<Token<'_>> {
        let position = self.before.len().checked_sub(back)?;
        self.before.get(position).copied()
    }

    fn previous_text(&self, back: usize) -> &str {
        match self.previous(back) {
            Some(token) if token.kind != TokenKind::Number => token.text,
            _ => "",
        }
    }

    fn tries(&self, rule: Rule) -> bool {
        self.tried.contains(&rule)
    }

    /// Mistakes that a hint helps more with than a list does.
    fn special(&self) -> Option<String> {
        if self.statement == "require" && self.before.len() == 2 && self.token.is_none() {
            return self.lonely_requirement();
        }
        let token = self.token?;
        let wants_value = self.wants_value();
        let words = match token.text {
            _ if token.kind == (TokenKind::Text { closed: false }) => "a closing `\"` on this line",
            "+" | "-" | "−" if wants_value && matches!(self.previous_text(1), "+" | "-" | "−") => {
                "a value (a sign after a sign needs parentheses)"
            }
            "+" | "-" | "−" if wants_value && matches!(self.previous_text(1), "±" | "+/-") => {
                "a tolerance that is not negative"
            }
            "+" if wants_value => "a value (without a leading `+`)",
            "*" if wants_value && self.previous_text(1) == "*" => {
                "a value (a power is written `^`)"
            }
            "=" if wants_value && self.previous_text(1) == "=" => {
                "a value (equality is a single `=`)"
            }
            ">" if wants_value && self.previous_text(1) == "=" => "a value (at least is `>=`)",
            "<" if wants_value && self.previous_text(1) == "=" => "a value (at most is `<=`)",
            "," if self.tries(Rule::close) && !self.tries(Rule::comma) => {
                "an operator or `)` (only a position is a tuple)"
            }
            "," if self.tries(Rule::multiply) && self.follows_digits(token) => {
                "an operator or the end of the line (decimals are written with `.`)"
            }
            _ if self.tries(Rule::w_like) && token.kind != TokenKind::Word => {
                "`like` or the end of the line (a name is letters, digits and `_`)"
            }
            _ if self.after_tuple() && !self.before.is_empty() => {
                "the end of the line (a tuple takes no operators)"
            }
            "+" | "-" | "−" if self.tries(Rule::multiply) && !self.tries(Rule::add) => {
                "the end of the value (a sum after `±` needs parentheses)"
            }
            "^" if !self.tries(Rule::caret) => {
                "parentheses around a number with a unit, as in `(5 nm)^2`"
            }
            "±" | "+/-" | "+/−" if !self.tries(Rule::plus_minus) && !wants_value => {
                return Some(self.no_tolerance());
            }
            "(" if self.number_and_word_before() => "`*` between a number and a function",
            _ => return None,
        };
        Some(words.to_owned())
    }

    /// `require gap` and `require metall`: one word and nothing behind it.
    fn lonely_requirement(&self) -> Option<String> {
        let words = match self.previous_text(1) {
            _ if self.tries(Rule::count) => "a band's number",
            _ if self.tries(Rule::above) || self.tries(Rule::relation) => {
                "a relation such as `>=` (a class would be `metal`, `semimetal`, `semiconductor` or `insulator`)"
            }
            _ => return None,
        };
        Some(words.to_owned())
    }

    fn wants_value(&self) -> bool {
        self.tried.iter().any(|rule| is_value(*rule))
    }

    /// Whether `token` stands directly behind a number, as a decimal comma does.
    fn follows_digits(&self, token: Token<'_>) -> bool {
        self.previous(1)
            .is_some_and(|number| number.kind == TokenKind::Number && number.end() == token.start)
    }

    fn after_tuple(&self) -> bool {
        let operator = self
            .token
            .is_some_and(|token| matches!(token.text, "+" | "-" | "−" | "*" | "/" | "^" | "±"));
        operator && self.previous_text(1) == ")" && self.tried == [Rule::EOI]
    }

    fn no_tolerance(&self) -> String {
        let why = if self
            .before
            .iter()
            .any(|token| token.text == "±" || token.text == "+/-")
        {
            "`±` stands once in a value"
        } else if self.tries(Rule::close) {
            "`±` stands outside parentheses"
        } else {
            "`±` does not stand here"
        };
        if self.tries(Rule::close) {
            format!("an operator or `)` ({why})")
        } else {
            format!("an operator or the end of the expression ({why})")
        }
    }

    fn number_and_word_before(&self) -> bool {
        let kind = |back| self.previous(back).map(|token| token.kind);
        kind(1) == Some(TokenKind::Word) && kind(2) == Some(TokenKind::Number)
    }

    fn alternatives(&self) -> Vec<String> {
        let mut words: Vec<String> = Vec::new();
        for rule in self.tried {
            let Some(word) = self.words(*rule) else {
                continue;
            };
            if !words.contains(&word) {
                words.push(word);
            }
        }
        words
    }

    /// The words for one rule; none for what goes without saying or is told elsewhere.
    fn words(&self, rule: Rule) -> Option<String> {
        if self.goes_without_saying(rule) {
            return None;
        }
        if is_value(rule) {
            return Some(self.value_words().to_owned());
        }
        if is_operator(rule) {
            return None;
        }
        let words = match rule {
            Rule::EOI | Rule::unit_name | Rule::unit_use | Rule::percent => return None,
            Rule::name => self.name_words(),
            Rule::rule_name => "a rule's name",
            Rule::string => self.string_words(),
            Rule::equals if self.tries(Rule::above) => "a relation such as `>=`",
            Rule::at_least | Rule::at_most | Rule::above | Rule::below | Rule::relation => {
                "a relation such as `>=`"
            }
            Rule::w_between if self.tries(Rule::above) => "a relation such as `>=`",
            Rule::equals => "`=`",
            Rule::comma => "`,`",
            Rule::open if self.statement == "lattice" => self.value_or_tuple_words(),
            Rule::open => "`(`",
            Rule::close => "`)`",
            Rule::count if self.statement == "stack" => "a whole number of times",
            Rule::count if matches!(self.statement, "require" | "measure") => "a band's number",
            Rule::count => "a whole number",
            Rule::integer => "a whole number",
            Rule::index => "an index such as `1` or `(1, 0)`",
            Rule::unit_power => "a whole number as the unit's power (else write `(5 nm)^n`)",
            Rule::carrier => "`fermions` or `bosons`",
            Rule::interpolation => "`line` or `spline`",
            Rule::class => "a class such as `metal`",
            Rule::gap_kind => "a kind such as `direct`",
            Rule::layer_of => "`of`",
            Rule::layer_at => "`at`",
            Rule::vector | Rule::tuple | Rule::position => self.value_or_tuple_words(),
            _ if is_lattice(rule) => "a kind of lattice such as `chain`, `square` or `fcc`",
            _ if is_shape(rule) => "a shape such as `gaussian` or `box`",
            _ => return keyword(rule),
        };
        Some(words.to_owned())
    }

    /// What is possible there, and told by something better.
    fn goes_without_saying(&self, rule: Rule) -> bool {
        match rule {
            Rule::open => self.tried.iter().any(|other| *other != Rule::open),
            Rule::w_star => self.tries(Rule::index),
            Rule::w_of => self.tries(Rule::above) || self.tries(Rule::relation),
            Rule::w_gap => self.wants_value(),
            _ if self.tries(Rule::count) && matches!(self.statement, "require" | "measure") => {
                rule != Rule::count
            }
            _ => false,
        }
    }

    fn value_or_tuple_words(&self) -> &'static str {
        match self.statement {
            "lattice" => "a vector such as `(5 nm, 0 nm)`",
            "measure" | "require" => "a zone point such as `centre`, `edge` or `(0.5, 0)`",
            _ => self.value_words(),
        }
    }

    fn name_words(&self) -> &'static str {
        match (self.statement, self.previous_text(1)) {
            (_, "level" | "at") => "a zone point such as `centre` or `edge`",
            ("require" | "measure", "of") => "a crystal's name",
            ("layer" | "stack", _) => "a material's name",
            ("atom" | "formfactor", _) => "an atom's name",
            ("material", _) => "a material's name",
            ("crystal", _) => "a crystal's name",
            _ => "a name",
        }
    }

    fn string_words(&self) -> &'static str {
        match self.statement {
            "use" | "table" => "a file's path in quotes",
            "waive" => "the reason in quotes",
            "source" => "a citation in quotes",
            _ => "a text in quotes",
        }
    }

    /// What a value would be at this place, from the word before it.
    fn value_words(&self) -> &'static str {
        const LENGTH: &str = "a length such as `5 nm`";
        const ENERGY: &str = "an energy such as `5 meV`";
        const MASS: &str = "a mass such as `0.067 me`";
        const ANGLE: &str = "an angle such as `60 deg`";
        const UNIT: &str = "a unit such as `nm`";
        const PLACE: &str = "a position such as `0.5`, `2 nm` or `(0.25, 0.5)`";
        match (self.statement, self.previous_text(1)) {
            (_, "mass") => MASS,
            ("layer" | "stack", "at" | "to") => ENERGY,
            ("site" | "atom" | "delta", "at") => PLACE,
            (_, "sigma" | "width" | "size" | "radius" | "axis" | "by") => LENGTH,
            (_, "angle" | "angles" | "phase") => ANGLE,
            ("lattice", ",") if self.before.iter().any(|token| token.text == "angles") => ANGLE,
            ("table", "in") => UNIT,
            ("table", ",") => "a unit such as `meV`",
            ("cosine" | "depth" | "fourier" | "formfactor", "=" | ",") => ENERGY,
            ("site", "gaussian" | "sech2" | "lorentzian" | "box" | "disk" | "sphere") => ENERGY,
            (_, "edge" | "nonparabolic") => ENERGY,
            (_, "±" | "+/-" | "+/−") => "a tolerance such as `0.1 nm` or `2 %`",
            ("require", "within") => "how far off it may be, such as `5 meV` or `2 %`",
            (_, "monolayer" | "recoil" | "layer" | "profile") => LENGTH,
            ("profile", "to") => LENGTH,
            ("stack", "times" | ",") => LENGTH,
            (_, "rate") => "a factor such as `1 ± 2 %`",
            (_, "filling") => "a number of particles",
            (_, "temperature") => "a temperature such as `4 K`",
            (_, "delta") => "an energy times a length such as `2 eV*nm`",
            ("profile", "=") => "an expression in `x`",
            ("measure" | "require", "=" | "require") => "a value such as `gap 1`",
            ("lattice", word) if super::words::lattice(word).is_some() => LENGTH,
            ("formfactor", _) if !self.before.iter().any(|token| token.text == "=") => {
                "|G|² as a number"
            }
            _ => "a value",
        }
    }
}

/// The word of a `w_…` rule, quoted.
fn keyword(rule: Rule) -> Option<String> {
    let name = format!("{rule:?}");
    name.strip_prefix("w_").map(|word| format!("`{word}`"))
}

fn is_operator(rule: Rule) -> bool {
    matches!(
        rule,
        Rule::add | Rule::subtract | Rule::multiply | Rule::divide | Rule::caret | Rule::plus_minus
    )
}

fn is_value(rule: Rule) -> bool {
    matches!(
        rule,
        Rule::value
            | Rule::expression
            | Rule::tolerance
            | Rule::negative
            | Rule::united
            | Rule::bare
            | Rule::decimal
            | Rule::group
            | Rule::call
            | Rule::value_name
            | Rule::quantity
            | Rule::quantity_gap
            | Rule::quantity_width
            | Rule::quantity_bottom
            | Rule::quantity_top
            | Rule::quantity_level
            | Rule::quantity_mass
            | Rule::quantity_hopping
            | Rule::quantity_fermi
            | Rule::layer_part
            | Rule::profile_range
            | Rule::formfactor_one
            | Rule::gap_is
    )
}

fn is_lattice(rule: Rule) -> bool {
    matches!(
        rule,
        Rule::lattice_form
            | Rule::one_length
            | Rule::two_lengths
            | Rule::oblique
            | Rule::hexagonal
            | Rule::length_axis
            | Rule::rhombohedral
            | Rule::three_lengths
            | Rule::monoclinic
            | Rule::triclinic
            | Rule::vectors
    )
}

fn is_shape(rule: Rule) -> bool {
    matches!(
        rule,
        Rule::gaussian
            | Rule::sech2
            | Rule::lorentzian
            | Rule::box_site
            | Rule::disk
            | Rule::sphere
            | Rule::w_gaussian
            | Rule::w_sech2
            | Rule::w_lorentzian
            | Rule::w_box
            | Rule::w_disk
            | Rule::w_sphere
    )
}

/// "a", "a or b", "a, b or c".
fn join(words: &[String]) -> String {
    match words {
        [] => String::new(),
        [only] => only.clone(),
        [first @ .., last] => format!("{} or {last}", first.join(", ")),
    }
}
