//! When can a telescope observe each of very many targets?
//!
//! This crate is the positional astronomy of Hourarc and nothing else: it knows nothing of Python,
//! files, the network, the environment or the system clock. Whatever comes from outside (leap
//! seconds, Earth orientation, kernels) is handed in as a value.
//!
//! Modules stand in one order, and a module may use only those above it:
//! `error`, `constants` → `math` → `time` → `earth` → `ephemeris` → `site`, `refraction` →
//! `astrometry` → `horizon` → `events` → `windows` → `grid`. `tests/structure` holds them to it.

pub mod error;
pub mod constants;
pub mod math;
pub mod time;
pub mod earth;
pub mod ephemeris;
pub mod site;
pub mod refraction;
pub mod astrometry;
pub mod horizon;
pub mod events;
pub mod windows;
pub mod grid;
