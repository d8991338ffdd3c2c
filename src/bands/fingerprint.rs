//! A hash of all that a crystal's bands depend on, and nothing else.

use std::hash::{DefaultHasher, Hash, Hasher};

use crate::model::{Crystal, Dual, FormfactorValues, Formula, MassLaw, SiteShape};

/// Names the bands of a crystal: equal for crystals of equal numbers, wherever they are written.
pub(super) fn fingerprint(crystal: &Crystal) -> u128 {
    let mut print = Print([DefaultHasher::new(), DefaultHasher::new()]);
    print.0[1].write_u8(1);
    print.crystal(crystal);
    u128::from(print.0[0].finish()) << 64 | u128::from(print.0[1].finish())
}

struct Print([DefaultHasher; 2]);

impl Print {
    fn add(&mut self, what: &impl Hash) {
        self.0.iter_mut().for_each(|hasher| what.hash(hasher));
    }

    fn number(&mut self, value: f64) {
        self.add(&value.to_bits());
    }

    fn dual(&mut self, value: &Dual) {
        self.number(value.value);
    }

    fn duals<'a>(&mut self, values: impl IntoIterator<Item = &'a Dual>) {
        for value in values {
            self.dual(value);
        }
        self.add(&u8::MAX);
    }

    fn crystal(&mut self, crystal: &Crystal) {
        self.add(&(
            crystal.dimension,
            crystal.degeneracy,
            crystal.bosons,
            crystal.bands,
        ));
        self.duals(crystal.vectors.iter().flatten());
        self.duals(crystal.conventional.iter().flatten());
        self.duals(std::iter::once(&crystal.mass).chain(&crystal.filling));
        let potential = &crystal.potential;
        for layer in &potential.layers {
            self.duals([&layer.length].into_iter().chain(&layer.edge));
            layer.mass.iter().for_each(|law| self.law(law));
        }
        for piece in &potential.profile {
            self.duals(&piece.range);
            self.add(&piece.whole);
            self.formula(&piece.formula);
        }
        if let Some(table) = &potential.table {
            self.add(&table.straight);
            table
                .positions
                .iter()
                .chain(&table.energies)
                .for_each(|value| self.number(*value));
        }
        self.spikes_and_waves(crystal);
        self.atoms(crystal);
    }

    fn spikes_and_waves(&mut self, crystal: &Crystal) {
        for delta in &crystal.potential.deltas {
            self.add(&"delta");
            self.duals([&delta.strength, &delta.at]);
        }
        for wave in &crystal.potential.waves {
            self.add(&(wave.kind as u8, &wave.indices));
            self.duals([&wave.energy, &wave.phase]);
        }
        for site in &crystal.potential.sites {
            self.shape(&site.shape);
            self.duals([&site.energy].into_iter().chain(&site.at));
        }
    }

    fn atoms(&mut self, crystal: &Crystal) {
        for atom in &crystal.potential.atoms {
            self.add(&atom.name);
            self.duals(&atom.at);
        }
        for formfactor in &crystal.potential.formfactors {
            self.add(&(&formfactor.name, &formfactor.second));
            match &formfactor.form {
                FormfactorValues::At { q, energies } => self.duals([q].into_iter().chain(energies)),
                FormfactorValues::Curve(formula) => self.formula(formula),
            }
        }
    }

    fn law(&mut self, law: &MassLaw) {
        self.dual(&law.mass);
        if let Some((edge, gap)) = &law.nonparabolic {
            self.duals([edge, gap]);
        }
    }

    fn shape(&mut self, shape: &SiteShape) {
        let (sort, sizes): (u8, Vec<&Dual>) = match shape {
            SiteShape::Gaussian(size) => (0, vec![size]),
            SiteShape::Sech2(size) => (1, vec![size]),
            SiteShape::Lorentzian(size) => (2, vec![size]),
            SiteShape::Box(sizes) => (3, sizes.iter().collect()),
            SiteShape::Disk(size) => (4, vec![size]),
            SiteShape::Sphere(size) => (5, vec![size]),
        };
        self.add(&sort);
        self.duals(sizes);
    }

    fn formula(&mut self, formula: &Formula) {
        match formula {
            Formula::Constant(value) => {
                self.add(&0_u8);
                self.dual(value);
            }
            Formula::Variable(index) => self.add(&(1_u8, index)),
            Formula::Negative(inner) => {
                self.add(&2_u8);
                self.formula(inner);
            }
            Formula::Binary(operator, left, right) => {
                self.add(&(3_u8, *operator as u8));
                self.formula(left);
                self.formula(right);
            }
            Formula::Call(name, arguments) => {
                self.add(&(4_u8, name, arguments.len()));
                arguments.iter().for_each(|argument| self.formula(argument));
            }
        }
    }
}
