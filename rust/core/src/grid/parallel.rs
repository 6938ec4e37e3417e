//! Threads.
//!
//! Threads are started for each call and gone when it returns (50 µs for two): nothing is left behind
//! that a fork could break, and there is no pool to configure.

use crate::astrometry::{Node, Track, TrackPlan};
use crate::ephemeris::Ephemeris;
use crate::error::{Error, Result};
use crate::math::dispatch::Isa;
use std::sync::atomic::{AtomicBool, AtomicUsize, Ordering};
use std::sync::{Condvar, Mutex, PoisonError};
use std::time::Duration;

/// How often the caller is asked whether to go on.
const ASK_EVERY: Duration = Duration::from_millis(40);

/// Nodes of a track a block: 0.3 ms of work.
const NODES_A_BLOCK: usize = 8;

/// For callers who never want to stop.
pub const KEEP_GOING: fn() -> bool = || true;

/// How to run: on how many threads, with which instructions, and whom to ask whether to go on.
pub struct Workers<'a> {
    threads: usize,
    isa: Isa,
    keep_going: &'a mut dyn FnMut() -> bool,
    /// When the caller was asked last: a call is many loops, each of which may be short.
    asked: std::time::Instant,
}

impl<'a> Workers<'a> {
    /// `threads` 0 means as many as the machine runs at once. `keep_going` is called on the calling
    /// thread, some twenty times a second; when it says no, the call ends with [`Error::is_interrupted`].
    pub fn new(threads: usize, keep_going: &'a mut dyn FnMut() -> bool) -> Self {
        let threads = match threads {
            0 => std::thread::available_parallelism().map_or(1, usize::from),
            threads => threads,
        };
        Workers { threads, isa: Isa::best(), keep_going, asked: std::time::Instant::now() }
    }

    /// With loops compiled for one instruction set, where results must be the same bits on machines
    /// that differ.
    pub fn with_isa(self, isa: Isa) -> Self {
        Workers { isa, ..self }
    }

    /// The instruction set of the loops.
    pub fn isa(&self) -> Isa {
        self.isa
    }

    /// Does `work` on every item, in any order.
    ///
    /// # Errors
    /// When the caller said to stop; some items are then not done.
    pub fn for_each<T: Send>(&mut self, items: Vec<T>, work: impl Fn(T) + Sync) -> Result<()> {
        self.for_each_with(items, || (), |(), item| work(item))
    }

    /// The same with space that each thread makes once and keeps from item to item.
    ///
    /// # Errors
    /// When the caller said to stop; some items are then not done.
    pub fn for_each_with<T: Send, S>(
        &mut self,
        items: Vec<T>,
        space: impl Fn() -> S + Sync,
        work: impl Fn(&mut S, T) + Sync,
    ) -> Result<()> {
        if self.told_to_stop() {
            return Err(Error::interrupted());
        }
        let threads = self.threads.min(items.len());
        if threads <= 1 {
            return self.alone(items, space, work);
        }
        let queue = Mutex::new(items.into_iter());
        let stop = AtomicBool::new(false);
        let busy = AtomicUsize::new(threads);
        let (lock, done) = (Mutex::new(()), Condvar::new());
        std::thread::scope(|scope| {
            for _ in 0..threads {
                scope.spawn(|| {
                    let _signal = Signal { busy: &busy, lock: &lock, done: &done };
                    let mut space = space();
                    while !stop.load(Ordering::Relaxed) {
                        let next = queue.lock().unwrap_or_else(PoisonError::into_inner).next();
                        match next {
                            Some(item) => work(&mut space, item),
                            None => break,
                        }
                    }
                });
            }
            let mut guard = lock.lock().unwrap_or_else(PoisonError::into_inner);
            while busy.load(Ordering::Acquire) > 0 {
                guard = done.wait_timeout(guard, ASK_EVERY).unwrap_or_else(PoisonError::into_inner).0;
                if busy.load(Ordering::Acquire) > 0 && !(self.keep_going)() {
                    stop.store(true, Ordering::Relaxed);
                }
            }
        });
        if stop.into_inner() { Err(Error::interrupted()) } else { Ok(()) }
    }

    /// What `work` makes of every item, in the order of the items.
    ///
    /// # Errors
    /// The first of the items' errors, or the caller's wish to stop.
    pub fn map<T: Send, R: Send>(
        &mut self,
        items: Vec<T>,
        work: impl Fn(T) -> Result<R> + Sync,
    ) -> Result<Vec<R>> {
        let mut slots: Vec<Option<Result<R>>> = Vec::new();
        slots.resize_with(items.len(), || None);
        let tasks = items.into_iter().zip(slots.iter_mut()).collect();
        self.for_each(tasks, |(item, slot): (T, &mut Option<Result<R>>)| *slot = Some(work(item)))?;
        slots.into_iter().map(|slot| slot.unwrap_or_else(|| Err(Error::interrupted()))).collect()
    }

    /// A track, its nodes shared out.
    ///
    /// # Errors
    /// When the caller said to stop.
    pub fn track(&mut self, plan: TrackPlan, ephemeris: &Ephemeris) -> Result<Track> {
        let mut nodes = vec![None; plan.len()];
        let blocks = nodes.chunks_mut(NODES_A_BLOCK).enumerate().collect();
        self.for_each(blocks, |(block, nodes): (usize, &mut [Option<Node>])| {
            for (index, node) in (block * NODES_A_BLOCK..).zip(nodes) {
                *node = Some(plan.node(index, ephemeris));
            }
        })?;
        let nodes: Option<Vec<Node>> = nodes.into_iter().collect();
        Ok(plan.finish(&nodes.ok_or_else(Error::interrupted)?))
    }

    fn alone<T, S>(&mut self, items: Vec<T>, space: impl Fn() -> S, work: impl Fn(&mut S, T)) -> Result<()> {
        let mut space = space();
        for item in items {
            work(&mut space, item);
            if self.told_to_stop() {
                return Err(Error::interrupted());
            }
        }
        Ok(())
    }

    /// Asks the caller, if it is time to.
    fn told_to_stop(&mut self) -> bool {
        if self.asked.elapsed() < ASK_EVERY {
            return false;
        }
        self.asked = std::time::Instant::now();
        !(self.keep_going)()
    }
}

/// Says that a thread is done, also when it panics: the caller must not wait for ever.
struct Signal<'a> {
    busy: &'a AtomicUsize,
    lock: &'a Mutex<()>,
    done: &'a Condvar,
}

impl Drop for Signal<'_> {
    fn drop(&mut self) {
        let _guard = self.lock.lock().unwrap_or_else(PoisonError::into_inner);
        self.busy.fetch_sub(1, Ordering::Release);
        self.done.notify_one();
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_item_is_done_once() {
        for threads in [1, 2, 7] {
            let count = AtomicUsize::new(0);
            let mut go = KEEP_GOING;
            Workers::new(threads, &mut go)
                .for_each((0..1000).collect(), |i: usize| {
                    count.fetch_add(i, Ordering::Relaxed);
                })
                .unwrap();
            assert_eq!(count.into_inner(), 499_500);
        }
    }

    #[test]
    fn a_caller_is_asked_between_loops_that_are_short() {
        for threads in [1, 2] {
            let mut never = || false;
            let mut workers = Workers::new(threads, &mut never);
            let begun = std::time::Instant::now();
            let mut short =
                || workers.for_each(vec![(); 2], |()| std::thread::sleep(Duration::from_millis(1)));
            while short().is_ok() {
                assert!(begun.elapsed() < Duration::from_millis(200));
            }
        }
    }

    #[test]
    fn a_caller_who_says_no_is_heard_within_a_fifth_of_a_second() {
        for threads in [1, 2] {
            let mut never = || false;
            let begun = std::time::Instant::now();
            let result = Workers::new(threads, &mut never)
                .for_each(vec![(); 10_000], |()| std::thread::sleep(Duration::from_millis(1)));
            assert!(result.unwrap_err().is_interrupted());
            assert!(begun.elapsed() < Duration::from_millis(200));
        }
    }
}
