//! What a section's result may depend on, as one hash.
//!
//! It changes with the section's own text, with preambles and materials in
//! sight (and in sight of those), with crystals reached by `like` and `of`, and
//! with the bytes of tables. It does not change with other crystals, nor with
//! what moves a section without changing its text.

use super::path::beside;
use super::{SectionRef, World, WorldFile};
use crate::model::FileId;
use crate::model::hash::{hash_bytes, mix};
use crate::syntax::{SectionId, SectionKind, StatementKind};

impl World {
    /// A hash of all that a section's result may depend on.
    #[must_use]
    pub fn dependency_hash(&self, file: FileId, section: SectionId) -> u64 {
        let Some(start) = self.section(file, section) else {
            return 0;
        };
        let mut reached = vec![start];
        let mut hashes = Vec::new();
        let mut next = 0;
        while let Some(current) = reached.get(next).copied() {
            next += 1;
            hashes.push(self.own_part(current));
            self.follow(current, &mut reached, &mut hashes);
        }
        mix(&hashes)
    }

    /// The section's text, name and surroundings.
    fn own_part(&self, section: SectionRef<'_>) -> u64 {
        let scope = self.file(section.file).map_or(0, |file| file.scope_hash);
        mix(&[section.file.0, section.id.0, section.section.hash, scope])
    }

    fn follow<'w>(
        &'w self,
        from: SectionRef<'w>,
        reached: &mut Vec<SectionRef<'w>>,
        hashes: &mut Vec<u64>,
    ) {
        // Materials are part of the surroundings already.
        if from.section.kind != SectionKind::Crystal {
            return;
        }
        for statement in &from.section.statements {
            if let StatementKind::Table { file, .. } = &statement.kind {
                hashes.push(self.table_part(from, &file.text));
            }
        }
        for name in from.section.like.iter().chain(&from.section.mentions) {
            match self.crystal(from.file, &name.text) {
                Some(found) if reached.iter().any(|seen| seen.key() == found.key()) => {}
                Some(found) => reached.push(found),
                None => hashes.push(self.known_crystals(from.file)),
            }
        }
    }

    fn table_part(&self, from: SectionRef<'_>, written: &str) -> u64 {
        let file = self.file(from.file);
        let table = file.and_then(|file| self.tables.get(&beside(&file.path, written)));
        table.map_or(0, |table| table.hash)
    }

    /// For a name that nothing defines: what could be meant instead.
    fn known_crystals(&self, file: FileId) -> u64 {
        let names = self.section_names(file, SectionKind::Crystal);
        let hashes: Vec<u64> = names.map(|name| hash_bytes(name.as_bytes())).collect();
        mix(&hashes)
    }

    /// Every file's preamble and materials, with those of all files it reaches.
    pub(super) fn hash_scopes(&mut self) {
        let own: Vec<u64> = self.files.iter().map(own_scope).collect();
        let whole: Vec<u64> = (0..self.files.len())
            .map(|index| self.reachable_scope(index, &own))
            .collect();
        for (file, hash) in self.files.iter_mut().zip(whole) {
            file.scope_hash = hash;
        }
    }

    fn reachable_scope(&self, start: usize, own: &[u64]) -> u64 {
        let mut reached = vec![start];
        let mut next = 0;
        let mut hashes = Vec::new();
        while let Some(index) = reached.get(next).copied() {
            next += 1;
            hashes.push(own.get(index).copied().unwrap_or_default());
            let uses = self.files.get(index).map_or(&[][..], |file| &file.uses);
            for used in uses.iter().filter_map(|id| self.by_id.get(id)) {
                if !reached.contains(used) {
                    reached.push(*used);
                }
            }
        }
        mix(&hashes)
    }
}

fn own_scope(file: &WorldFile) -> u64 {
    let parts = file
        .tree
        .entries
        .iter()
        .filter(|entry| entry.section.kind != SectionKind::Crystal);
    let mut hashes: Vec<u64> = parts.map(|entry| entry.section.hash).collect();
    hashes.push(file.id.0);
    // A file that appears or vanishes changes what its users know.
    hashes.extend(file.uses.iter().map(|id| id.0));
    mix(&hashes)
}
