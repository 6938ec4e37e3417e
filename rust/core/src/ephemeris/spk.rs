//! Kernels in the SPK format, read from bytes that the caller holds or maps.
//!
//! # Reference
//! NAIF, *Double Precision Array Files (DAF) Required Reading* and *SPK Required Reading*: file record,
//! summary records, segment types 2 (Chebyshev polynomials for position) and 3 (for position and
//! velocity). Other types are recognised and named in messages, not evaluated.
//!
//! # Error
//! Arithmetic only: within 1e-13 of the values jplephem computes from the same file, relative to the
//! length of the vector (`tests::agrees_with_jplephem`).

use std::fmt;
use std::sync::Arc;

use super::daf::{Reader, Summary, WORD_BYTES, byte_order, summaries};
use super::{Body, State, chebyshev};
use crate::constants::{ASTRONOMICAL_UNIT_M, J2000_MJD, SECONDS_PER_DAY};
use crate::error::{Error, Result, Status};
use crate::math::vector::{Vector, add, scale, sub};
use crate::time::{Instant, Tdb};

/// Longest chain of centres followed before it is called a loop; real ones have two or three links.
const CHAIN_MAX: usize = 12;
/// The code of the solar system barycentre.
const BARYCENTRE: i32 = 0;
/// The only reference frame read: J2000, which in the DE series is the ICRF.
const FRAME_J2000: i32 = 1;

const AU_PER_KM: f64 = 1000.0 / ASTRONOMICAL_UNIT_M;
const AU_PER_DAY_PER_KM_S: f64 = AU_PER_KM * SECONDS_PER_DAY;

/// How the records of a segment are to be read.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Form {
    /// Type 2: three series, the velocity is their slope.
    Position,
    /// Type 3: six series.
    PositionAndVelocity,
}

/// One segment that can be evaluated: a target about a centre over an interval.
#[derive(Debug, Clone, Copy)]
struct Segment {
    target: i32,
    centre: i32,
    form: Form,
    /// Interval of validity, TDB seconds past J2000.0.
    start_s: f64,
    stop_s: f64,
    /// Start of the first record, and length of each, TDB seconds.
    records_start_s: f64,
    record_s: f64,
    first_byte: usize,
    record_bytes: usize,
    records: usize,
    /// Coefficients of a series.
    count: usize,
}

/// A kernel: the segments of an SPK file over shared bytes. Cheap to clone, and free to share
/// between threads.
#[derive(Clone)]
pub struct Spk {
    name: Arc<str>,
    bytes: Arc<dyn AsRef<[u8]> + Send + Sync>,
    big_endian: bool,
    /// By target, and for one target the last of the file first, since that one has precedence.
    segments: Arc<[Segment]>,
    /// What else is in the file, for messages: target and why it cannot be read.
    unread: Arc<[(i32, String)]>,
    codes: [i32; Body::ALL.len()],
}

impl fmt::Debug for Spk {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "Spk({:?}, {} segments)", self.name, self.segments.len())
    }
}

impl Spk {
    /// Reads the structure of a kernel; the coefficients stay where they are until asked for.
    ///
    /// `bytes` is the whole file, owned or mapped; `name` is for messages. A file that is not an SPK
    /// file, is damaged in its structure or cut short is an [`Error`] that says where. Segments of
    /// types or frames that are not read here are passed over; asking for such a body names the reason.
    pub fn new(bytes: impl AsRef<[u8]> + Send + Sync + 'static, name: &str) -> Result<Spk> {
        let fault = |message: String| Error::table(name, 0, message);
        let data = bytes.as_ref();
        let big_endian = byte_order(data).map_err(fault)?;
        let reader = Reader { bytes: data, big_endian };
        let mut segments = Vec::new();
        let mut unread = Vec::new();
        for (index, summary) in summaries(reader).map_err(fault)?.into_iter().enumerate() {
            match summary.segment(reader) {
                Ok(segment) => segments.push(segment),
                Err(Unreadable::Foreign(reason)) => unread.push((summary.target, reason)),
                Err(Unreadable::Damaged(reason)) => {
                    return Err(fault(format!(
                        "segment {} (body {} about {}): {reason}",
                        index + 1,
                        summary.target,
                        summary.centre
                    )));
                }
            }
        }
        if segments.is_empty() && unread.is_empty() {
            return Err(fault("holds no segment".into()));
        }
        segments.reverse();
        segments.sort_by_key(|segment| segment.target);
        let holds = |code: i32| {
            segments.iter().any(|s| s.target == code) || unread.iter().any(|(target, _)| *target == code)
        };
        let codes = Body::ALL.map(|body| {
            let known = body.kernel_codes();
            known.iter().copied().find(|&code| holds(code)).unwrap_or(known[0])
        });
        Ok(Spk {
            name: name.into(),
            bytes: Arc::new(bytes),
            big_endian,
            segments: segments.into(),
            unread: unread.into(),
            codes,
        })
    }

    /// The name given at [`Spk::new`].
    pub fn name(&self) -> &str {
        &self.name
    }

    /// What this is, in words.
    pub fn provenance(&self) -> String {
        format!("SPK kernel {}", self.name)
    }

    /// The code under which this kernel holds a body: the planet itself where there is any segment of
    /// it, otherwise the barycentre of its system. Settled once for the file, so that no instant can
    /// silently slip from one to the other.
    pub fn code(&self, body: Body) -> i32 {
        self.codes[body as usize]
    }

    /// [`Spk::state_at`] at a typed instant.
    #[inline]
    pub fn state(&self, body: Body, tdb: Instant<Tdb>) -> std::result::Result<State, Status> {
        let (day, fraction) = tdb.mjd_parts();
        self.state_at(body, day, fraction)
    }

    /// [`Spk::position_at`] at a typed instant.
    #[inline]
    pub fn position(&self, body: Body, tdb: Instant<Tdb>) -> std::result::Result<Vector, Status> {
        let (day, fraction) = tdb.mjd_parts();
        self.position_at(body, day, fraction)
    }

    /// Barycentric state of a body at the TDB instant `day + fraction` (Modified Julian Date, any
    /// split; two parts keep 1e-11 s). [`Status::OutsideEphemeris`] outside the kernel, in a gap, or
    /// where a record is damaged.
    pub fn state_at(&self, body: Body, day: f64, fraction: f64) -> std::result::Result<State, Status> {
        self.relative_state_at(self.code(body), BARYCENTRE, day, fraction)
    }

    /// Barycentric position, au, as [`Spk::state_at`].
    pub fn position_at(&self, body: Body, day: f64, fraction: f64) -> std::result::Result<Vector, Status> {
        self.relative_position_at(self.code(body), BARYCENTRE, day, fraction)
    }

    /// State of the body coded `target` as seen from `centre`, along whatever chain of centres the
    /// kernel has; au and au/day, ICRS. Status as [`Spk::state_at`].
    pub fn relative_state_at(
        &self,
        target: i32,
        centre: i32,
        day: f64,
        fraction: f64,
    ) -> std::result::Result<State, Status> {
        self.chained(target, centre, day, fraction, Segment::state::<true>, Segment::state::<false>)
    }

    /// Position of the body coded `target` as seen from `centre`, au, as [`Spk::relative_state_at`].
    pub fn relative_position_at(
        &self,
        target: i32,
        centre: i32,
        day: f64,
        fraction: f64,
    ) -> std::result::Result<Vector, Status> {
        self.chained(target, centre, day, fraction, Segment::position::<true>, Segment::position::<false>)
    }

    /// Sums the links from `target` to `centre`: up from the target, and down from a common centre
    /// when the way up does not pass the centre itself.
    #[inline(always)]
    fn chained<T: Link>(
        &self,
        target: i32,
        centre: i32,
        day: f64,
        fraction: f64,
        big: impl Fn(&Segment, &[u8], f64, f64) -> Option<T>,
        little: impl Fn(&Segment, &[u8], f64, f64) -> Option<T>,
    ) -> std::result::Result<T, Status> {
        let bytes: &[u8] = (*self.bytes).as_ref();
        let since_day_s = (day - J2000_MJD) * SECONDS_PER_DAY;
        let since_fraction_s = fraction * SECONDS_PER_DAY;
        let step = |code: i32| -> Option<(i32, T)> {
            let segment = self.segment_at(code, since_day_s + since_fraction_s)?;
            let link = if self.big_endian {
                big(segment, bytes, since_day_s, since_fraction_s)
            } else {
                little(segment, bytes, since_day_s, since_fraction_s)
            };
            Some((segment.centre, link?))
        };

        let climb = |from: i32, to: i32| -> Option<T> {
            let (mut code, mut sum) = (from, T::NONE);
            for _ in 0..CHAIN_MAX {
                if code == to {
                    return Some(sum);
                }
                let (next, link) = step(code)?;
                sum = sum.plus(link);
                code = next;
            }
            None
        };

        if let Some(sum) = climb(target, centre) {
            return Ok(sum);
        }
        let (mut code, mut down) = (centre, T::NONE);
        for _ in 0..CHAIN_MAX {
            let (next, link) = step(code).ok_or(Status::OutsideEphemeris)?;
            down = down.plus(link);
            code = next;
            if let Some(up) = climb(target, code) {
                return Ok(up.minus(down));
            }
        }
        Err(Status::OutsideEphemeris)
    }

    fn segments_of(&self, target: i32) -> &[Segment] {
        let first = self.segments.partition_point(|segment| segment.target < target);
        let count = self.segments[first..].partition_point(|segment| segment.target == target);
        &self.segments[first..first + count]
    }

    fn segment_at(&self, target: i32, since_s: f64) -> Option<&Segment> {
        let first = self.segments.partition_point(|segment| segment.target < target);
        let mut same = self.segments[first..].iter().take_while(|segment| segment.target == target);
        same.find(|segment| since_s >= segment.start_s && since_s <= segment.stop_s)
    }

    /// The intervals, MJD TDB, over which the body coded `target` is known about the barycentre:
    /// ascending, apart.
    pub fn coverage_mjd(&self, target: i32) -> Vec<(f64, f64)> {
        let mjd = |since_s: f64| J2000_MJD + since_s / SECONDS_PER_DAY;
        self.coverage(target, CHAIN_MAX).into_iter().map(|(start, stop)| (mjd(start), mjd(stop))).collect()
    }

    fn coverage(&self, target: i32, links_left: usize) -> Vec<(f64, f64)> {
        if target == BARYCENTRE {
            return vec![(f64::NEG_INFINITY, f64::INFINITY)];
        }
        if links_left == 0 {
            return Vec::new();
        }
        let mut spans: Vec<(f64, f64)> = Vec::new();
        for segment in self.segments_of(target) {
            for (start, stop) in self.coverage(segment.centre, links_left - 1) {
                let (start, stop) = (start.max(segment.start_s), stop.min(segment.stop_s));
                if start <= stop {
                    spans.push((start, stop));
                }
            }
        }
        spans.sort_by(|a, b| a.0.total_cmp(&b.0));
        let mut joined: Vec<(f64, f64)> = Vec::new();
        for (start, stop) in spans {
            match joined.last_mut() {
                Some(last) if start <= last.1 => last.1 = last.1.max(stop),
                _ => joined.push((start, stop)),
            }
        }
        joined
    }

    /// Whether the body is known about the barycentre at every instant from `first_mjd` to `last_mjd`
    /// (TDB, both included); an [`Error`] that names what is missing, be it the body, a link of its
    /// chain, the type of its segments or a gap.
    pub fn require(&self, body: Body, first_mjd: f64, last_mjd: f64) -> Result<()> {
        let code = self.code(body);
        let spans = self.coverage_mjd(code);
        if spans.iter().any(|&(start, stop)| start <= first_mjd && last_mjd <= stop) {
            return Ok(());
        }
        let word = body.word();
        let message = if spans.is_empty() {
            match self.unread.iter().find(|(target, _)| *target == code) {
                Some((_, reason)) => format!("{word} (body {code}) cannot be read: {reason}"),
                None if self.segments_of(code).is_empty() => format!(
                    "holds no {word} (body {code}); it has bodies {}",
                    listed(self.segments.iter().map(|segment| segment.target))
                ),
                None => format!(
                    "{word} (body {code}) is given about body {}, which the kernel does not tie to the solar \
                     system barycentre",
                    self.segments_of(code)[0].centre
                ),
            }
        } else {
            let spans: Vec<String> =
                spans.iter().map(|(start, stop)| format!("{start:.4} to {stop:.4}")).collect();
            format!(
                "{word} (body {code}) is asked for from MJD {first_mjd:.4} to {last_mjd:.4} TDB and covered \
                 from {}{}",
                spans.join(", "),
                if spans.len() > 1 { ", with a gap between" } else { "" }
            )
        };
        Err(Error::table(&*self.name, 0, message))
    }

    /// Reads every record once and checks that it sits where its segment says and holds finite numbers.
    /// Touches the whole file: for a kernel of doubtful origin, not for every run.
    pub fn verify(&self) -> Result<()> {
        let reader = Reader { bytes: (*self.bytes).as_ref(), big_endian: self.big_endian };
        for segment in self.segments.iter() {
            for record in 0..segment.records {
                let at = segment.first_byte + record * segment.record_bytes;
                let numbers =
                    (0..segment.record_bytes / WORD_BYTES).map(|w| reader.number(at + w * WORD_BYTES));
                let finite = numbers.into_iter().all(|number| number.is_some_and(f64::is_finite));
                let middle = reader.number(at).unwrap_or(f64::NAN);
                let half = reader.number(at + WORD_BYTES).unwrap_or(f64::NAN);
                if !finite || !segment.sits_at(record, middle, half) {
                    return Err(Error::table(
                        &*self.name,
                        0,
                        format!(
                            "record {} of {} for body {} about {} is damaged (byte {at})",
                            record + 1,
                            segment.records,
                            segment.target,
                            segment.centre
                        ),
                    ));
                }
            }
        }
        Ok(())
    }
}

/// Codes in ascending order, each once, separated by commas.
fn listed(codes: impl Iterator<Item = i32>) -> String {
    let codes: std::collections::BTreeSet<i32> = codes.collect();
    codes.iter().map(i32::to_string).collect::<Vec<_>>().join(", ")
}

/// What is summed along a chain of centres.
trait Link: Copy {
    const NONE: Self;
    fn plus(self, other: Self) -> Self;
    fn minus(self, other: Self) -> Self;
}

impl Link for Vector {
    const NONE: Vector = [0.0; 3];
    #[inline(always)]
    fn plus(self, other: Vector) -> Vector {
        add(self, other)
    }
    #[inline(always)]
    fn minus(self, other: Vector) -> Vector {
        sub(self, other)
    }
}

impl Link for State {
    const NONE: State = State { position: [0.0; 3], velocity: [0.0; 3] };
    #[inline(always)]
    fn plus(self, other: State) -> State {
        State { position: add(self.position, other.position), velocity: add(self.velocity, other.velocity) }
    }
    #[inline(always)]
    fn minus(self, other: State) -> State {
        State { position: sub(self.position, other.position), velocity: sub(self.velocity, other.velocity) }
    }
}

/// A record of coefficients and where in it an instant falls.
struct Located<'a> {
    coefficients: &'a [u8],
    /// −1 to 1 through the record.
    x: f64,
}

impl Segment {
    /// Whether a record that says it is centred on `middle` with half length `half` is the one that
    /// belongs at its place. The tolerance is for files whose writers rounded.
    #[inline(always)]
    fn sits_at(&self, record: usize, middle: f64, half: f64) -> bool {
        let wanted = self.records_start_s + (record as f64 + 0.5) * self.record_s;
        let tolerance = 1e-3 * self.record_s;
        (middle - wanted).abs() <= tolerance && (half - 0.5 * self.record_s).abs() <= tolerance
    }

    /// The instant is handed down in two parts, whole days and the rest: their sum would be good to
    /// 1e-7 s only, which the Moon crosses in 0.1 mm and a relative 1e-13 would show.
    #[inline(always)]
    fn locate<'a, const BIG: bool>(&self, bytes: &'a [u8], day_s: f64, rest_s: f64) -> Option<Located<'a>> {
        let whole_s = day_s - self.records_start_s;
        let record = (((whole_s + rest_s) / self.record_s) as usize).min(self.records - 1);
        let into_s = (whole_s - record as f64 * self.record_s) + rest_s;
        let at = self.first_byte + record * self.record_bytes;
        let record_bytes = bytes.get(at..at + self.record_bytes)?;
        let (head, coefficients) = record_bytes.split_at(2 * WORD_BYTES);
        let sound = self.sits_at(record, number::<BIG>(head, 0), number::<BIG>(head, 1));
        sound.then_some(Located { coefficients, x: 2.0 * into_s / self.record_s - 1.0 })
    }

    /// The coefficients of a set of three series above the constant term, the highest first, and that.
    #[inline(always)]
    fn series<const BIG: bool>(&self, words: &[u8], set: usize) -> (impl Iterator<Item = Vector>, Vector) {
        let length = self.count * WORD_BYTES;
        let axis = |axis: usize| words[(3 * set + axis) * length..][..length].split_at(WORD_BYTES);
        let ((x0, x), (y0, y), (z0, z)) = (axis(0), axis(1), axis(2));
        let words = |series| <[u8]>::rchunks_exact(series, WORD_BYTES);
        let higher = words(x).zip(words(y)).zip(words(z));
        let vector = |x, y, z| [number::<BIG>(x, 0), number::<BIG>(y, 0), number::<BIG>(z, 0)];
        (higher.map(move |((x, y), z)| vector(x, y, z)), vector(x0, y0, z0))
    }

    #[inline(always)]
    fn position<const BIG: bool>(&self, bytes: &[u8], day_s: f64, rest_s: f64) -> Option<Vector> {
        let Located { coefficients, x } = self.locate::<BIG>(bytes, day_s, rest_s)?;
        let (higher, constant) = self.series::<BIG>(coefficients, 0);
        finite(scale(AU_PER_KM, chebyshev::value(x, higher, constant)))
    }

    #[inline(always)]
    fn state<const BIG: bool>(&self, bytes: &[u8], day_s: f64, rest_s: f64) -> Option<State> {
        let Located { coefficients, x } = self.locate::<BIG>(bytes, day_s, rest_s)?;
        let (higher, constant) = self.series::<BIG>(coefficients, 0);
        let (km, km_s) = match self.form {
            Form::Position => {
                let (km, slope) = chebyshev::value_and_slope(x, higher, constant);
                (km, scale(2.0 / self.record_s, slope))
            }
            Form::PositionAndVelocity => {
                let km = chebyshev::value(x, higher, constant);
                let (higher, constant) = self.series::<BIG>(coefficients, 1);
                (km, chebyshev::value(x, higher, constant))
            }
        };
        Some(State {
            position: finite(scale(AU_PER_KM, km))?,
            velocity: finite(scale(AU_PER_DAY_PER_KM_S, km_s))?,
        })
    }
}

#[inline(always)]
fn finite(v: Vector) -> Option<Vector> {
    (v[0] + v[1] + v[2]).is_finite().then_some(v)
}

/// The number at a word of a slice known to hold it.
#[inline(always)]
fn number<const BIG: bool>(words: &[u8], index: usize) -> f64 {
    let at = index * WORD_BYTES;
    let eight: [u8; 8] = words[at..at + WORD_BYTES].try_into().expect("a slice of eight bytes");
    if BIG { f64::from_be_bytes(eight) } else { f64::from_le_bytes(eight) }
}

/// Why a segment is not evaluated.
enum Unreadable {
    /// Sound as far as we can see, but of a sort not read here.
    Foreign(String),
    /// Contradicts itself or the file.
    Damaged(String),
}

impl Summary {
    fn segment(&self, reader: Reader) -> std::result::Result<Segment, Unreadable> {
        let damaged = |message: String| Err(Unreadable::Damaged(message));
        if !(self.start_s.is_finite() && self.stop_s.is_finite() && self.start_s <= self.stop_s) {
            return damaged(format!("damaged: covers {} to {} s past J2000", self.start_s, self.stop_s));
        }
        if self.first_word < 1 || self.last_word < self.first_word {
            return damaged(format!("damaged: lies in words {} to {}", self.first_word, self.last_word));
        }
        let words = (self.last_word - self.first_word + 1) as usize;
        let first_byte = (self.first_word as usize - 1) * WORD_BYTES;
        let end_byte = self.last_word as usize * WORD_BYTES;
        if end_byte > reader.bytes.len() {
            return damaged(format!(
                "truncated: ends at byte {end_byte}, the file has {}",
                reader.bytes.len()
            ));
        }
        if self.target == self.centre {
            return damaged("damaged: the body is its own centre".into());
        }
        let form = match self.kind {
            2 => Form::Position,
            3 => Form::PositionAndVelocity,
            other => {
                return Err(Unreadable::Foreign(format!("its segment is of type {other}; 2 and 3 are read")));
            }
        };
        if self.frame != FRAME_J2000 {
            let frame = self.frame;
            return Err(Unreadable::Foreign(format!("its segment is in frame {frame}; J2000 (1) is read")));
        }
        if words < 4 {
            return damaged(format!("damaged: {words} words, fewer than the four that describe it"));
        }
        let tail = |which: usize| reader.number(end_byte - (4 - which) * WORD_BYTES).unwrap_or(f64::NAN);
        let (records_start_s, record_s, record_words, records) = (tail(0), tail(1), tail(2), tail(3));
        let sets = if form == Form::Position { 3 } else { 6 };
        let whole = |n: f64, least: f64| n >= least && n <= words as f64 && n.fract() == 0.0;
        let consistent = records_start_s.is_finite()
            && record_s.is_finite()
            && record_s > 0.0
            && whole(record_words, 2.0 + sets as f64)
            && whole(records, 1.0)
            && (record_words as usize - 2).is_multiple_of(sets)
            && record_words as usize * records as usize + 4 == words;
        if !consistent {
            return damaged(format!(
                "damaged: describes itself as {records} records of {record_words} words and {record_s} s from \
                 {records_start_s} s past J2000, in {words} words of type {}",
                self.kind
            ));
        }
        let (record_words, records) = (record_words as usize, records as usize);
        let records_stop_s = records_start_s + record_s * records as f64;
        // A second of leeway: some writers round the claim outwards.
        if self.start_s < records_start_s - 1.0 || self.stop_s > records_stop_s + 1.0 {
            return damaged(format!(
                "gap: claims {} to {} s past J2000, its records cover {records_start_s} to {records_stop_s}",
                self.start_s, self.stop_s
            ));
        }
        let segment = Segment {
            target: self.target,
            centre: self.centre,
            form,
            start_s: self.start_s,
            stop_s: self.stop_s,
            records_start_s,
            record_s,
            first_byte,
            record_bytes: record_words * WORD_BYTES,
            records,
            count: (record_words - 2) / sets,
        };
        for record in [0, records - 1] {
            let at = first_byte + record * segment.record_bytes;
            let middle = reader.number(at).unwrap_or(f64::NAN);
            let half = reader.number(at + WORD_BYTES).unwrap_or(f64::NAN);
            if !segment.sits_at(record, middle, half) {
                return damaged(format!(
                    "damaged: its record {} says it spans {middle} ± {half} s past J2000",
                    record + 1
                ));
            }
        }
        Ok(segment)
    }
}

#[cfg(test)]
mod tests;
