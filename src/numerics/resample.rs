//! Random draws for resampling: counter-based, so that a draw depends on its seed and number alone.

use rand_chacha::ChaCha8Rng;
use rand_chacha::rand_core::{Rng, SeedableRng};

/// A generator for one purpose (`stream`) under one seed.
pub fn generator(seed: u64, stream: u64) -> ChaCha8Rng {
    let mut generator = ChaCha8Rng::seed_from_u64(seed);
    generator.set_stream(stream);
    generator
}

/// A whole number in `0..bound`, by multiplication of 64 random bits (bias below bound / 2^64).
pub fn below(generator: &mut ChaCha8Rng, bound: usize) -> usize {
    ((u128::from(generator.next_u64()) * bound as u128) >> 64) as usize
}

/// A sign, +1 or -1, for each of `count` blocks.
pub fn signs(generator: &mut ChaCha8Rng, count: usize, out: &mut Vec<f64>) {
    out.clear();
    let mut bits = 0_u64;
    for index in 0..count {
        if index % 64 == 0 {
            bits = generator.next_u64();
        }
        out.push(if bits & 1 == 1 { 1.0 } else { -1.0 });
        bits >>= 1;
    }
}

/// Weights of a circular moving-block bootstrap: how often each of `cells` consecutive cells is drawn when blocks of
/// `block_cells` cells are laid end to end until `cells` cells are filled (the last block is cut). Politis and Romano 1992.
pub fn circular_block_weights(generator: &mut ChaCha8Rng, cells: usize, block_cells: usize, weights: &mut [f64]) {
    weights.fill(0.0);
    let mut filled = 0;
    while filled < cells {
        let start = below(generator, cells);
        let length = block_cells.clamp(1, cells - filled);
        for offset in 0..length {
            weights[(start + offset) % cells] += 1.0;
        }
        filled += length;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn weights_fill_the_record() {
        let mut generator = generator(7, 3);
        let mut weights = vec![0.0; 23];
        for _ in 0..50 {
            circular_block_weights(&mut generator, 23, 4, &mut weights);
            assert!((weights.iter().sum::<f64>() - 23.0).abs() < 1e-12);
        }
    }

    #[test]
    fn streams_differ_and_repeat() {
        let draw = |stream| below(&mut generator(1, stream), 1_000_000);
        assert_eq!(draw(1), draw(1));
        assert_ne!(draw(1), draw(2));
    }
}
