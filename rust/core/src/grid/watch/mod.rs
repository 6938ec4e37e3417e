//! What is up now: the windows of a night, worked out once, and asked again and again.

mod table;

use self::table::{Lookup, Table};
use super::parallel::Workers;
use super::place::{Buffers, Chain, PlaceColumns, ROWS};
use crate::astrometry::{Observer, Sky, Targets, Track, TrackPlan};
use crate::error::{Error, Result, Status};
use crate::events::{span_ends, utc_text};
use crate::time::Utc;

pub use self::table::WatchedWindows;

/// The windows of a span, ready to be asked what is up. Nothing in it changes: any number of threads may ask.
#[derive(Debug, Clone)]
pub struct Watch {
    start: Utc,
    stop: Utc,
    table: Table,
    track: Track,
}

/// The columns asked for, all of one length, owned by the caller.
#[derive(Debug)]
pub struct WatchColumns<'a> {
    /// Whether all limits hold.
    pub up: &'a mut [bool],
    /// What closes the window that is open: codes of [`Cause`](crate::windows::Cause), 0 where none is.
    pub stop_reason: &'a mut [u8],
    /// Seconds until the window that is open closes; NaN where none is.
    pub seconds_left: Option<&'a mut [f64]>,
    /// Seconds until the next window of the span opens, whether one is open or not; NaN where none will.
    pub seconds_to_next: Option<&'a mut [f64]>,
    /// Where the targets are. The status is the worse of that of the place and that of the windows.
    pub places: PlaceColumns<'a>,
}

impl Watch {
    /// Of the windows in the span [start, stop), as [`window_table`](super::window_table) found them.
    ///
    /// # Errors
    /// Columns that do not fit one another, a span as [`span_ends`] refuses it, or the caller's wish to stop.
    pub fn new(
        observer: &Observer<'_>,
        start: Utc,
        stop: Utc,
        windows: &WatchedWindows<'_>,
        workers: &mut Workers<'_>,
    ) -> Result<Self> {
        let (first, last) = span_ends(observer, start, stop)?;
        let track = workers.track(TrackPlan::over(first, last), observer.ephemeris)?;
        Ok(Watch { start, stop, table: Table::new(windows)?, track })
    }

    /// What is up at an instant of the span, and where everything stands. Observer and targets are those that the
    /// windows were computed for.
    ///
    /// The edges of the windows are compared to the nanosecond, and a window is half-open: up at its start,
    /// not at its stop. Places are the same bits as those of [`place`](super::place), by the same loops (test
    /// `a_watch_gives_the_bits_of_windows_and_places`). A row of which the windows are not known because of a
    /// limit that is not good is not up and has that status; its place is as good as any.
    ///
    /// # Errors
    /// An instant outside the span, of which nothing is known; outputs or targets of another number; or the
    /// caller's wish to stop.
    pub fn at(
        &self,
        observer: &Observer<'_>,
        targets: &Targets<'_>,
        when: Utc,
        out: WatchColumns<'_>,
        workers: &mut Workers<'_>,
    ) -> Result<()> {
        if !(self.start.nanoseconds()..self.stop.nanoseconds()).contains(&when.nanoseconds()) {
            let allowed =
                format!("{} to before {}, the span watched", utc_text(self.start), utc_text(self.stop));
            return Err(Error::invalid("when", utc_text(when), allowed));
        }
        if targets.len() != self.table.len() {
            let allowed = format!("{}, as many as were watched", self.table.len());
            return Err(Error::invalid("targets", targets.len(), allowed));
        }
        out.check(targets.len())?;
        let at_the_instant = |status: Status| Error::invalid("when", utc_text(when), status.word());
        let tai = observer.orientation.leap_seconds().to_tai(when).map_err(at_the_instant)?;
        let sky = self.track.sky(observer, tai).map_err(at_the_instant)?;
        let chain = Chain { observer, targets, isa: workers.isa() };
        let mut buffers = Buffers::new();
        chain.partners(&sky, 0..ROWS, &mut buffers, &out.places);
        workers.for_each_with(
            out.blocks(ROWS),
            || buffers.clone(),
            |buffers, (first, block)| {
                self.block(&chain, &sky, when, first, block, buffers);
            },
        )
    }

    fn block(
        &self,
        chain: &Chain<'_>,
        sky: &Sky,
        when: Utc,
        first: usize,
        mut out: WatchColumns<'_>,
        buffers: &mut Buffers,
    ) {
        let rows = out.up.len();
        if out.places.columns.is_empty() && matches!(chain.targets, Targets::Catalog(_)) {
            // Nothing is asked of the directions; those of bodies have a status of their own.
            chain.status(sky, first, out.places.status);
        } else {
            chain.directions(sky, first, 0..rows, buffers, &mut out.places);
            buffers.write(&mut out.places, chain.observer, chain.isa);
        }
        chain.isa.run(Lookup {
            table: &self.table,
            rows: first..first + rows,
            when: when.nanoseconds(),
            up: out.up,
            stop_reason: out.stop_reason,
            seconds_left: out.seconds_left,
            seconds_to_next: out.seconds_to_next,
            status: out.places.status,
        });
    }
}

impl WatchColumns<'_> {
    fn check(&self, rows: usize) -> Result<()> {
        for (name, length) in [
            ("up", Some(self.up.len())),
            ("stop_reason", Some(self.stop_reason.len())),
            ("seconds_left", self.seconds_left.as_ref().map(|values| values.len())),
            ("seconds_to_next", self.seconds_to_next.as_ref().map(|values| values.len())),
        ] {
            if length.is_some_and(|length| length != rows) {
                let given = format!("{} values", length.unwrap_or_default());
                return Err(Error::invalid(name, given, rows.to_string()));
            }
        }
        self.places.check(rows)
    }

    /// Cut into blocks of `size` rows, each with the number of its first row.
    fn blocks(self, size: usize) -> Vec<(usize, Self)> {
        let WatchColumns { up, stop_reason, seconds_left, seconds_to_next, places } = self;
        let mut others = up.chunks_mut(size).zip(stop_reason.chunks_mut(size));
        let mut left = seconds_left.map(|values| values.chunks_mut(size));
        let mut to_next = seconds_to_next.map(|values| values.chunks_mut(size));
        let mut blocks = Vec::new();
        for (first, places) in places.blocks(size) {
            let Some((up, stop_reason)) = others.next() else { break };
            let seconds_left = left.as_mut().and_then(Iterator::next);
            let seconds_to_next = to_next.as_mut().and_then(Iterator::next);
            blocks.push((first, WatchColumns { up, stop_reason, seconds_left, seconds_to_next, places }));
        }
        blocks
    }
}
