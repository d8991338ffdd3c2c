//! Hashes that are the same in every run and on every machine.

/// One 64-bit hash of several words: the finaliser of the splitmix64 generator
/// (Steele, Lea and Flood, OOPSLA 2014), chained.
#[must_use]
pub fn mix(words: &[u64]) -> u64 {
    words
        .iter()
        .fold(0x9e37_79b9_7f4a_7c15, |state, word| scramble(state ^ *word))
}

fn scramble(word: u64) -> u64 {
    let mut z = word.wrapping_add(0x9e37_79b9_7f4a_7c15);
    z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
    z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
    z ^ (z >> 31)
}

/// A hash of bytes: eight of them a step.
#[must_use]
pub fn hash_bytes(bytes: &[u8]) -> u64 {
    let mut state = scramble(bytes.len() as u64);
    for chunk in bytes.chunks(8) {
        let mut word = [0_u8; 8];
        for (to, from) in word.iter_mut().zip(chunk) {
            *to = *from;
        }
        state = scramble(state ^ u64::from_le_bytes(word));
    }
    state
}
