//! Seeded random cells of every kind of piece.
#![allow(dead_code, missing_docs)]

use super::flat;
use crenate::numerics::{Mass, Piece};

/// Marsaglia's xorshift (J. Stat. Softw. 8, 14 (2003)); uniform in [0, 1).
pub struct Random(pub u64);

impl Random {
    pub fn next(&mut self) -> f64 {
        self.0 ^= self.0 << 13;
        self.0 ^= self.0 >> 7;
        self.0 ^= self.0 << 17;
        (self.0 >> 11) as f64 / (1u64 << 53) as f64
    }
}

/// A piece of any kind: masses up to a thousand apart, walls up to hundreds of decay lengths, spikes of both signs.
pub fn any_piece(random: &mut Random, offset: f64, thick: f64) -> Piece {
    let mass = 10f64.powf(3.0 * random.next() - 1.5);
    let length = if random.next() < 0.1 {
        thick
    } else {
        0.05 + random.next()
    };
    let potential = offset + 10f64.powf(3.0 * random.next()) * (random.next() - 0.3);
    match (4.0 * random.next()) as usize {
        0 => Piece::Delta {
            strength: 10f64.powf(2.0 * random.next() - 1.0) * (random.next() - 0.4),
        },
        1 => Piece::Ramp {
            length: length.min(3.0),
            potential: [potential, offset + 30.0 * random.next()],
            mass: [
                Mass::constant(mass),
                Mass::constant(mass * (0.3 + random.next())),
            ],
        },
        _ => flat(length, potential, mass),
    }
}

/// A few pieces of any kind and one flat one, all above, around or below zero, with walls of up to many decay lengths.
pub fn mixture(random: &mut Random) -> Vec<Piece> {
    let offset = [0.0, 1000.0, -1000.0][(3.0 * random.next()) as usize % 3];
    let thick = [4.0, 15.0, 60.0][(3.0 * random.next()) as usize % 3];
    let count = 2 + (random.next() * 5.0) as usize;
    let mut pieces: Vec<Piece> = (0..count)
        .map(|_| any_piece(random, offset, thick))
        .collect();
    pieces.push(flat(0.5 + random.next(), offset, 1.0));
    pieces
}

pub fn mirrored(pieces: &[Piece]) -> Vec<Piece> {
    let mut pieces = pieces.to_vec();
    pieces.reverse();
    for piece in &mut pieces {
        if let Piece::Ramp {
            potential, mass, ..
        } = piece
        {
            potential.reverse();
            mass.reverse();
        }
    }
    pieces
}

/// Trials of a random test, times what the environment's `TRIALS` asks for in a longer hunt.
pub fn trials(committed: usize) -> usize {
    let times = std::env::var("TRIALS")
        .ok()
        .and_then(|times| times.parse().ok());
    committed * times.unwrap_or(1)
}
