//! Work shared out among threads, its results in order.

/// The result of `of` for each number below `count`, in their order, on at most `threads` threads. Every
/// thread takes each n-th number: neighbours are often alike in size. Which thread took which changes
/// nothing, as long as `of` depends on its number alone.
pub(crate) fn in_order<T: Send>(count: usize, threads: usize, of: impl Fn(usize) -> T + Sync) -> Vec<T> {
    let threads = threads.clamp(1, count.max(1));
    let of_thread =
        |thread: usize| -> Vec<(usize, T)> { (thread..count).step_by(threads).map(|k| (k, of(k))).collect() };
    let mut found = std::thread::scope(|scope| {
        let of_thread = &of_thread;
        let others: Vec<_> = (1..threads)
            .map(|thread| scope.spawn(move || of_thread(thread)))
            .collect();
        let mut found = of_thread(0);
        for other in others {
            found.extend(other.join().unwrap_or_else(|panic| std::panic::resume_unwind(panic)));
        }
        found
    });
    found.sort_unstable_by_key(|(k, _)| *k);
    found.into_iter().map(|(_, result)| result).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn results_are_in_order_for_any_number_of_threads() {
        for count in [0, 1, 7, 100] {
            let squares: Vec<usize> = (0..count).map(|k| k * k).collect();
            for threads in [0, 1, 2, 3, 64] {
                assert_eq!(in_order(count, threads, |k| k * k), squares);
            }
        }
    }
}
