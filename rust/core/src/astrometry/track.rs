//! The sky over a span, interpolated: what makes the cost of an instant a hundred multiply-adds.
//!
//! [`Celestial`] is computed at the nodes, which stand at every half day of TT, the same for every
//! span, and interpolated by the polynomial of degree five through the six nearest. An instant's
//! result depends on the instant alone and not on the span it was asked for with: one instant, a
//! night and a year of them give the same bits. The Earth orientation table has its own spline with
//! knots at 0h UTC and is read directly; the diurnal rotation is analytic.
//!
//! Error of the interpolation: below 0.5 µas in every direction, measured between the nodes by
//! [`Track::interpolation_error`] and held to by the tests, from both sides.

use super::sky::{Celestial, Observer, Sky};
use crate::constants::AU_PER_DAY_OVER_C;
use crate::ephemeris::Ephemeris;
use crate::error::Status;
use crate::math::vector::{norm, sub};
use crate::time::{Instant, Tai, Tt};

/// Nodes a day.
pub const NODES_PER_DAY: f64 = 2.0;
const POINTS: usize = 6;
const BEFORE: i64 = 2;
type Channels = [f64; Celestial::CHANNELS];

/// Half-day intervals, each with its polynomial; only those that were asked for.
#[derive(Debug, Clone)]
pub struct Track {
    /// Numbers of the intervals, ascending: interval k begins at node k, MJD k / [`NODES_PER_DAY`] TT.
    intervals: Vec<i64>,
    /// Coefficients of the powers of the fraction of the interval.
    pieces: Vec<[Channels; POINTS]>,
    /// Intervals that lie outside the ephemeris.
    outside: Vec<bool>,
}

/// The interval of an instant and the fraction of it that has passed.
fn locate(tt: Instant<Tt>) -> (i64, f64) {
    let (day, fraction) = tt.mjd_parts();
    let within = fraction * NODES_PER_DAY;
    let whole = within.floor();
    ((day * NODES_PER_DAY + whole) as i64, within - whole)
}

/// The instant of a node.
pub fn node_instant(node: i64) -> Instant<Tt> {
    let day = (node as f64 / NODES_PER_DAY).floor();
    Instant::from_mjd(day, node as f64 / NODES_PER_DAY - day)
}

/// The nodes that a track needs, in order, to be computed by whoever has threads.
#[derive(Debug, Clone)]
pub struct TrackPlan {
    intervals: Vec<i64>,
    nodes: Vec<i64>,
}

impl TrackPlan {
    /// A track over the span from `start` to `stop`, both included.
    pub fn over(start: Instant<Tai>, stop: Instant<Tai>) -> Self {
        Self::of_intervals((locate(start.to_tt()).0..=locate(stop.to_tt()).0).collect())
    }

    /// A track that covers each of the instants and nothing else.
    pub fn through(instants: impl Iterator<Item = Instant<Tai>>) -> Self {
        let mut intervals: Vec<i64> = Vec::new();
        for instant in instants {
            let interval = locate(instant.to_tt()).0;
            if intervals.last() != Some(&interval) {
                intervals.push(interval);
            }
        }
        intervals.sort_unstable();
        intervals.dedup();
        Self::of_intervals(intervals)
    }

    /// One plan for all that several cover.
    pub fn join(plans: Vec<TrackPlan>) -> Self {
        let mut intervals: Vec<i64> = plans.into_iter().flat_map(|plan| plan.intervals).collect();
        intervals.sort_unstable();
        intervals.dedup();
        Self::of_intervals(intervals)
    }

    fn of_intervals(intervals: Vec<i64>) -> Self {
        let mut nodes = Vec::with_capacity(intervals.len() + POINTS);
        for &interval in &intervals {
            let first = nodes.last().map_or(i64::MIN, |last: &i64| last + 1).max(interval - BEFORE);
            nodes.extend(first..interval - BEFORE + POINTS as i64);
        }
        TrackPlan { intervals, nodes }
    }

    /// Number of nodes.
    pub fn len(&self) -> usize {
        self.nodes.len()
    }

    /// Whether no instant was asked for.
    pub fn is_empty(&self) -> bool {
        self.nodes.is_empty()
    }

    /// Computes one node.
    pub fn node(&self, index: usize, ephemeris: &Ephemeris) -> Node {
        Node(Celestial::exact(node_instant(self.nodes[index]), ephemeris).map(Celestial::to_channels))
    }

    /// The track, from its nodes in order.
    pub fn finish(self, nodes: &[Node]) -> Track {
        let mut pieces = Vec::with_capacity(self.intervals.len());
        let mut outside = Vec::with_capacity(self.intervals.len());
        let mut at = 0;
        for &interval in &self.intervals {
            at += self.nodes[at..].partition_point(|&node| node < interval - BEFORE);
            let mut samples = [[f64::NAN; Celestial::CHANNELS]; POINTS];
            let mut good = true;
            for (sample, node) in samples.iter_mut().zip(&nodes[at..]) {
                match node.0 {
                    Ok(channels) => *sample = channels,
                    Err(_) => good = false,
                }
            }
            outside.push(!good);
            pieces.push(polynomial(&samples));
        }
        Track { intervals: self.intervals, pieces, outside }
    }

    /// The track, its nodes computed one after the other.
    pub fn compute(self, ephemeris: &Ephemeris) -> Track {
        let nodes: Vec<Node> = (0..self.len()).map(|index| self.node(index, ephemeris)).collect();
        self.finish(&nodes)
    }
}

/// A node of a track: what was computed there, or why nothing could be.
#[derive(Debug, Clone, Copy)]
pub struct Node(std::result::Result<Channels, Status>);

impl Track {
    /// A track over the span from `start` to `stop`, both included.
    pub fn over(start: Instant<Tai>, stop: Instant<Tai>, ephemeris: &Ephemeris) -> Self {
        TrackPlan::over(start, stop).compute(ephemeris)
    }

    /// A track that covers each of the instants and nothing else.
    pub fn through(instants: impl Iterator<Item = Instant<Tai>>, ephemeris: &Ephemeris) -> Self {
        TrackPlan::through(instants).compute(ephemeris)
    }

    /// What is known of an instant before anyone stands anywhere, interpolated.
    ///
    /// # Errors
    /// [`Status::OutsideEphemeris`], also when the track does not cover the instant.
    #[inline]
    pub fn celestial(&self, tt: Instant<Tt>) -> std::result::Result<Celestial, Status> {
        let (interval, u) = locate(tt);
        let index = self.index(interval).ok_or(Status::OutsideEphemeris)?;
        if self.outside[index] {
            return Err(Status::OutsideEphemeris);
        }
        let piece = &self.pieces[index];
        let mut value = piece[POINTS - 1];
        for power in (0..POINTS - 1).rev() {
            for channel in 0..Celestial::CHANNELS {
                value[channel] = value[channel] * u + piece[power][channel];
            }
        }
        Ok(Celestial::from_channels(value))
    }

    /// Spans are contiguous nearly always: then the index is a subtraction.
    #[inline]
    fn index(&self, interval: i64) -> Option<usize> {
        let guess = usize::try_from(interval.checked_sub(*self.intervals.first()?)?).ok()?;
        if self.intervals.get(guess) == Some(&interval) {
            return Some(guess);
        }
        self.intervals.binary_search(&interval).ok()
    }

    /// The sky of an observer at an instant.
    ///
    /// # Errors
    /// As [`Track::celestial`].
    #[inline]
    pub fn sky(&self, observer: &Observer<'_>, tai: Instant<Tai>) -> std::result::Result<Sky, Status> {
        let celestial = self.celestial(tai.to_tt())?;
        Ok(observer.sky_from(tai, &celestial))
    }

    /// The worst error of the interpolation in the middle of every `every`-th interval, radians of
    /// direction: of the pole, and of the aberration by the Earth's velocity.
    pub fn interpolation_error(&self, ephemeris: &Ephemeris, every: usize) -> f64 {
        let mut worst = 0.0f64;
        for &interval in self.intervals.iter().step_by(every.max(1)) {
            let middle = node_instant(interval).plus_seconds(43_200.0 / NODES_PER_DAY);
            let (Ok(exact), Ok(here)) = (Celestial::exact(middle, ephemeris), self.celestial(middle)) else {
                continue;
            };
            let pole = (exact.x - here.x).hypot(exact.y - here.y) + (exact.s - here.s).abs();
            let velocity = norm(sub(exact.earth_au_day, here.earth_au_day)) * AU_PER_DAY_OVER_C;
            worst = worst.max(pole + velocity);
        }
        worst
    }
}

/// Coefficients of the polynomial through six samples at −2, −1, 0, 1, 2, 3 (Newton's forward
/// differences, expanded in powers).
fn polynomial(samples: &[Channels; POINTS]) -> [Channels; POINTS] {
    let mut differences = *samples;
    for order in 1..POINTS {
        for i in (order..POINTS).rev() {
            for channel in 0..Celestial::CHANNELS {
                differences[i][channel] =
                    (differences[i][channel] - differences[i - 1][channel]) / order as f64;
            }
        }
    }
    // Horner on the Newton form: multiply by (u − node) and add the next difference.
    let mut powers = [[0.0; Celestial::CHANNELS]; POINTS];
    for i in (0..POINTS).rev() {
        let node = i as f64 - BEFORE as f64;
        for power in (0..POINTS).rev() {
            for channel in 0..Celestial::CHANNELS {
                let lower = if power > 0 { powers[power - 1][channel] } else { 0.0 };
                powers[power][channel] = lower - node * powers[power][channel];
            }
        }
        for channel in 0..Celestial::CHANNELS {
            powers[0][channel] += differences[i][channel];
        }
    }
    powers
}
