//! A block of targets over a few weeks of nights.

use super::columns::{GridColumns, GridValues, NightSummary, Wanted};
use super::detail::{Circle, Sets, StarLimits, summary, windows};
use super::exact::ExactNights;
use super::kernel::{Arcs, Block, Directions, Keepout, Overlap, STARS, mark};
use super::night::{Mover, Night};
use crate::astrometry::{Catalog, Observer, Targets};
use crate::error::{Result, Status};
use crate::events::Days;
use crate::math::dispatch::Isa;
use crate::windows::{Column, LimitedSpan, Limits};
use std::f64::consts::{FRAC_PI_2, PI};

/// The caller's values for a block of targets on each of some nights.
pub(super) struct Tile<'a> {
    pub first: usize,
    pub count: usize,
    pub nights: Vec<GridColumns<'a>>,
}

impl<'a> Tile<'a> {
    /// Cuts the next nights off the columns, block by block of targets.
    pub fn cut(columns: GridColumns<'a>, nights: usize, targets: usize) -> (Vec<Tile<'a>>, GridColumns<'a>) {
        let mut tiles: Vec<Tile<'a>> = (0..targets)
            .step_by(STARS)
            .map(|first| Tile {
                first,
                count: STARS.min(targets - first),
                nights: (0..nights).map(|_| Vec::with_capacity(columns.len())).collect(),
            })
            .collect();
        let mut rest = Vec::with_capacity(columns.len());
        for (quantity, values) in columns {
            let (mut these, later) = values.split_at(nights * targets);
            for night in 0..nights {
                for tile in &mut tiles {
                    let (part, after) = these.split_at(tile.count);
                    these = after;
                    tile.nights[night].push((quantity, part));
                }
            }
            rest.push((quantity, later));
        }
        (tiles, rest)
    }
}

/// What a thread keeps from tile to tile.
pub(super) struct TileSpace {
    pub block: Box<Block>,
    pub sets: Sets,
    pub exact: ExactNights,
    /// Stars marked for the exact path: star, night.
    marked: Vec<(usize, usize)>,
}

impl Default for TileSpace {
    fn default() -> Self {
        TileSpace {
            block: Block::new(),
            sets: Sets::default(),
            exact: ExactNights::default(),
            marked: Vec::new(),
        }
    }
}

/// What all tiles of a call share.
pub(super) struct Season<'a> {
    observer: &'a Observer<'a>,
    targets: &'a Targets<'a>,
    limits: &'a Limits,
    wanted: Wanted,
    /// The limits without the shortest window, which is a matter of each night.
    exact_limits: Limits,
    /// Sines of the lowest and the highest topocentric altitude.
    sin_lowest: Column,
    sin_highest: Option<Column>,
    /// Whether the loop knows every limit.
    known: bool,
    /// Whether a limit differs from target to target.
    per_target: bool,
    /// Whether stars must keep away from the Moon and from the Sun (a limit on the altitudes of both
    /// may see to the latter).
    keeps: [bool; 2],
    isa: Isa,
}

/// Whether the loop and `detail` know every limit that is set on the target itself.
fn is_known(limits: &Limits) -> bool {
    // Without `..`: a new limit must be thought of here.
    let Limits {
        altitude_min: _,
        altitude_max: _,
        airmass_max: _,
        airmass_model: _,
        use_skyline,
        sun_altitude_max,
        sun_separation_min: _,
        moon_separation_min: _,
        moon_avoidance,
        moon_down_relaxes,
        moon_altitude_max,
        moon_illumination_max,
        sky_brightness_min_v,
        sky_model: _,
        hour_angle_min,
        hour_angle_max,
        declination_min,
        declination_max,
        azimuth_sectors,
        azimuth_rate_max,
        cable_range,
        allowed_intervals: _,
        phase,
        window_min_s: _,
    } = limits;
    let shared = |column: &Option<Column>| !matches!(column, Some(Column::Each(_)));
    shared(sun_altitude_max)
        && shared(moon_altitude_max)
        && shared(moon_illumination_max)
        && !use_skyline
        && moon_avoidance.is_none()
        && moon_down_relaxes.is_none()
        && sky_brightness_min_v.is_none()
        && hour_angle_min.is_none()
        && hour_angle_max.is_none()
        && declination_min.is_none()
        && declination_max.is_none()
        && azimuth_sectors.is_none()
        && azimuth_rate_max.is_none()
        && cable_range.is_none()
        && phase.is_none()
}

impl<'a> Season<'a> {
    pub fn new(
        observer: &'a Observer<'a>,
        targets: &'a Targets<'a>,
        limits: &'a Limits,
        wanted: Wanted,
        isa: Isa,
    ) -> Result<Self> {
        let lowest = limits.lowest_altitude(observer.refraction)?;
        let sine = |observed: f64| observer.refraction.topocentric_altitude(observed).sin();
        let sin_lowest = lowest.as_ref().map_or(Column::All(-1.0), |column| column.map(sine));
        let highest =
            limits.altitude_max.as_ref().filter(|c| !matches!(c, Column::All(a) if *a >= FRAC_PI_2));
        let sin_highest = highest
            .map(|column| column.map(|observed| if observed >= FRAC_PI_2 { 1.0 } else { sine(observed) }));
        // Two directions are at least as far apart as their altitudes.
        let sun_keeps = match (&limits.sun_separation_min, &limits.sun_altitude_max, &sin_lowest) {
            (None, _, _) => false,
            (Some(Column::All(least)), Some(Column::All(sun)), Column::All(sin)) => {
                sin.asin() - sun < *least + 1e-3
            }
            _ => true,
        };
        Ok(Season {
            observer,
            targets,
            limits,
            wanted,
            exact_limits: Limits { window_min_s: None, ..limits.clone() },
            sin_lowest,
            sin_highest,
            known: is_known(limits),
            per_target: limits.has_columns(),
            keeps: [limits.moon_separation_min.is_some(), sun_keeps],
            isa,
        })
    }

    pub fn exact_limits(&self) -> &Limits {
        &self.exact_limits
    }

    /// Whether the Moon and the Sun must be followed.
    pub fn bodies(&self) -> [bool; 2] {
        [self.keeps[0] || self.wanted.moon_separation_min, self.keeps[1]]
    }

    pub fn target_status(&self) -> Vec<Status> {
        (0..self.targets.len()).map(|row| self.status(row)).collect()
    }

    fn status(&self, row: usize) -> Status {
        self.targets.status(row).worst(self.limits.status(row))
    }

    /// Fills in a tile.
    pub fn tile(
        &self,
        weeks: &[Night],
        span: &LimitedSpan<'_>,
        days: &Days<'_>,
        mut tile: Tile<'_>,
        space: &mut TileSpace,
    ) {
        match self.targets {
            Targets::Catalog(catalog) => self.stars(catalog, weeks, span, &mut tile, space),
            Targets::Bodies(_) | Targets::Orbits(_) => {
                for index in 0..tile.count {
                    let row = tile.first + index;
                    let Some(target) = self.targets.moving(row) else { continue };
                    space.exact.compute(self.targets, row, span);
                    for (night, columns) in weeks.iter().zip(&mut tile.nights) {
                        let shortest_s = self.shortest_s(row);
                        let summary = space.exact.moving(target, days, night, shortest_s, &self.wanted);
                        let good = !self.status(row).is_bad();
                        NightSummary::write(summary.as_ref().filter(|_| good), columns, index);
                    }
                }
            }
        }
    }

    fn shortest_s(&self, row: usize) -> f64 {
        self.limits.window_min_s.as_ref().map_or(0.0, |column| column.at(row))
    }

    fn star_limits(&self, row: usize) -> StarLimits {
        let cos = |column: &Option<Column>| column.as_ref().map_or(1.0, |column| column.at(row).cos());
        StarLimits {
            sin_lowest: self.sin_lowest.at(row),
            sin_highest: self.sin_highest.as_ref().map_or(1.0, |column| column.at(row)),
            cos_keep: [cos(&self.limits.moon_separation_min), cos(&self.limits.sun_separation_min)],
            shortest_s: self.shortest_s(row),
        }
    }

    fn stars(
        &self,
        catalog: &Catalog,
        weeks: &[Night],
        span: &LimitedSpan<'_>,
        tile: &mut Tile<'_>,
        space: &mut TileSpace,
    ) {
        let rows = tile.first..tile.first + tile.count;
        let (first, last) = (&weeks[0], &weeks[weeks.len() - 1]);
        let at = [(first.epoch_yr, first.earth_au), (last.epoch_yr, last.earth_au)];
        self.isa.run(Directions { stars: catalog.columns(rows.clone()), at, block: &mut space.block });
        self.fill_limits(rows, &mut space.block);
        space.marked.clear();
        for (number, night) in weeks.iter().enumerate() {
            let share =
                (night.epoch_yr - first.epoch_yr) / (last.epoch_yr - first.epoch_yr).max(f64::MIN_POSITIVE);
            let columns = &mut tile.nights[number];
            if !self.known {
                space.marked.extend((0..tile.count).map(|index| (index, number)));
                continue;
            }
            self.loops(night, share, &mut space.block);
            if self.wanted.hours_only && self.sin_highest.is_none() {
                self.write_hours(night, share, tile.first, number, columns, space);
            } else {
                self.write_all(night, share, tile.first, number, columns, space);
            }
        }
        self.exact(weeks, span, tile, space);
    }

    /// The loops of one night.
    fn loops(&self, night: &Night, share: f64, block: &mut Block) {
        self.isa.run(Arcs { meridian: &night.meridian, share, block });
        for &dark in &night.dark {
            self.isa.run(Overlap { dark, rate: night.meridian.rate, block });
        }
        for (which, body) in night.bodies.iter().enumerate() {
            if let (Some(Mover { direction, reach, .. }), true) = (body, self.keeps[which]) {
                let (sin, cos) = reach.min(FRAC_PI_2).sin_cos();
                self.isa.run(Keepout {
                    direction: *direction,
                    velocity: night.velocity,
                    reach: (cos, sin),
                    which,
                    // The Sun moves so slowly that a second of time is 0.04″: beyond what the circle holds.
                    mark: if which == 0 { mark::NEAR_BODY } else { mark::GRAZES },
                    share,
                    block,
                });
            }
        }
    }

    fn write_hours(
        &self,
        night: &Night,
        share: f64,
        first: usize,
        number: usize,
        columns: &mut GridColumns<'_>,
        space: &mut TileSpace,
    ) {
        let TileSpace { block, sets, marked, .. } = space;
        let count = block.stars;
        if block.mark[..count].iter().any(|&mark| mark != mark::DONE) {
            for index in 0..count {
                if block.mark[index] == mark::GRAZES {
                    marked.push((index, number));
                } else if block.mark[index] == mark::NEAR_BODY {
                    let circle = Circle::new(block, index, share, night);
                    windows(&circle, night, &self.star_limits(first + index), sets);
                    block.seconds[index] = sets.left.duration();
                }
            }
        }
        for (_, values) in columns {
            if let GridValues::Single(values) = values {
                for (value, seconds) in values.iter_mut().zip(&block.seconds[..count]) {
                    *value = (seconds * (1.0 / 3600.0)) as f32;
                }
            }
        }
    }

    fn write_all(
        &self,
        night: &Night,
        share: f64,
        first: usize,
        number: usize,
        columns: &mut GridColumns<'_>,
        space: &mut TileSpace,
    ) {
        let TileSpace { block, sets, marked, .. } = space;
        for index in 0..block.stars {
            if block.mark[index] == mark::GRAZES {
                marked.push((index, number));
                continue;
            }
            if block.seconds[index].is_nan() {
                NightSummary::write(None, columns, index);
                continue;
            }
            let circle = Circle::new(block, index, share, night);
            windows(&circle, night, &self.star_limits(first + index), sets);
            let summary =
                summary(&circle, night, &sets.left, self.observer, self.limits.airmass_model, &self.wanted);
            NightSummary::write(Some(&summary), columns, index);
        }
    }

    /// The marked stars, each on its nights.
    fn exact(&self, weeks: &[Night], span: &LimitedSpan<'_>, tile: &mut Tile<'_>, space: &mut TileSpace) {
        let TileSpace { block, exact, marked, .. } = space;
        marked.sort_unstable();
        let (first, last) = (&weeks[0], &weeks[weeks.len() - 1]);
        let mut current = usize::MAX;
        for &(index, number) in marked.iter() {
            let row = tile.first + index;
            if index != current {
                exact.compute(self.targets, row, span);
                current = index;
            }
            let night = &weeks[number];
            let share =
                (night.epoch_yr - first.epoch_yr) / (last.epoch_yr - first.epoch_yr).max(f64::MIN_POSITIVE);
            let windows = exact.of_night(self.observer, night, self.shortest_s(row));
            let summary = windows.filter(|_| !self.status(row).is_bad()).map(|windows| {
                let circle = Circle::new(block, index, share, night);
                summary(&circle, night, windows, self.observer, self.limits.airmass_model, &self.wanted)
            });
            NightSummary::write(summary.as_ref(), &mut tile.nights[number], index);
        }
    }

    /// The block's limits. When they are the same for all targets, once is enough.
    fn fill_limits(&self, rows: std::ops::Range<usize>, block: &mut Block) {
        if !self.per_target {
            if !block.limits_are_filled {
                for index in 0..STARS {
                    self.fill_limit(0, index, block);
                }
                block.limits_are_filled = true;
            }
            return;
        }
        for (index, row) in rows.enumerate() {
            self.fill_limit(row, index, block);
            // A row with a bad limit has no hours.
            if self.limits.status(row).is_bad() {
                block.direction[0][index] = f64::NAN;
            }
        }
    }

    fn fill_limit(&self, row: usize, index: usize, block: &mut Block) {
        let keep = [&self.limits.moon_separation_min, &self.limits.sun_separation_min];
        block.sin_threshold[index] = self.sin_lowest.at(row);
        block.shortest_s[index] = self.shortest_s(row);
        for (which, column) in keep.iter().enumerate() {
            if let (Some(column), true) = (column, self.keeps[which]) {
                let (sin, cos) = column.at(row).min(PI).sin_cos();
                block.keep[which][0][index] = sin;
                block.keep[which][1][index] = cos;
            }
        }
    }
}
