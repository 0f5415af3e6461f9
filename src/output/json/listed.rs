//! How much of a list of states is written.

/// Most values of nets that one list of states holds, unless told otherwise: about 2 MB of text.
pub const MOST_VALUES: usize = 1 << 17;

/// The first entries of a list that hold at most so many values together, and at least the first.
pub(super) fn beginning<T>(list: &[T], most: usize, values: impl Fn(&T) -> usize) -> &[T] {
    let mut left = most;
    let many = list.iter().take_while(|entry| {
        let size = values(entry).max(1);
        let fits = size <= left;
        left = left.saturating_sub(size);
        fits
    });
    &list[..many.count().max(list.len().min(1))]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lists_end_before_the_bound_and_are_never_empty() {
        let sizes = [3, 4, 5, 1];
        let listed = |most| beginning(&sizes, most, |size| *size).len();
        let of = [0, 3, 6, 7, 11, 12, 13, usize::MAX].map(listed);
        assert_eq!(of, [1, 1, 1, 2, 2, 3, 4, 4]);
        assert_eq!(beginning(&[0, 0, 0], 2, |size| *size).len(), 2, "an entry is at least one value");
        assert!(beginning(&[] as &[usize], 0, |size| *size).is_empty());
    }
}
