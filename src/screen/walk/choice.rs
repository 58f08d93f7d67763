//! Owns one choice from each of several lists, and how all choices are reached from the first, each once.

use smallvec::{SmallVec, smallvec};

/// Places in the lists, in place for the few rails that share a section: millions of them pass through a heap. Every choice but the first has one parent: the same with its last place that is not 0 one
/// lower. So where lists rise, no choice comes before a better one.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord)]
pub(super) struct Choice(SmallVec<[u32; 5]>);

impl Choice {
    /// The first of each of so many lists.
    pub(super) fn first(lists: usize) -> Choice {
        Choice(smallvec![0; lists])
    }

    /// The choices that come of this one, in lists of these lengths.
    pub(super) fn children<'a>(&'a self, lengths: impl Fn(usize) -> usize + 'a) -> impl Iterator<Item = Choice> + 'a {
        let last = self.0.iter().rposition(|&place| place > 0).unwrap_or(0);
        (last..self.0.len()).filter_map(move |list| {
            let mut child = self.clone();
            child.0[list] += 1;
            ((child.0[list] as usize) < lengths(list)).then_some(child)
        })
    }

    /// Its places by list.
    pub(super) fn places(&self) -> impl Iterator<Item = usize> {
        self.0.iter().map(|&place| place as usize)
    }
}

#[cfg(test)]
mod tests {
    use super::Choice;

    #[test]
    fn every_choice_is_reached_once() {
        let lengths = [3, 1, 4];
        let mut open = vec![Choice::first(3)];
        let mut seen = std::collections::BTreeSet::new();
        while let Some(choice) = open.pop() {
            open.extend(choice.children(|list| lengths[list]));
            assert!(seen.insert(choice));
        }
        assert_eq!(seen.len(), 12);
    }
}
