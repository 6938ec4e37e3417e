//! Sets of half-open intervals [start, stop), each edge with its reason; no astronomical word.
//!
//! The abscissa is whatever the caller counts in. Intervals of a set are in order, do not overlap
//! and are not empty, and stay so under every operation here. When two edges coincide the set that
//! came first keeps its reason.

/// Why an edge is where it is: a small code that the caller gives a meaning.
pub type Reason = u8;

/// [start, stop).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Interval {
    /// First abscissa in it.
    pub start: f64,
    /// First abscissa after it.
    pub stop: f64,
    /// Why it begins.
    pub start_reason: Reason,
    /// Why it ends.
    pub stop_reason: Reason,
}

/// Intervals in order, apart and not empty.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct IntervalSet {
    intervals: Vec<Interval>,
}

impl std::ops::Deref for IntervalSet {
    type Target = [Interval];
    fn deref(&self) -> &[Interval] {
        &self.intervals
    }
}

impl IntervalSet {
    /// The empty set.
    pub fn new() -> Self {
        IntervalSet::default()
    }

    /// One interval, both edges with one reason; the empty set when `start` is not before `stop`.
    pub fn whole(start: f64, stop: f64, reason: Reason) -> Self {
        let mut set = IntervalSet::new();
        set.fill(start, stop, reason);
        set
    }

    /// Becomes one interval.
    pub fn fill(&mut self, start: f64, stop: f64, reason: Reason) {
        self.intervals.clear();
        self.push(Interval { start, stop, start_reason: reason, stop_reason: reason });
    }

    /// Becomes empty.
    pub fn clear(&mut self) {
        self.intervals.clear();
    }

    /// Appends an interval that begins after the last one ends, or joins it when it begins there.
    /// An empty one is ignored.
    pub fn push(&mut self, interval: Interval) {
        if interval.start >= interval.stop || interval.start.is_nan() || interval.stop.is_nan() {
            return;
        }
        match self.intervals.last_mut() {
            Some(last) if interval.start <= last.stop => {
                if interval.stop > last.stop {
                    last.stop = interval.stop;
                    last.stop_reason = interval.stop_reason;
                }
            }
            _ => self.intervals.push(interval),
        }
    }

    /// The same, but one that begins where the last ends stays apart from it: there is a reason between.
    pub fn push_apart(&mut self, interval: Interval) {
        let after = self.intervals.last().is_none_or(|last| last.stop <= interval.start);
        if after && interval.start < interval.stop {
            self.intervals.push(interval);
        }
    }

    /// Becomes where a function is not negative within [start, stop), given whether it is so at `from`,
    /// at or before `start`, and where it changes after that, in order. Edges of the range itself keep
    /// `edge_reason`; the others get `reason`.
    pub fn fill_from_changes(
        &mut self,
        range: Interval,
        inside_at_start: bool,
        changes: impl Iterator<Item = (f64, bool)>,
        reason: Reason,
    ) {
        self.intervals.clear();
        let mut open = inside_at_start.then_some((range.start, range.start_reason));
        for (at, rising) in changes {
            if at <= range.start {
                open = rising.then_some((range.start, range.start_reason));
            } else if at >= range.stop {
                break;
            } else if rising {
                open = open.or(Some((at, reason)));
            } else if let Some((start, start_reason)) = open.take() {
                self.push(Interval { start, stop: at, start_reason, stop_reason: reason });
            }
        }
        if let Some((start, start_reason)) = open {
            self.push(Interval { start, start_reason, stop: range.stop, stop_reason: range.stop_reason });
        }
    }

    /// Becomes what is in both; `scratch` is space to work in.
    pub fn intersect(&mut self, other: &IntervalSet, scratch: &mut IntervalSet) {
        scratch.clear();
        let mut theirs = other.iter().peekable();
        for mine in &self.intervals {
            while let Some(their) = theirs.peek() {
                if their.stop <= mine.start {
                    theirs.next();
                    continue;
                }
                if their.start >= mine.stop {
                    break;
                }
                let (start, start_reason) = if their.start > mine.start {
                    (their.start, their.start_reason)
                } else {
                    (mine.start, mine.start_reason)
                };
                let (stop, stop_reason) = if their.stop < mine.stop {
                    (their.stop, their.stop_reason)
                } else {
                    (mine.stop, mine.stop_reason)
                };
                // Straight to the list: pieces that touch stay apart, since both sets kept them apart.
                scratch.intervals.push(Interval { start, stop, start_reason, stop_reason });
                if their.stop > mine.stop {
                    break;
                }
                theirs.next();
            }
        }
        std::mem::swap(self, scratch);
    }

    /// What is in either.
    pub fn union(&self, other: &IntervalSet) -> IntervalSet {
        let mut all: Vec<Interval> = self.iter().chain(other.iter()).copied().collect();
        all.sort_by(|a, b| a.start.total_cmp(&b.start));
        let mut set = IntervalSet::new();
        for interval in all {
            set.push(interval);
        }
        set
    }

    /// What of [start, stop) is not in the set. An edge keeps the reason of the edge it was.
    pub fn complement(&self, range: Interval) -> IntervalSet {
        let mut set = IntervalSet::new();
        let (mut start, mut start_reason) = (range.start, range.start_reason);
        for interval in &self.intervals {
            if interval.start >= range.stop {
                break;
            }
            set.push(Interval {
                start,
                start_reason,
                stop: interval.start,
                stop_reason: interval.start_reason,
            });
            if interval.stop > start {
                (start, start_reason) = (interval.stop, interval.stop_reason);
            }
        }
        set.push(Interval { start, start_reason, stop: range.stop, stop_reason: range.stop_reason });
        set
    }

    /// Sum of the lengths.
    pub fn duration(&self) -> f64 {
        // Not `sum`, whose zero is −0.
        self.iter().fold(0.0, |sum, interval| sum + (interval.stop - interval.start))
    }

    /// Keeps the intervals for which the answer is yes.
    pub fn retain(&mut self, keep: impl FnMut(&Interval) -> bool) {
        self.intervals.retain(keep);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const RANGE: Interval = Interval { start: 0.0, stop: 100.0, start_reason: 0, stop_reason: 0 };

    struct Random(u64);

    impl Random {
        fn next(&mut self, below: u64) -> u64 {
            self.0 = self.0.wrapping_mul(6364136223846793005).wrapping_add(1442695040888963407);
            (self.0 >> 33) % below
        }

        /// A set on whole numbers, with room for touching and coinciding edges.
        fn set(&mut self, reason: Reason) -> IntervalSet {
            let mut set = IntervalSet::new();
            let mut at = self.next(20) as f64;
            while at < 100.0 {
                let stop = (at + 1.0 + self.next(15) as f64).min(100.0);
                set.push(Interval { start: at, stop, start_reason: reason, stop_reason: reason });
                at = stop + 1.0 + self.next(15) as f64;
            }
            set
        }
    }

    fn contains(set: &IntervalSet, x: f64) -> bool {
        set.iter().any(|i| i.start <= x && x < i.stop)
    }

    fn and(a: &IntervalSet, b: &IntervalSet) -> IntervalSet {
        let mut result = a.clone();
        result.intersect(b, &mut IntervalSet::new());
        result
    }

    fn same(a: &IntervalSet, b: &IntervalSet) {
        let bounds = |set: &IntervalSet| set.iter().map(|i| (i.start, i.stop)).collect::<Vec<_>>();
        assert_eq!(bounds(a), bounds(b));
    }

    #[test]
    fn membership_decides_every_operation() {
        let mut random = Random(1);
        for _ in 0..2000 {
            let (a, b) = (random.set(1), random.set(2));
            let (both, either, not) = (and(&a, &b), a.union(&b), a.complement(RANGE));
            for half in 0..200 {
                let x = half as f64 * 0.5;
                assert_eq!(contains(&both, x), contains(&a, x) && contains(&b, x));
                assert_eq!(contains(&either, x), contains(&a, x) || contains(&b, x));
                assert_eq!(contains(&not, x), !contains(&a, x));
            }
        }
    }

    #[test]
    fn laws_of_sets() {
        let mut random = Random(2);
        for _ in 0..2000 {
            let (a, b) = (random.set(1), random.set(2));
            let not = |s: &IntervalSet| s.complement(RANGE);
            same(&not(&and(&a, &b)), &not(&a).union(&not(&b)));
            same(&not(&a.union(&b)), &and(&not(&a), &not(&b)));
            same(&not(&not(&a)), &a);
            same(&and(&a, &a), &a);
            same(&a.union(&a), &a);
            let sum = a.duration() + b.duration();
            assert_eq!(and(&a, &b).duration() + a.union(&b).duration(), sum);
        }
    }

    #[test]
    fn edges_keep_the_reason_of_the_limit_that_set_them() {
        let a = IntervalSet::whole(0.0, 10.0, 1);
        let b = IntervalSet::whole(5.0, 20.0, 2);
        let both = and(&a, &b);
        assert_eq!((both[0].start_reason, both[0].stop_reason), (2, 1));
        // Coinciding edges: the set that came first keeps its reason.
        assert_eq!(and(&a, &IntervalSet::whole(0.0, 10.0, 3))[0].start_reason, 1);
    }

    #[test]
    fn changes_before_the_range_only_set_the_beginning() {
        let mut set = IntervalSet::new();
        let changes = [(-3.0, true), (-1.0, false), (2.0, true), (100.0, false)];
        set.fill_from_changes(RANGE, false, changes.into_iter(), 7);
        assert_eq!(set.len(), 1);
        assert_eq!((set[0].start, set[0].stop), (2.0, 100.0));
        assert_eq!((set[0].start_reason, set[0].stop_reason), (7, 0));
    }
}
