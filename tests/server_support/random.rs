//! Random batches of edits, and a naive model of what the protocol says that they do.

use serde_json::{Value, json};

const PIECES: [&str; 22] = [
    "\n",
    "\r",
    "\r\n",
    "🙂",
    "é",
    "\u{2028}",
    " ",
    "#",
    "\"",
    "\\",
    "crystal b",
    "material wall",
    "  layer 2 nm of wall\n",
    "  require gap 1 >= 6 meV\r\n",
    "8",
    ".5",
    " nm",
    "let s = 4 nm\n",
    "  layer s at 3 meV\r",
    "±",
    "(",
    "crystal a\n",
];

/// A text with all kinds of line ends and a character of two UTF-16 units.
pub const START: &str = "let s = 3 nm\r\nmaterial wall\r  mass 0.1 me\n  edge 200 meV\ncrystal a # 🙂\n  mass 0.1 me\n  layer s at 0 eV\n  layer 2 nm of wall\n  require gap 1 >= 10 meV\n";

/// A small generator of numbers that look random; the same in every run.
pub struct Dice(pub u64);

impl Dice {
    pub fn below(&mut self, limit: usize) -> usize {
        self.0 = self
            .0
            .wrapping_mul(6_364_136_223_846_793_005)
            .wrapping_add(1_442_695_040_888_963_407);
        usize::try_from(self.0 >> 33).unwrap() % limit
    }
}

/// The text as UTF-16, cut into lines by scanning.
pub struct Model(pub Vec<u16>);

impl Model {
    pub fn new(text: &str) -> Self {
        Self(text.encode_utf16().collect())
    }

    /// First unit and length of each line, terminators left out.
    pub fn lines(&self) -> Vec<(usize, usize)> {
        let mut lines = Vec::new();
        let (mut start, mut at) = (0, 0);
        while at < self.0.len() {
            let (unit, next) = (self.0[at], self.0.get(at + 1));
            if unit == 10 || unit == 13 {
                lines.push((start, at - start));
                at += if unit == 13 && next == Some(&10) {
                    2
                } else {
                    1
                };
                start = at;
            } else {
                at += 1;
            }
        }
        lines.push((start, self.0.len() - start));
        lines
    }

    fn offset(&self, line: usize, character: usize) -> usize {
        let Some((start, length)) = self.lines().get(line).copied() else {
            return self.0.len();
        };
        let offset = start + character.min(length);
        let inside = character < length
            && self
                .0
                .get(offset)
                .is_some_and(|unit| (0xdc00..0xe000).contains(unit));
        offset - usize::from(inside)
    }

    pub fn apply(&mut self, change: &Value) {
        let at = |end: &str| {
            let position = &change["range"][end];
            let number = |name: &str| usize::try_from(position[name].as_u64().unwrap()).unwrap();
            self.offset(number("line"), number("character"))
        };
        let (from, to) = (at("start").min(at("end")), at("start").max(at("end")));
        let text: Vec<u16> = change["text"].as_str().unwrap().encode_utf16().collect();
        self.0.splice(from..to, text);
    }

    pub fn text(&self) -> String {
        String::from_utf16(&self.0).unwrap()
    }
}

/// One to three changes, applied to the model one after another.
pub fn batch(dice: &mut Dice, model: &mut Model) -> Value {
    let mut changes = Vec::new();
    for _ in 0..=dice.below(3) {
        let change = change(dice, model.lines().len());
        model.apply(&change);
        changes.push(change);
    }
    json!(changes)
}

fn change(dice: &mut Dice, lines: usize) -> Value {
    let line = dice.below(lines + 2);
    let character = dice.below(30);
    let text: String = (0..dice.below(3))
        .map(|_| PIECES[dice.below(PIECES.len())])
        .collect();
    let far = dice.below(12) == 0;
    let end = if far {
        (line + dice.below(4), dice.below(2000))
    } else {
        (line, character + dice.below(4))
    };
    json!({"range": {"start": {"line": line, "character": character}, "end": {"line": end.0, "character": end.1}}, "text": text})
}
