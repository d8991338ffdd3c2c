//! Solved bands by fingerprint, bounded in number.

use std::sync::{Arc, Mutex, PoisonError};

use rustc_hash::FxHashMap;

use super::{Solution, Unsolved};

/// Entries kept; when there are more, those not asked for lately go.
const MOST: usize = 2048;

/// What was found for a crystal.
pub(super) type Answer = Result<Arc<Solution>, Unsolved>;

/// A cache shared by threads.
#[derive(Default)]
pub(super) struct Cache(Mutex<Shelf>);

#[derive(Default)]
struct Shelf {
    answers: FxHashMap<u128, (Answer, u64)>,
    clock: u64,
}

impl Cache {
    /// The answer for a fingerprint, if it is known.
    pub fn get(&self, fingerprint: u128) -> Option<Answer> {
        let mut shelf = self.0.lock().unwrap_or_else(PoisonError::into_inner);
        shelf.clock += 1;
        let clock = shelf.clock;
        let (answer, used) = shelf.answers.get_mut(&fingerprint)?;
        *used = clock;
        Some(answer.clone())
    }

    /// Keeps an answer; a cancelled one says nothing and is not kept.
    pub fn put(&self, fingerprint: u128, answer: &Answer) {
        if matches!(answer, Err(Unsolved::Cancelled)) {
            return;
        }
        let mut shelf = self.0.lock().unwrap_or_else(PoisonError::into_inner);
        shelf.clock += 1;
        let clock = shelf.clock;
        shelf.answers.insert(fingerprint, (answer.clone(), clock));
        if shelf.answers.len() > MOST {
            let mut ages: Vec<u64> = shelf.answers.values().map(|(_, used)| *used).collect();
            let middle = ages.len() / 2;
            let (_, median, _) = ages.select_nth_unstable(middle);
            let oldest = *median;
            shelf.answers.retain(|_, (_, used)| *used >= oldest);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn it_keeps_what_was_asked_for_lately_and_stays_bounded() {
        let cache = Cache::default();
        let answer: Answer = Err(Unsolved::BrokenModel);
        for fingerprint in 0..20_000 {
            cache.put(fingerprint, &answer);
            assert!(
                cache.get(0).is_some(),
                "the first was lost after {fingerprint}"
            );
        }
        let kept = (0..20_000)
            .filter(|fingerprint| cache.get(*fingerprint).is_some())
            .count();
        assert!(kept <= MOST, "{kept} answers are kept");
    }

    #[test]
    fn a_cancelled_answer_is_not_kept() {
        let cache = Cache::default();
        cache.put(7, &Err(Unsolved::Cancelled));
        assert_eq!(cache.get(7), None);
    }
}
