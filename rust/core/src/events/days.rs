//! A span of UTC as the days of TT that it touches.

use super::arc::{Arc, StarArc};
use super::moving::{BodyArc, MovingNodes};
use crate::astrometry::{Moving, Observer, Targets, Track, TrackPlan};
use crate::error::{Error, Result, Status};
use crate::time::{Instant, Tai, Utc};

/// The days of a span, each with what all targets share.
#[derive(Debug, Clone)]
pub struct Days<'a> {
    /// The days in order.
    pub arcs: Vec<Arc<'a>>,
    /// First instant of the span.
    pub start: Utc,
    /// First instant after the span.
    pub stop: Utc,
    start_tai: Instant<Tai>,
    stop_tai: Instant<Tai>,
    nodes: Vec<MovingNodes>,
}

/// The two ends of a span on the uniform scale.
///
/// # Errors
/// When an end is NaT or before UTC, or the span is empty or runs backwards.
pub fn span_ends(observer: &Observer<'_>, start: Utc, stop: Utc) -> Result<(Instant<Tai>, Instant<Tai>)> {
    let end = |name: &str, utc: Utc| {
        observer.orientation.leap_seconds().to_tai(utc).map_err(|status| {
            Error::invalid(name, utc_text(utc), format!("an instant from 1960 on ({})", status.word()))
        })
    };
    let ends = (end("start", start)?, end("stop", stop)?);
    if ends.1.seconds_since(ends.0) > 0.0 {
        Ok(ends)
    } else {
        Err(Error::invalid(
            "stop",
            utc_text(stop),
            format!("an instant after the start, {}", utc_text(start)),
        ))
    }
}

/// An instant as people write it, to the second.
pub fn utc_text(utc: Utc) -> String {
    let Some(date) = utc.date() else {
        return "NaT".into();
    };
    let second = (utc.mjd_parts().1 * 86_400.0) as u32;
    let (hour, minute, second) = (second / 3600, second / 60 % 60, second % 60);
    format!("{:04}-{:02}-{:02}T{hour:02}:{minute:02}:{second:02}", date.year(), date.month(), date.day())
}

/// Days that a track must cover for a span: from the beginning of the first to the end of the last.
pub fn whole_days(start: Instant<Tai>, stop: Instant<Tai>) -> (i64, i64) {
    (start.to_tt().mjd_parts().0 as i64, stop.to_tt().mjd_parts().0 as i64)
}

/// The track that [`Days::new`] needs for a span.
///
/// # Errors
/// As [`span_ends`].
pub fn track_for(observer: &Observer<'_>, start: Utc, stop: Utc) -> Result<Track> {
    Ok(track_plan(observer, start, stop)?.compute(observer.ephemeris))
}

/// The plan of that track, for a caller who has threads.
///
/// # Errors
/// As [`span_ends`].
pub fn track_plan(observer: &Observer<'_>, start: Utc, stop: Utc) -> Result<TrackPlan> {
    let (start, stop) = span_ends(observer, start, stop)?;
    let (first, last) = whole_days(start, stop);
    let at = |day: i64| Instant::<crate::time::Tt>::from_mjd(day as f64, 0.0).to_tai();
    Ok(TrackPlan::over(at(first), at(last + 1)))
}

impl<'a> Days<'a> {
    /// The days of the span [start, stop), on a track from [`track_for`] the same span.
    ///
    /// # Errors
    /// As [`span_ends`], and when the span leaves the ephemeris.
    pub fn new(observer: Observer<'a>, track: &'a Track, start: Utc, stop: Utc) -> Result<Self> {
        let (start_tai, stop_tai) = span_ends(&observer, start, stop)?;
        let (first, last) = whole_days(start_tai, stop_tai);
        let mut arcs = Vec::with_capacity((last - first + 1) as usize);
        for day in first..=last {
            let arc = Arc::new(observer, track, day).map_err(|status| {
                let given = format!("{} to {}", utc_text(start), utc_text(stop));
                Error::invalid("the span", given, format!("a span within the ephemeris ({})", status.word()))
            })?;
            arcs.push(arc);
        }
        Ok(Days { arcs, start, stop, start_tai, stop_tai, nodes: Vec::new() })
    }

    /// Prepares what targets need that move; a catalogue does without.
    ///
    /// # Errors
    /// When the span leaves the ephemeris.
    pub fn prepare(&mut self, targets: &Targets<'_>) -> Result<()> {
        if !matches!(targets, Targets::Catalog(_)) && self.nodes.is_empty() {
            self.nodes =
                self.arcs.iter().map(MovingNodes::new).collect::<std::result::Result<_, Status>>().map_err(
                    |status| Error::invalid("the span", status.word(), "a span within the ephemeris"),
                )?;
        }
        Ok(())
    }

    /// Who looks.
    pub fn observer(&self) -> &Observer<'a> {
        &self.arcs[0].observer
    }

    /// The part of a day that belongs to the span, as fractions of the day.
    pub fn part(&self, arc: &Arc<'_>) -> (f64, f64) {
        (arc.fraction(self.start_tai).clamp(0.0, 1.0), arc.fraction(self.stop_tai).clamp(0.0, 1.0))
    }

    /// The worst that is to be said of the Earth orientation during the span.
    pub fn note(&self) -> Status {
        self.arcs.iter().fold(Status::Ok, |worst, arc| worst.worst(arc.note))
    }

    /// The instant, UTC, at a fraction of a day.
    #[inline]
    pub fn utc(&self, arc: &Arc<'_>, fraction: f64) -> Utc {
        arc.utc(fraction)
    }

    /// A star on one of the days.
    #[inline(always)]
    pub fn star(&self, index: usize, star: &crate::astrometry::Star) -> StarArc {
        StarArc::new(&self.arcs[index], star)
    }

    /// Row `row` of targets that move on one of the days; [`Days::prepare`] comes first.
    ///
    /// # Errors
    /// [`Status::OutsideEphemeris`]; [`Status::NoDirection`] for a catalogue.
    pub fn moving(
        &self,
        index: usize,
        targets: &Targets<'_>,
        row: usize,
    ) -> std::result::Result<BodyArc, Status> {
        targets.moving(row).map_or(Err(Status::NoDirection), |target| self.body(index, target))
    }

    /// A target that moves on one of the days; [`Days::prepare`] comes first.
    ///
    /// # Errors
    /// [`Status::OutsideEphemeris`].
    pub fn body<'t>(
        &self,
        index: usize,
        target: impl Into<Moving<'t>>,
    ) -> std::result::Result<BodyArc, Status> {
        let (arc, nodes) = (&self.arcs[index], &self.nodes[index]);
        match target.into() {
            Moving::Body(body) => BodyArc::new(arc, &nodes.skies, body),
            Moving::Orbit(orbits, row) => Ok(BodyArc::of_orbit(arc, nodes, orbits, row)),
        }
    }
}
