//! The order in which unknowns are eliminated, so that few new entries arise. Patterns only, no numbers.

/// Fill-reducing order of the unknowns 1..nodes by approximate minimum degree (Amestoy, Davis & Duff 1996);
/// natural order where that fails. `order[k]` is the node eliminated as number `k`.
pub(super) fn elimination_order(nodes: usize, edges: &[(u32, u32)]) -> Vec<u32> {
    use faer::dyn_stack::{MemBuffer, MemStack};
    use faer::sparse::linalg::amd;
    let n = nodes - 1;
    let (col_ptr, row_idx) = upper_pattern(nodes, edges);
    let natural = || (1..nodes as u32).collect();
    let Ok(mut memory) = MemBuffer::try_new(amd::order_maybe_unsorted_scratch::<usize>(n, row_idx.len()))
    else {
        return natural();
    };
    let pattern = faer::sparse::SymbolicSparseColMatRef::new_checked(n, n, &col_ptr, None, &row_idx);
    let (mut forward, mut inverse) = (vec![0usize; n], vec![0usize; n]);
    let stack = MemStack::new(&mut memory);
    match amd::order_maybe_unsorted(&mut forward, &mut inverse, pattern, Default::default(), stack) {
        Ok(_) => forward.into_iter().map(|k| k as u32 + 1).collect(),
        Err(_) => natural(),
    }
}

/// Columns of the strict upper triangle (unknowns counted from 0), rows sorted, no duplicates.
fn upper_pattern(nodes: usize, edges: &[(u32, u32)]) -> (Vec<usize>, Vec<usize>) {
    let mut pairs: Vec<(u32, u32)> = edges
        .iter()
        .filter(|(a, b)| a != b && *a != 0 && *b != 0)
        .map(|&(a, b)| (a.max(b) - 1, a.min(b) - 1))
        .collect();
    pairs.sort_unstable();
    pairs.dedup();
    let mut col_ptr = vec![0usize; nodes];
    for (col, _) in &pairs {
        col_ptr[*col as usize + 1] += 1;
    }
    for n in 1..nodes {
        col_ptr[n] += col_ptr[n - 1];
    }
    (col_ptr, pairs.into_iter().map(|(_, row)| row as usize).collect())
}
