//! What a name means: the section's own first, then what it takes over by
//! `like`, then the file's, then that of the files it uses.

use super::{SectionRef, World, WorldFile};
use crate::model::words::holder_of;
use crate::model::{CrystalRef, FileId, Place};
use crate::syntax::{Entry, SectionKind, Statement, StatementKind, Value, Word};

/// The sections whose `let`s are in sight, nearest first, and the file whose preamble stands behind them.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Scope<'c, 'w> {
    /// The section itself and what it takes over.
    pub(crate) chain: &'c [SectionRef<'w>],
    /// The file of the text that is read.
    pub(crate) file: FileId,
}

/// A `let` where it stands.
#[derive(Clone, Copy, Debug)]
pub struct LetRef<'w> {
    /// The section it stands in.
    pub home: SectionRef<'w>,
    /// The statement.
    pub statement: &'w Statement,
    /// The name it gives.
    pub name: &'w Word,
    /// The value.
    pub value: &'w Value,
}

impl LetRef<'_> {
    /// Where the name is given.
    #[must_use]
    pub fn name_place(&self) -> Place {
        self.home.place(self.name.span)
    }

    /// Where its value stands.
    #[must_use]
    pub fn value_place(&self) -> Place {
        self.home.place(self.value.span)
    }
}

/// The `let`s of a section, in order.
pub(crate) fn lets_of(home: SectionRef<'_>) -> impl Iterator<Item = LetRef<'_>> {
    home.section.statements.iter().filter_map(move |statement| {
        let StatementKind::Let { name, value } = &statement.kind else {
            return None;
        };
        Some(LetRef {
            home,
            statement,
            name,
            value,
        })
    })
}

impl World {
    /// The `let` that a name means; one that may not have its name means nothing.
    pub(crate) fn find_let<'w>(&'w self, scope: Scope<'_, 'w>, name: &str) -> Option<LetRef<'w>> {
        self.find_any_let(scope, name)
            .filter(|_| holder_of(name).is_none())
    }

    fn find_any_let<'w>(&'w self, scope: Scope<'_, 'w>, name: &str) -> Option<LetRef<'w>> {
        let nearer = scope
            .chain
            .iter()
            .find_map(|section| lets_of(*section).find(|found| found.name.text == name));
        nearer.or_else(|| self.preamble_let(scope.file, name))
    }

    /// The `let` of a preamble in sight of a file.
    #[must_use]
    pub fn preamble_let(&self, file: FileId, name: &str) -> Option<LetRef<'_>> {
        self.in_sight(file).find_map(|file| own_let(file, name))
    }

    /// A file and those that it uses, itself first.
    pub(crate) fn in_sight(&self, file: FileId) -> impl Iterator<Item = &WorldFile> {
        let own = self.file(file);
        let used = own.map_or(&[][..], |own| own.uses.as_slice());
        own.into_iter().chain(
            used.iter()
                .filter(move |id| **id != file)
                .filter_map(|id| self.file(*id)),
        )
    }

    /// All `let`s in sight of a scope, nearest first; hidden ones left out.
    pub(crate) fn lets_in_sight<'w>(&'w self, scope: Scope<'_, 'w>) -> Vec<LetRef<'w>> {
        let mut found: Vec<LetRef<'w>> = Vec::new();
        let near = scope.chain.iter().flat_map(|section| lets_of(*section));
        let far = self
            .in_sight(scope.file)
            .filter_map(preamble_of)
            .flat_map(lets_of);
        for one in near.chain(far) {
            if !found.iter().any(|seen| seen.name.text == one.name.text) {
                found.push(one);
            }
        }
        found
    }

    /// The material of that name in sight of a file.
    #[must_use]
    pub fn material(&self, file: FileId, name: &str) -> Option<SectionRef<'_>> {
        self.in_sight(file)
            .find_map(|file| at(file, *file.materials.get(name)?))
    }

    /// The crystal of that name in sight of a file.
    #[must_use]
    pub fn crystal(&self, file: FileId, name: &str) -> Option<SectionRef<'_>> {
        self.in_sight(file)
            .find_map(|file| at(file, *file.crystals.get(name)?))
    }

    /// The same as a reference.
    #[must_use]
    pub fn crystal_ref(&self, file: FileId, name: &str) -> Option<CrystalRef> {
        self.crystal(file, name).map(|found| CrystalRef {
            file: found.file,
            section: found.id,
        })
    }

    /// The names of all materials (or crystals) in sight of a file.
    pub fn section_names(&self, file: FileId, kind: SectionKind) -> impl Iterator<Item = &str> {
        self.in_sight(file)
            .flat_map(move |file| file.sections(kind))
            .filter_map(|entry| entry.section.name.as_ref())
            .map(|name| name.text.as_str())
    }
}

fn own_let<'w>(file: &'w WorldFile, name: &str) -> Option<LetRef<'w>> {
    let home = preamble_of(file)?;
    let statement = home.section.statements.get(*file.lets.get(name)?)?;
    let StatementKind::Let { name, value } = &statement.kind else {
        return None;
    };
    Some(LetRef {
        home,
        statement,
        name,
        value,
    })
}

fn preamble_of(file: &WorldFile) -> Option<SectionRef<'_>> {
    file.preamble().map(|entry| as_ref(file, entry))
}

fn at(file: &WorldFile, index: usize) -> Option<SectionRef<'_>> {
    file.tree
        .entries
        .get(index)
        .map(|entry| as_ref(file, entry))
}

fn as_ref<'w>(file: &WorldFile, entry: &'w Entry) -> SectionRef<'w> {
    SectionRef {
        file: file.id,
        id: entry.id,
        section: &entry.section,
    }
}

impl World {
    /// The material of that name in one file alone.
    pub(crate) fn own_material(&self, file: FileId, name: &str) -> Option<SectionRef<'_>> {
        let file = self.file(file)?;
        at(file, *file.materials.get(name)?)
    }

    /// The `let` of that name in the preamble of one file alone.
    pub(crate) fn own_preamble_let(&self, file: FileId, name: &str) -> Option<LetRef<'_>> {
        own_let(self.file(file)?, name)
    }
}
