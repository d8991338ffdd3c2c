//! Loading the files that are asked for and all that they use.

use std::path::{Path, PathBuf};
use std::sync::{Arc, OnceLock};

use std::collections::hash_map::Entry as Slot;

use rustc_hash::{FxHashMap, FxHashSet};

use super::path::{beside, normalise};
use super::{FileSource, ReadFailure, TableFile, World, WorldFile};
use crate::model::hash::hash_bytes;
use crate::model::{FileId, Place, Trouble, TroubleKind};
use crate::syntax::{Entry, Quoted, Section, SectionKind, StatementKind, Tree};

impl World {
    /// Loads the roots and everything that they use, each file once. A root that cannot be read is left out:
    /// its reader reports that itself.
    #[must_use]
    pub fn gather(source: &dyn FileSource, roots: &[PathBuf]) -> Self {
        let mut world = Self::default();
        let mut waiting: Vec<PathBuf> = roots.iter().rev().map(|root| normalise(root)).collect();
        while let Some(path) = waiting.pop() {
            world.load_root(source, &path, &mut waiting);
        }
        world.find_circles();
        world.hash_scopes();
        world
    }

    fn load_root(&mut self, source: &dyn FileSource, path: &Path, waiting: &mut Vec<PathBuf>) {
        let id = FileId::of(path);
        if self.by_id.contains_key(&id) {
            return;
        }
        let Ok(tree) = source.tree(path) else {
            return;
        };
        self.add(source, path, tree, waiting);
    }

    fn add(
        &mut self,
        source: &dyn FileSource,
        path: &Path,
        tree: Arc<Tree>,
        waiting: &mut Vec<PathBuf>,
    ) {
        let mut file = index_file(path, tree);
        let tree = Arc::clone(&file.tree);
        for (place, quoted) in use_statements(file.id, &tree) {
            let target = beside(path, &quoted.text);
            let found = self.load_used(source, &target, waiting);
            match &found {
                Ok(id) if !file.uses.contains(id) => file.uses.push(*id),
                Ok(_) => {}
                Err(why) => file.use_troubles.push(missing(place, quoted, why.clone())),
            }
            file.use_places.push((place, found.ok()));
        }
        self.load_tables(source, path, &tree);
        self.by_id.insert(file.id, self.files.len());
        self.files.push(file);
    }

    /// A used file: checked to be readable at once, indexed when its turn comes.
    fn load_used(
        &self,
        source: &dyn FileSource,
        path: &Path,
        waiting: &mut Vec<PathBuf>,
    ) -> Result<FileId, String> {
        let id = FileId::of(path);
        if self.by_id.contains_key(&id) {
            return Ok(id);
        }
        if !source.inside(path) {
            return Err("it is outside the workspace".to_owned());
        }
        match source.tree(path) {
            Ok(_) => {
                waiting.push(path.to_owned());
                Ok(id)
            }
            Err(failure) => Err(failure.words()),
        }
    }

    fn load_tables(&mut self, source: &dyn FileSource, path: &Path, tree: &Tree) {
        let crystals = tree
            .entries
            .iter()
            .filter(|entry| entry.section.kind == SectionKind::Crystal);
        for statement in crystals.flat_map(|entry| &entry.section.statements) {
            if let StatementKind::Table { file, .. } = &statement.kind {
                let target = beside(path, &file.text);
                let opened = |path: &PathBuf| open_table(source, path);
                self.tables.entry(target).or_insert_with_key(opened);
            }
        }
    }

    /// Every `use` that lies on a circle says so, each at its own place.
    fn find_circles(&mut self) {
        let mut found = Vec::new();
        for (index, file) in self.files.iter().enumerate() {
            for (place, target) in &file.use_places {
                let Some(path) = target.and_then(|target| self.way(target, file.id)) else {
                    continue;
                };
                let circle = std::iter::once(file.id)
                    .chain(path)
                    .map(|id| self.short_name(id));
                let kind = TroubleKind::CircularUse {
                    circle: circle.collect(),
                };
                found.push((index, Trouble::new(kind, *place)));
            }
        }
        for (index, trouble) in found {
            if let Some(file) = self.files.get_mut(index) {
                file.use_troubles.push(trouble);
            }
        }
    }

    /// The shortest way from one file to another by `use`, both ends included.
    fn way(&self, from: FileId, to: FileId) -> Option<Vec<FileId>> {
        let mut came_from: FxHashMap<FileId, FileId> = FxHashMap::default();
        let mut front = std::collections::VecDeque::from([from]);
        came_from.insert(from, from);
        while let Some(current) = front.pop_front() {
            if current == to {
                return Some(trace(&came_from, from, to));
            }
            let uses = self
                .file(current)
                .map_or(&[][..], |file| file.uses.as_slice());
            for next in uses {
                if !came_from.contains_key(next) {
                    came_from.insert(*next, current);
                    front.push_back(*next);
                }
            }
        }
        None
    }

    fn short_name(&self, id: FileId) -> String {
        let name = self.file(id).and_then(|file| file.path.file_name());
        name.map_or_else(String::new, |name| name.to_string_lossy().into_owned())
    }
}

fn trace(came_from: &FxHashMap<FileId, FileId>, from: FileId, to: FileId) -> Vec<FileId> {
    let mut way = vec![to];
    let mut current = to;
    while current != from {
        let Some(before) = came_from.get(&current) else {
            break;
        };
        current = *before;
        way.push(current);
    }
    way.reverse();
    way
}

fn missing(place: Place, quoted: &Quoted, why: String) -> Trouble {
    let kind = TroubleKind::MissingFile {
        path: quoted.text.clone(),
        why,
    };
    Trouble::new(kind, place)
}

/// The `use` statements of a file's preamble.
fn use_statements(file: FileId, tree: &Tree) -> impl Iterator<Item = (Place, &Quoted)> {
    let preamble = tree
        .entries
        .iter()
        .filter(|entry| entry.section.kind == SectionKind::Preamble);
    preamble.flat_map(move |entry| {
        entry
            .section
            .statements
            .iter()
            .filter_map(move |statement| {
                let StatementKind::Use(quoted) = &statement.kind else {
                    return None;
                };
                let place = Place {
                    file,
                    section: entry.id,
                    span: quoted.span,
                };
                Some((place, quoted))
            })
    })
}

fn open_table(source: &dyn FileSource, path: &Path) -> TableFile {
    let bytes = if source.inside(path) {
        source.bytes(path).map_err(|failure| failure.words())
    } else {
        Err(ReadFailure::Other("it is outside the workspace".to_owned()).words())
    };
    let hash = match &bytes {
        Ok(bytes) => hash_bytes(bytes),
        Err(why) => !hash_bytes(why.as_bytes()),
    };
    TableFile {
        hash,
        readable: bytes.map(|_| ()),
        samples: OnceLock::new(),
    }
}

/// The first of each name counts; later ones are found when they are built themselves.
fn index_file(path: &Path, tree: Arc<Tree>) -> WorldFile {
    let mut file = WorldFile {
        id: FileId::of(path),
        path: path.to_owned(),
        uses: Vec::new(),
        use_places: Vec::new(),
        use_troubles: Vec::new(),
        entry_of: FxHashMap::default(),
        materials: FxHashMap::default(),
        crystals: FxHashMap::default(),
        lets: FxHashMap::default(),
        repeated: FxHashSet::default(),
        scope_hash: 0,
        tree: Arc::clone(&tree),
    };
    for (index, entry) in tree.entries.iter().enumerate() {
        file.entry_of.entry(entry.id).or_insert(index);
        index_names(&mut file, index, entry);
    }
    file
}

fn index_names(file: &mut WorldFile, index: usize, entry: &Entry) {
    let section: &Section = &entry.section;
    let kind = section.kind;
    let names = match kind {
        SectionKind::Preamble => {
            for (position, statement) in section.statements.iter().enumerate() {
                if let StatementKind::Let { name, .. } = &statement.kind {
                    index_name(
                        &mut file.lets,
                        &mut file.repeated,
                        (kind, &name.text),
                        position,
                    );
                }
            }
            return;
        }
        SectionKind::Material => &mut file.materials,
        SectionKind::Crystal => &mut file.crystals,
    };
    if let Some(name) = &section.name {
        index_name(names, &mut file.repeated, (kind, &name.text), index);
    }
}

fn index_name(
    names: &mut FxHashMap<String, usize>,
    repeated: &mut FxHashSet<(SectionKind, String)>,
    (kind, name): (SectionKind, &str),
    index: usize,
) {
    match names.entry(name.to_owned()) {
        Slot::Vacant(slot) => {
            slot.insert(index);
        }
        Slot::Occupied(_) => {
            repeated.insert((kind, name.to_owned()));
        }
    }
}
