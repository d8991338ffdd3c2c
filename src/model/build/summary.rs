//! What can be said of a crystal's lattice without building it.

use super::takeover::chain_of;
use super::{SectionRef, World};
use crate::model::shape::centring::{LatticeKind, lattice_kind};
use crate::syntax::StatementKind;

/// A lattice's kind and dimension.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct LatticeSummary {
    /// The kind; `None` for `vectors` in two and three dimensions. Every cell of one dimension is a chain.
    pub kind: Option<&'static LatticeKind>,
    /// 1, 2 or 3.
    pub dimension: usize,
}

/// The lattice of a crystal; `None` where nothing says it.
#[must_use]
pub fn summarise(world: &World, section: SectionRef<'_>) -> Option<LatticeSummary> {
    let (chain, _) = chain_of(world, section);
    let statements = || chain.iter().flat_map(|section| &section.section.statements);
    let stated = statements().find_map(|statement| match &statement.kind {
        StatementKind::Lattice(form) => Some(form),
        _ => None,
    });
    if let Some(form) = stated {
        if form.kind.text == "vectors" {
            let dimension = form.vectors.len();
            return (1..=3).contains(&dimension).then_some(LatticeSummary {
                kind: lattice_kind("chain", false).filter(|_| dimension == 1),
                dimension,
            });
        }
        let kind = lattice_kind(&form.kind.text, form.axis.is_some())?;
        return Some(LatticeSummary {
            kind: Some(kind),
            dimension: kind.dimension,
        });
    }
    let layered = statements().any(|statement| {
        matches!(
            statement.kind,
            StatementKind::Layer(_) | StatementKind::Stack { .. }
        )
    });
    layered.then(|| LatticeSummary {
        kind: lattice_kind("chain", false),
        dimension: 1,
    })
}
