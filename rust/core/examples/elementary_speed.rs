//! Time of an element of each elementary function, on every instruction set of this processor, beside the standard library.
//!
//!     cargo run --release -p hourarc-core --example elementary_speed
//!
//! Every timed loop's answers are compared with the standard library's before the clock starts. Arrays stay in the
//! first-level cache; the best of many passes counts.

use hourarc_core::math::dispatch::{Arithmetic, Isa, Kernel};
use hourarc_core::math::elementary as e;
use std::hint::black_box;
use std::time::Instant;

const COUNT: usize = 1024;

/// Two argument arrays and two result arrays.
struct Work {
    x: Vec<f64>,
    y: Vec<f64>,
    a: Vec<f64>,
    b: Vec<f64>,
}

/// A loop over one function as a kernel: from `x` and `y` to `a` and `b`.
macro_rules! kernel {
    ($name:ident, $A:ident, |$x:ident, $y:ident| $body:expr) => {
        struct $name<'a>(&'a mut Work);
        impl Kernel for $name<'_> {
            type Output = ();
            #[inline(always)]
            fn run<$A: Arithmetic>(self) {
                let Work { x, y, a, b } = self.0;
                for (((&$x, &$y), a), b) in x.iter().zip(y.iter()).zip(a).zip(b) {
                    let _ = $y;
                    (*a, *b) = $body;
                }
            }
        }
    };
}

kernel!(SinCos, A, |x, y| e::sin_cos::<A>(x));
kernel!(SinCosCoarse, A, |x, y| e::sin_cos_coarse::<A>(x));
kernel!(SinCosTurns, A, |x, y| e::sin_cos_turns::<A>(x));
kernel!(Asin, A, |x, y| (e::asin::<A>(x), 0.0));
kernel!(AsinCoarse, A, |x, y| (e::asin_coarse::<A>(x), 0.0));
kernel!(Acos, A, |x, y| (e::acos::<A>(x), 0.0));
kernel!(AcosCoarse, A, |x, y| (e::acos_coarse::<A>(x), 0.0));
kernel!(Atan, A, |x, y| (e::atan::<A>(x), 0.0));
kernel!(Atan2, A, |x, y| (e::atan2::<A>(y, x), 0.0));
kernel!(Atan2Coarse, A, |x, y| (e::atan2_coarse::<A>(y, x), 0.0));

type Standard = fn(f64, f64) -> (f64, f64);
type Ours = fn(Isa, &mut Work);

fn nanoseconds(mut pass: impl FnMut()) -> f64 {
    let mut best = f64::INFINITY;
    for _ in 0..300 {
        let start = Instant::now();
        for _ in 0..4 {
            pass();
        }
        best = best.min(start.elapsed().as_nanos() as f64);
    }
    best / (4 * COUNT) as f64
}

fn main() {
    let functions: [(&str, f64, f64, Standard, Ours); 10] = [
        ("sin_cos", 50.0, 1e-15, |x, _| x.sin_cos(), |isa, w| isa.run(SinCos(w))),
        ("sin_cos_coarse", 50.0, 3e-13, |x, _| x.sin_cos(), |isa, w| isa.run(SinCosCoarse(w))),
        (
            "sin_cos_turns",
            50.0,
            1e-12,
            |x, _| (x * std::f64::consts::TAU).sin_cos(),
            |isa, w| isa.run(SinCosTurns(w)),
        ),
        ("asin", 1.0, 1e-15, |x, _| (x.asin(), 0.0), |isa, w| isa.run(Asin(w))),
        ("asin_coarse", 1.0, 2e-12, |x, _| (x.asin(), 0.0), |isa, w| isa.run(AsinCoarse(w))),
        ("acos", 1.0, 1e-15, |x, _| (x.acos(), 0.0), |isa, w| isa.run(Acos(w))),
        ("acos_coarse", 1.0, 2e-12, |x, _| (x.acos(), 0.0), |isa, w| isa.run(AcosCoarse(w))),
        ("atan", 5.0, 1e-15, |x, _| (x.atan(), 0.0), |isa, w| isa.run(Atan(w))),
        ("atan2", 1.0, 1e-15, |x, y| (y.atan2(x), 0.0), |isa, w| isa.run(Atan2(w))),
        ("atan2_coarse", 1.0, 1e-12, |x, y| (y.atan2(x), 0.0), |isa, w| isa.run(Atan2Coarse(w))),
    ];
    print!("{:15} {:>9}", "ns an element", "standard");
    Isa::available().for_each(|isa| print!(" {:>9}", isa.word()));
    println!();
    for (name, scale, tolerance, standard, ours) in functions {
        let spread = |i: usize, step: f64| scale * (2.0 * (i as f64 * step).fract() - 1.0);
        let mut work = Work {
            x: (0..COUNT).map(|i| spread(i, 0.618_033_988_7)).collect(),
            y: (0..COUNT).map(|i| spread(i, 0.754_877_666_2)).collect(),
            a: vec![0.0; COUNT],
            b: vec![0.0; COUNT],
        };
        print!("{name:15}");
        let time = nanoseconds(|| {
            for i in 0..COUNT {
                (work.a[i], work.b[i]) = standard(work.x[i], work.y[i]);
            }
            black_box(&mut work);
        });
        print!(" {time:9.2}");
        for isa in Isa::available() {
            ours(isa, &mut work);
            for i in 0..COUNT {
                let expected = standard(work.x[i], work.y[i]);
                let error = (work.a[i] - expected.0).abs().max((work.b[i] - expected.1).abs());
                assert!(error <= tolerance, "{name}({}, {}) is off by {error:e}", work.x[i], work.y[i]);
            }
            let time = nanoseconds(|| {
                ours(isa, &mut work);
                black_box(&mut work);
            });
            print!(" {time:9.2}");
        }
        println!();
    }
}
