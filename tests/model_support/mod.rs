//! Files in memory, and short ways to build what they say.
#![allow(dead_code, clippy::unwrap_used, clippy::indexing_slicing, missing_docs)]

pub mod cells;
#[path = "../memory/mod.rs"]
mod memory;

use std::path::{Path, PathBuf};

use crenate::model::{
    Built, BuiltMaterial, BuiltPreamble, CrystalRef, FileId, Setting, Trouble, TroubleKind, World,
    build_crystal, build_material, build_preamble,
};
use memory::Memory;

/// A world with its files; `/w/a.cren` is the root, and `/w` the workspace.
pub struct Desk {
    pub files: Memory,
    pub world: World,
}

impl Desk {
    pub fn of(files: &[(&str, &str)]) -> Self {
        let files = files.iter();
        let files = files.map(|(path, text)| (Path::new("/w").join(path), *text));
        let files = Memory::of(files).but(|path| !path.starts_with("/w"));
        let world = World::gather(&files, &[PathBuf::from("/w/a.cren")]);
        Self { files, world }
    }

    pub fn new(text: &str) -> Self {
        Self::of(&[("a.cren", text)])
    }

    pub fn file(&self) -> FileId {
        self.world.file_at(Path::new("/w/a.cren")).unwrap().id
    }

    pub fn crystal_ref(&self, name: &str) -> CrystalRef {
        self.world.crystal_ref(self.file(), name).unwrap()
    }

    pub fn crystal(&self, name: &str) -> Built {
        self.crystal_at(name, &Setting::nominal())
    }

    pub fn crystal_at(&self, name: &str, setting: &Setting) -> Built {
        build_crystal(&self.world, self.crystal_ref(name), setting, &self.files)
    }

    pub fn material(&self, name: &str) -> BuiltMaterial {
        let found = self.world.material(self.file(), name).unwrap();
        build_material(&self.world, found.file, found.id, &Setting::nominal())
    }

    pub fn preamble(&self) -> BuiltPreamble {
        build_preamble(&self.world, self.file(), &Setting::nominal())
    }

    /// Everything wrong in the root file, each with the text it stands at.
    pub fn troubles(&self) -> Vec<(TroubleKind, String)> {
        let mut all: Vec<Trouble> = self.preamble().troubles;
        for (id, _) in self.world.materials(self.file()) {
            all.extend(build_material(&self.world, self.file(), id, &Setting::nominal()).troubles);
        }
        for (id, _) in self.world.crystals(self.file()) {
            let of = CrystalRef {
                file: self.file(),
                section: id,
            };
            all.extend(build_crystal(&self.world, of, &Setting::nominal(), &self.files).troubles);
        }
        let at = |trouble: Trouble| {
            let text = self.world.text_at(trouble.place).to_owned();
            (trouble.kind, text)
        };
        all.into_iter().map(at).collect()
    }

    pub fn problems(&self) -> usize {
        let file = self.world.file(self.file()).unwrap();
        file.tree
            .entries
            .iter()
            .map(|entry| entry.section.problems.len())
            .sum()
    }
}

/// Asserts that a text reads and builds without any mistake.
#[track_caller]
pub fn assert_silent(text: &str) {
    let desk = Desk::new(text);
    assert_eq!(desk.problems(), 0, "unreadable:\n{text}");
    let troubles = desk.troubles();
    assert!(troubles.is_empty(), "{text}\n{troubles:#?}");
}

/// The only mistake of a text, with the text it stands at.
#[track_caller]
pub fn only_trouble(text: &str) -> (TroubleKind, String) {
    let desk = Desk::new(text);
    assert_eq!(desk.problems(), 0, "unreadable:\n{text}");
    let mut troubles = desk.troubles();
    assert_eq!(troubles.len(), 1, "{text}\n{troubles:#?}");
    troubles.remove(0)
}

/// Asserts that two numbers agree within a share of the second.
#[track_caller]
pub fn assert_close(found: f64, wanted: f64, share: f64) {
    let off = (found - wanted).abs();
    assert!(
        off <= share * wanted.abs(),
        "{found:e} is not {wanted:e} ({:.1e} off)",
        off / wanted.abs()
    );
}
