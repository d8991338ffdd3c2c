//! What rules ask of their subject, and how they put a finding together.

use crate::model::{Crystal, Dual, Parameter, ParameterId, Place, Trouble};
use crate::syntax::{Line, Statement, StatementKind};
use crate::text::Span;

use super::{Finding, Fix, Level, Replacement, Rule, Subject};

impl<'a> Subject<'a> {
    /// A span of this section as a place.
    #[must_use]
    pub fn place(&self, span: Span) -> Place {
        Place {
            file: self.file,
            section: self.entry.id,
            span,
        }
    }

    /// Whether a place lies in this section.
    #[must_use]
    pub fn holds(&self, place: Place) -> bool {
        place.file == self.file && place.section == self.entry.id
    }

    /// The text at a place of this section; nothing for a place elsewhere.
    #[must_use]
    pub fn text(&self, place: Place) -> Option<&'a str> {
        let text: &'a str = &self.entry.section.text;
        self.holds(place).then(|| place.span.of(text))
    }

    /// The name in the section's heading, or the heading where it has none.
    #[must_use]
    pub fn heading(&self) -> Place {
        let section = &self.entry.section;
        let name = section.name.as_ref().map(|name| name.span);
        self.place(name.unwrap_or(section.heading))
    }

    /// The crystal, if it can be solved.
    #[must_use]
    pub fn sound_crystal(&self) -> Option<&'a Crystal> {
        self.crystal.filter(|crystal| !crystal.broken)
    }

    /// The statement that covers a place of this section.
    #[must_use]
    pub fn statement_at(&self, place: Place) -> Option<&'a Statement> {
        if !self.holds(place) {
            return None;
        }
        let covers = |statement: &&Statement| {
            statement.span.start <= place.span.start && place.span.end <= statement.span.end
        };
        self.entry.section.statements.iter().find(covers)
    }

    /// The section's statements of one kind.
    pub fn statements(
        &self,
        wanted: fn(&StatementKind) -> bool,
    ) -> impl Iterator<Item = &'a Statement> {
        let statements = self.entry.section.statements.iter();
        statements.filter(move |statement| wanted(&statement.kind))
    }

    /// Where to speak of something that a crystal has from `place`: there, if that is in this section; at the heading,
    /// if it is inherited and this section's own numbers enter it; nowhere, if the crystal that it is inherited from
    /// has exactly the same to say.
    #[must_use]
    pub fn where_to_speak(&self, place: Place, numbers: &[&Dual]) -> Option<Place> {
        if self.holds(place) {
            return Some(place);
        }
        let crystal = self.crystal?;
        let own = |id: ParameterId| {
            let parameter = parameter(crystal, id);
            parameter.is_some_and(|parameter| self.holds(parameter.place))
        };
        let slopes = numbers.iter().flat_map(|dual| &dual.slopes);
        let changed = slopes.into_iter().any(|(id, _)| own(*id));
        changed.then(|| self.heading())
    }

    /// The line of the section in which a byte stands.
    #[must_use]
    pub fn line_at(&self, byte: u32) -> Option<&'a Line> {
        let mut lines = self.entry.section.lines.iter();
        lines.find(|line| line.span.start <= byte && byte < line.span.end.max(line.span.start + 1))
    }

    /// A replacement that puts `statement` on a line of its own below the line in which `span` ends, indented alike.
    #[must_use]
    pub fn line_below(&self, span: Span, statement: &str) -> Option<Replacement> {
        self.line_below_with(span, statement, None)
    }

    /// The same, with an indent of its own where the line is a heading.
    #[must_use]
    pub fn first_line(&self, statement: &str) -> Option<Replacement> {
        let heading = self.entry.section.heading;
        let indent = self.body_indent();
        self.line_below_with(heading, statement, Some(indent))
    }

    /// The indent of the section's first statement, or two spaces.
    fn body_indent(&self) -> &'a str {
        let first = self.entry.section.statements.first();
        let line = first.and_then(|statement| self.line_at(statement.span.start));
        line.map_or("  ", |line| self.indent_of(line))
    }

    fn indent_of(&self, line: &Line) -> &'a str {
        let text: &'a str = &self.entry.section.text;
        let whole = line.span.of(text);
        let length = whole.len() - whole.trim_start_matches([' ', '\t']).len();
        whole.get(..length).unwrap_or("")
    }

    fn line_below_with(
        &self,
        span: Span,
        statement: &str,
        indent: Option<&str>,
    ) -> Option<Replacement> {
        let line = self.line_at(span.end.saturating_sub(1).max(span.start))?;
        let whole = line.span.of(&self.entry.section.text);
        let body = whole.trim_end_matches(['\r', '\n']);
        let terminator = match whole.get(body.len()..) {
            Some("") | None => "\n",
            Some(terminator) => terminator,
        };
        let indent = indent.unwrap_or_else(|| self.indent_of(line));
        let end = line.span.start + u32::try_from(body.len()).ok()?;
        Some(Replacement {
            place: self.place(Span::new(end, end)),
            text: format!("{terminator}{indent}{statement}"),
        })
    }
}

/// What a crystal's numbers depend on, by its identity.
#[must_use]
pub fn parameter(crystal: &Crystal, id: ParameterId) -> Option<&Parameter> {
    let sorted = &crystal.parameters;
    let found = sorted.binary_search_by_key(&id, |parameter| parameter.id);
    found.ok().and_then(|index| sorted.get(index))
}

impl Finding {
    /// A finding at its rule's usual level.
    #[must_use]
    pub fn new(rule: &Rule, place: Place, message: impl Into<String>) -> Self {
        Self {
            rule: rule.name,
            level: rule.level,
            place,
            message: message.into(),
            help: None,
            related: Vec::new(),
            fixes: Vec::new(),
            unused: false,
        }
    }

    /// A finding that words a trouble; the trouble's other places come along.
    #[must_use]
    pub fn of_trouble(rule: &Rule, trouble: &Trouble, message: impl Into<String>) -> Self {
        Self {
            related: trouble.related.clone(),
            ..Self::new(rule, trouble.place, message)
        }
    }

    /// With another level than its rule's usual one.
    #[must_use]
    pub fn at_level(mut self, level: Level) -> Self {
        self.level = level;
        self
    }

    /// With a line of help.
    #[must_use]
    pub fn help(mut self, help: impl Into<String>) -> Self {
        self.help = Some(help.into());
        self
    }

    /// With a line of help, if there is one.
    #[must_use]
    pub fn help_if(mut self, help: Option<String>) -> Self {
        self.help = help.or(self.help);
        self
    }

    /// With another place that takes part.
    #[must_use]
    pub fn related(mut self, place: Place, what: impl Into<String>) -> Self {
        self.related.push((place, what.into()));
        self
    }

    /// With a way to mend it, if there is one.
    #[must_use]
    pub fn fix(mut self, fix: impl Into<Option<Fix>>) -> Self {
        self.fixes.extend(fix.into());
        self
    }
}

impl Fix {
    /// A fix that can be applied without a look.
    #[must_use]
    pub fn safe(title: impl Into<String>, edit: Replacement) -> Self {
        Self {
            title: title.into(),
            edits: vec![edit],
            safe: true,
        }
    }

    /// A fix to be looked at before it is applied.
    #[must_use]
    pub fn guess(title: impl Into<String>, edit: Replacement) -> Self {
        Self {
            safe: false,
            ..Self::safe(title, edit)
        }
    }
}

impl Replacement {
    /// `text` in place of what is there.
    #[must_use]
    pub fn new(place: Place, text: impl Into<String>) -> Self {
        Self {
            place,
            text: text.into(),
        }
    }
}
