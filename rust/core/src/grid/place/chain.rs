//! The chain of a block's rows under one sky.

use super::buffers::{Buffers, NearUnderOneSky, StarsUnderOneSky, fill, set};
use super::columns::{PlaceColumn, PlaceColumns};
use super::looks;
use crate::astrometry::{Observer, Sky, Targets, body_direction, star_direction};
use crate::ephemeris::Body;
use crate::ephemeris::orbits::Orbits;
use crate::error::Status;
use crate::math::dispatch::Isa;
use crate::math::vector::{Vector, rotate};
use crate::windows::moon_phase_angle;
use std::ops::Range;

/// Who looks at what, and with which instructions.
#[derive(Clone, Copy)]
pub(in crate::grid) struct Chain<'a> {
    pub observer: &'a Observer<'a>,
    pub targets: &'a Targets<'a>,
    pub isa: Isa,
}

impl Chain<'_> {
    /// What is to be said of the targets from `target` on before any direction is known.
    pub fn status(&self, sky: &Sky, target: usize, out: &mut [u8]) {
        let note = sky.note();
        match self.targets {
            Targets::Catalog(catalog) => {
                for (status, own) in out.iter_mut().zip(&catalog.status()[target..]) {
                    *status = own.worst(note) as u8;
                }
            }
            _ => {
                for (status, target) in out.iter_mut().zip(target..) {
                    *status = self.targets.status(target).worst(note) as u8;
                }
            }
        }
    }

    /// Directions of the targets from `target` on, under one sky, into the rows of a block.
    pub fn directions(
        &self,
        sky: &Sky,
        target: usize,
        rows: Range<usize>,
        buffers: &mut Buffers,
        out: &mut PlaceColumns<'_>,
    ) {
        self.status(sky, target, &mut out.status[rows.clone()]);
        match self.targets {
            Targets::Catalog(catalog) if rows.len() > 1 => {
                let stars = catalog.columns(target..target + rows.len());
                self.isa.run(StarsUnderOneSky { stars, sky, first: rows.start, buffers });
            }
            Targets::Catalog(catalog) => {
                let direction = star_direction(&catalog.star(target), sky);
                set(&mut buffers.direction, rows.start, direction);
                set(&mut buffers.local, rows.start, rotate(&sky.local, direction));
            }
            Targets::Orbits(orbits) => self.orbits(orbits, sky, target, rows.clone(), buffers, out),
            Targets::Bodies(bodies) => {
                for (row, body) in rows.clone().zip(&bodies[target..]) {
                    let direction = self.body(*body, sky).unwrap_or_else(|status| {
                        out.status[row] = status as u8;
                        [f64::NAN; 3]
                    });
                    set(&mut buffers.direction, row, direction);
                    set(&mut buffers.local, row, rotate(&sky.local, direction));
                }
            }
        }
        looks::fill(self, sky, target, rows, out);
    }

    /// Directions of orbits from row `target` on, under one sky.
    fn orbits(
        &self,
        orbits: &Orbits,
        sky: &Sky,
        target: usize,
        rows: Range<usize>,
        buffers: &mut Buffers,
        out: &mut PlaceColumns<'_>,
    ) {
        let tdb = sky.tdb();
        let sun = match self.observer.ephemeris.state(Body::Sun, tdb) {
            Ok(sun) => sun,
            Err(bad) => {
                fill(&mut buffers.direction, rows.clone(), [f64::NAN; 3]);
                fill(&mut buffers.local, rows.clone(), [f64::NAN; 3]);
                for (status, target) in out.status[rows].iter_mut().zip(target..) {
                    let own = orbits.status(target);
                    *status = if own.is_bad() { own } else { bad } as u8;
                }
                return;
            }
        };
        let of_orbits = target..target + rows.len();
        let vectors = buffers.direction.each_mut().map(|axis| &mut axis[rows.clone()]);
        orbits.astrometric_batch(self.isa, of_orbits, tdb, sky.observer_au, sun, vectors);
        self.isa.run(NearUnderOneSky { sky, rows: rows.clone(), buffers });
        let note = sky.note();
        for (row, target) in rows.zip(target..) {
            out.status[row] = orbits.status_at(target, tdb, buffers.distance_au[row]).worst(note) as u8;
        }
    }

    /// What the columns asked for measure targets against, under one sky, into the rows of a block.
    pub fn partners(&self, sky: &Sky, rows: Range<usize>, buffers: &mut Buffers, out: &PlaceColumns<'_>) {
        if out.wants(PlaceColumn::DeclinationDeg) {
            fill(&mut buffers.pole, rows.clone(), sky.intermediate[2]);
        }
        let by_moonlight = out.wants(PlaceColumn::SkyBrightnessMagArcsec2);
        if by_moonlight || out.wants(PlaceColumn::MoonSeparationDeg) {
            let moon = self.body(Body::Moon, sky).unwrap_or([f64::NAN; 3]);
            fill(&mut buffers.moon, rows.clone(), moon);
            if by_moonlight {
                let [sin_altitude, phase_angle] = &mut buffers.moon_light;
                sin_altitude[rows.clone()].fill(rotate(&sky.local, moon)[2]);
                let angle = moon_phase_angle(self.observer.ephemeris, sky.tdb());
                phase_angle[rows.clone()].fill(angle.unwrap_or(f64::NAN));
            }
        }
        if out.wants(PlaceColumn::SunSeparationDeg) {
            fill(&mut buffers.sun, rows, self.body(Body::Sun, sky).unwrap_or([f64::NAN; 3]));
        }
    }

    fn body(&self, body: Body, sky: &Sky) -> std::result::Result<Vector, Status> {
        Ok(body_direction(body, self.observer.ephemeris, sky)?.direction)
    }
}
