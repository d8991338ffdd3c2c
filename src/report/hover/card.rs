//! What a hover says, before it becomes Markdown or plain text.

use crate::report::grid::{Stand, lay};

/// A title, sentences, aligned rows and a picture, in this order.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Card {
    title: String,
    sentences: Vec<String>,
    rows: Vec<Vec<String>>,
    picture: Vec<String>,
    sample: String,
}

impl Card {
    /// A card with a title.
    pub fn new(title: impl Into<String>) -> Self {
        Self {
            title: title.into(),
            ..Self::default()
        }
    }

    /// Adds a sentence.
    pub fn say(&mut self, sentence: impl Into<String>) {
        self.sentences.push(sentence.into());
    }

    /// Adds a row of two columns or more.
    pub fn row<const N: usize>(&mut self, cells: [String; N]) {
        self.rows.push(cells.to_vec());
    }

    /// Sets the picture.
    pub fn picture(&mut self, lines: Vec<String>) {
        self.picture = lines;
    }

    /// Sets a text in the format itself.
    pub fn sample(&mut self, text: impl Into<String>) {
        self.sample = text.into();
    }

    fn table(&self) -> String {
        let columns = self.rows.iter().map(Vec::len).max().unwrap_or(0);
        lay(&vec![Stand::Left; columns], &self.rows, 0)
    }

    /// As Markdown; what must line up stands in a block of its own.
    pub fn markdown(&self) -> String {
        let mut parts = Vec::new();
        if !self.title.is_empty() {
            parts.push(format!("**{}**", self.title));
        }
        if !self.sentences.is_empty() {
            parts.push(self.sentences.join("  \n"));
        }
        if !self.sample.is_empty() {
            parts.push(format!("```crenate\n{}\n```", self.sample.trim_end()));
        }
        let mut block = self.table();
        if !self.picture.is_empty() {
            if !block.is_empty() {
                block.push('\n');
            }
            block += &self.picture.join("\n");
        }
        if !block.is_empty() {
            parts.push(format!("```text\n{}\n```", block.trim_end_matches('\n')));
        }
        parts.join("\n\n")
    }

    /// As plain text.
    pub fn plain(&self) -> String {
        let sentences: Vec<String> = self
            .sentences
            .iter()
            .map(|said| said.replace('`', ""))
            .collect();
        let parts = [
            self.title.replace('`', ""),
            sentences.join("\n"),
            self.sample.trim_end().to_owned(),
            self.table().trim_end_matches('\n').to_owned(),
            self.picture.join("\n"),
        ];
        let filled: Vec<String> = parts.into_iter().filter(|part| !part.is_empty()).collect();
        filled.join("\n\n")
    }
}
