//! The sound models that are broken: all examples, and a few more for what the examples do not use.

use std::fs;
use std::path::{Path, PathBuf};

use super::memory::Memory;

/// Files that belong together; those that end in `.cren` are analysed.
#[derive(Clone)]
pub struct Models {
    pub name: String,
    pub files: Vec<(String, String)>,
}

/// Components by pairs, and a smooth profile in one piece and in two.
const WAVES: &str = "\
crystal plait
  mass      0.2 me
  lattice   chain 4 nm
  fourier   1 = 60 meV phase 0.4
  fourier   -1 = 60 meV phase -0.4
  fourier   2 = 20 meV phase 1.1
  fourier   -2 = 20 meV phase -1.1
  require   gap 1 = 112 meV within 8 %

crystal furrow
  mass      0.1 me
  lattice   chain 6 nm
  profile   0 to period = 100 meV * sin(pi*x/6 nm)^2
  require   gap 1 = 47 meV within 10 %

crystal hollow
  mass      0.1 me
  lattice   chain 9 nm
  profile   0 to period/2 = 120 meV * sin(2*pi*x/period)^2
  profile   period/2 to period = 60 meV * sin(2*pi*x/period)^2
  require   gap 1 >= 5 meV
  require   gap 2 >= 10 meV
";

/// Layers beside a stated lattice, named values, and a crystal like another.
const LAYERS: &str = "\
let well = 5.4 nm
let bank_height = 235 meV

material meadow
  mass      0.067 me
  edge      0 meV

material bank
  mass      0.092 me
  edge      bank_height

crystal fence
  lattice   chain 8 nm
  layer     well of meadow
  layer     2.6 nm of bank
  require   gap 1 >= 120 meV
  require   width 1 between 20 meV and 45 meV

crystal hedge like fence
  lattice   chain 9.4 nm
  layer     well of meadow
  layer     4 nm of bank
  require   gap 1 >= 120 meV
  require   width 1 between 5 meV and 15 meV

crystal steps
  lattice   chain 9 nm
  layer     4 nm at 0 meV mass 0.07 me
  layer     1.5 nm at 80 meV mass 0.08 me
  layer     2 nm at 200 meV mass 0.09 me
  layer     1.5 nm at 80 meV mass 0.08 me
  require   gap 1 >= 60 meV
";

/// Filled bands, with their number stated.
const FILLED: &str = "\
crystal terrace
  mass      0.5 me
  lattice   chain 1.2 nm
  bands     4
  filling   2
  cosine    1 = 500 meV
  cosine    2 = 200 meV phase 180 deg
  require   insulator
  require   gap 1 >= 300 meV
";

/// Atoms with form factors on a square lattice, and a square lattice of light. Without targets, as no bands are
/// needed for what these are broken in.
const FLAT: &str = "\
let light = 900 nm

crystal board
  mass      1 me
  lattice   square 0.5 nm
  atom      A at (0, 0)
  atom      B at (0.5, 0.5)
  formfactor A 1 = -1.2 eV
  formfactor B 1 = -0.4 eV
  formfactor A 2 = -0.9 eV
  formfactor B 2 = -0.9 eV

crystal ponds
  carriers  bosons
  mass      87 u
  recoil    light
  lattice   square light/2
  depth     (1, 0) = 6 Er
  depth     (0, 1) = 6 Er
";

/// All sets of models.
pub fn all() -> Vec<Models> {
    let examples = Path::new(env!("CARGO_MANIFEST_DIR")).join("examples");
    let mut folders: Vec<PathBuf> = fs::read_dir(examples)
        .unwrap()
        .map(|entry| entry.unwrap().path())
        .collect();
    folders.sort();
    let mut all: Vec<Models> = folders.iter().map(|folder| example(folder)).collect();
    for (name, text) in [
        ("waves", WAVES),
        ("layers", LAYERS),
        ("filled", FILLED),
        ("flat", FLAT),
    ] {
        all.push(Models {
            name: name.to_owned(),
            files: vec![(format!("{name}.cren"), text.to_owned())],
        });
    }
    all
}

fn example(folder: &Path) -> Models {
    let mut files: Vec<(String, String)> = fs::read_dir(folder)
        .unwrap()
        .map(|entry| {
            let path = entry.unwrap().path();
            let name = path.file_name().unwrap().to_string_lossy().into_owned();
            (name, fs::read_to_string(path).unwrap())
        })
        .collect();
    files.sort();
    Models {
        name: folder.file_name().unwrap().to_string_lossy().into_owned(),
        files,
    }
}

impl Models {
    /// The same with another text in one file.
    pub fn with(&self, file: usize, text: &str) -> Self {
        let mut other = self.clone();
        other.files[file].1 = text.to_owned();
        other
    }

    /// Where the file of that name stands.
    pub fn path(name: &str) -> PathBuf {
        Path::new("/").join(name)
    }

    /// The files that are analysed.
    pub fn roots(&self) -> Vec<PathBuf> {
        let names = self.files.iter().map(|(name, _)| name);
        names
            .filter(|name| name.ends_with(".cren"))
            .map(|name| Self::path(name))
            .collect()
    }

    /// Where they can be read.
    pub fn source(&self) -> Memory {
        let files = self.files.iter();
        Memory::of(files.map(|(name, text)| (Self::path(name), text.as_str())))
    }
}
