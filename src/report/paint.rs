//! Colours, or none: decided once by who starts a view.

use owo_colors::{OwoColorize, Style};

use crate::bands::TargetState;
use crate::rules::Level;

/// Colours text, or leaves it as it is.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub struct Paint {
    /// Whether to colour.
    pub colour: bool,
}

impl Paint {
    fn with(self, style: Style, text: &str) -> String {
        match self.colour {
            true => text.style(style).to_string(),
            false => text.to_owned(),
        }
    }

    /// A heading.
    #[must_use]
    pub fn strong(self, text: &str) -> String {
        self.with(Style::new().bold(), text)
    }

    /// What stands back.
    #[must_use]
    pub fn faint(self, text: &str) -> String {
        self.with(Style::new().dimmed(), text)
    }

    /// A text in its level's colour.
    #[must_use]
    pub fn level(self, level: Level, text: &str) -> String {
        let style = match level {
            Level::Error => Style::new().red().bold(),
            Level::Warning => Style::new().yellow().bold(),
            Level::Note => Style::new().cyan(),
        };
        self.with(style, text)
    }

    /// A text in its state's colour.
    #[must_use]
    pub fn state(self, state: TargetState, text: &str) -> String {
        let style = match state {
            TargetState::Met => Style::new().green(),
            TargetState::Missed => Style::new().red().bold(),
            TargetState::AtRisk | TargetState::Undecided | TargetState::Untestable => {
                Style::new().yellow()
            }
        };
        self.with(style, text)
    }
}
