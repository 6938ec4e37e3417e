//! One loop, several instruction sets, chosen at run time.
//!
//! A loop body is written once, as a [`Kernel`] generic over [`Arithmetic`], and compiled here for every instruction
//! set the target knows: [`Isa::run`] picks the copy. LLVM vectorises each copy with the registers of its set, two,
//! four or eight doubles at a time. Nothing here reads the environment: the caller chooses an [`Isa`].
//!
//! Results differ between instruction sets in the last bits, because a fused multiply-add rounds once; under one
//! [`Isa`] an element's result does not depend on its place in the loop, nor on how many there are.
//!
//! This is the one module of the crate with `unsafe`: calling a function compiled for more instructions than the
//! build assumes is undefined behaviour on a processor without them. An [`Isa`] exists only for a set that
//! was found on this processor, and that is the whole argument.

use crate::error::{Error, Result};

/// How a multiply-add is done: the one operation whose best form depends on the instruction set.
pub trait Arithmetic: Copy {
    /// `a · b + c`.
    fn multiply_add(a: f64, b: f64, c: f64) -> f64;
}

/// A product and a sum, each rounded.
#[derive(Debug, Clone, Copy)]
pub struct Separate;

/// One instruction, rounded once. Correct everywhere, but very slow where the processor lacks the instruction.
#[derive(Debug, Clone, Copy)]
pub struct Fused;

/// What the build assumes of the processor without asking.
#[cfg(any(target_arch = "aarch64", target_feature = "fma"))]
pub type Native = Fused;
/// What the build assumes of the processor without asking.
#[cfg(not(any(target_arch = "aarch64", target_feature = "fma")))]
pub type Native = Separate;

impl Arithmetic for Separate {
    #[inline(always)]
    fn multiply_add(a: f64, b: f64, c: f64) -> f64 {
        a * b + c
    }
}

impl Arithmetic for Fused {
    #[inline(always)]
    fn multiply_add(a: f64, b: f64, c: f64) -> f64 {
        a.mul_add(b, c)
    }
}

/// A piece of work to be compiled for every instruction set: its arguments are the fields of the implementing type.
///
/// ```
/// use hourarc_core::math::dispatch::{Arithmetic, Isa, Kernel};
/// use hourarc_core::math::elementary::sin_cos;
///
/// struct Sines<'a>(&'a [f64], &'a mut [f64]);
///
/// impl Kernel for Sines<'_> {
///     type Output = ();
///     #[inline(always)]
///     fn run<A: Arithmetic>(self) {
///         for (&angle, sine) in self.0.iter().zip(self.1) {
///             *sine = sin_cos::<A>(angle).0;
///         }
///     }
/// }
///
/// let mut sines = [0.0; 3];
/// Isa::best().run(Sines(&[0.0, 1.0, 2.0], &mut sines));
/// assert!((sines[1] - 1.0_f64.sin()).abs() < 1e-15);
/// ```
pub trait Kernel {
    /// What the work returns.
    type Output;

    /// Does the work. Mark it, and every function of ours it calls, `#[inline(always)]`: only what is inlined into
    /// the copy for an instruction set uses that set. The result is correct without, only slower.
    fn run<A: Arithmetic>(self) -> Self::Output;
}

/// An instruction set that this processor has.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Isa(Set);

#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Set {
    Baseline,
    #[cfg(target_arch = "x86_64")]
    Avx2,
    #[cfg(target_arch = "x86_64")]
    Avx512,
}

impl Set {
    const ALL: &[Set] = &[
        Set::Baseline,
        #[cfg(target_arch = "x86_64")]
        Set::Avx2,
        #[cfg(target_arch = "x86_64")]
        Set::Avx512,
    ];

    fn word(self) -> &'static str {
        match self {
            Set::Baseline => "baseline",
            #[cfg(target_arch = "x86_64")]
            Set::Avx2 => "avx2",
            #[cfg(target_arch = "x86_64")]
            Set::Avx512 => "avx512",
        }
    }

    fn is_here(self) -> bool {
        match self {
            Set::Baseline => true,
            // The same features as are enabled below.
            #[cfg(target_arch = "x86_64")]
            Set::Avx2 => is_x86_feature_detected!("avx2") && is_x86_feature_detected!("fma"),
            #[cfg(target_arch = "x86_64")]
            Set::Avx512 => {
                Set::Avx2.is_here()
                    && is_x86_feature_detected!("avx512f")
                    && is_x86_feature_detected!("avx512dq")
                    && is_x86_feature_detected!("avx512vl")
            }
        }
    }
}

impl Isa {
    /// What the build assumes of every processor: SSE2 on x86-64, NEON on AArch64.
    pub const BASELINE: Isa = Isa(Set::Baseline);

    /// The widest set of this processor.
    pub fn best() -> Isa {
        Self::available().last().unwrap_or(Self::BASELINE)
    }

    /// Every set of this processor, from the baseline to the widest.
    pub fn available() -> impl Iterator<Item = Isa> {
        Set::ALL.iter().copied().filter(|set| set.is_here()).map(Isa)
    }

    /// The set of that name: `baseline`, `avx2` (with FMA), `avx512` (F, DQ and VL). An error if there is none, or
    /// this processor does not have it.
    pub fn from_word(word: &str) -> Result<Isa> {
        Self::available().find(|isa| isa.word() == word).ok_or_else(|| {
            let allowed: Vec<_> = Self::available().map(Isa::word).collect();
            Error::invalid("instruction set", word, format!("on this processor: {}", allowed.join(", ")))
        })
    }

    /// The name of the set.
    pub fn word(self) -> &'static str {
        self.0.word()
    }

    /// Does the work with this set.
    ///
    /// A call costs what any call does; put the loop inside the kernel, not around it.
    #[inline]
    #[allow(unsafe_code)]
    pub fn run<K: Kernel>(self, kernel: K) -> K::Output {
        match self.0 {
            Set::Baseline => baseline(kernel),
            // SAFETY: an `Isa` of this set is made only where `is_here` found its features.
            #[cfg(target_arch = "x86_64")]
            Set::Avx2 => unsafe { avx2(kernel) },
            // SAFETY: the same.
            #[cfg(target_arch = "x86_64")]
            Set::Avx512 => unsafe { avx512(kernel) },
        }
    }
}

#[inline(never)]
fn baseline<K: Kernel>(kernel: K) -> K::Output {
    kernel.run::<Native>()
}

#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx2,fma")]
fn avx2<K: Kernel>(kernel: K) -> K::Output {
    kernel.run::<Fused>()
}

// With these features on the generic x86-64 target, LLVM vectorises to 512 bits of its own accord (the preference
// for 256 belongs to named processors of Intel's, not to the features): seen in the assembly, rustc 1.95.
#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx2,fma,avx512f,avx512dq,avx512vl")]
fn avx512<K: Kernel>(kernel: K) -> K::Output {
    kernel.run::<Fused>()
}

#[cfg(test)]
mod tests {
    use super::*;

    struct SumOfSquares<'a>(&'a [f64]);

    impl Kernel for SumOfSquares<'_> {
        type Output = f64;
        #[inline(always)]
        fn run<A: Arithmetic>(self) -> f64 {
            self.0.iter().fold(0.0, |sum, &x| A::multiply_add(x, x, sum))
        }
    }

    #[test]
    fn every_set_gives_the_same_answer() {
        let numbers: Vec<f64> = (1..=1000).map(f64::from).collect();
        for isa in Isa::available() {
            // n (n + 1) (2n + 1) / 6, exact in doubles.
            assert_eq!(isa.run(SumOfSquares(&numbers)), 333_833_500.0, "{}", isa.word());
        }
    }

    #[test]
    fn fused_rounds_once_and_separate_twice() {
        let (a, b) = (1.0 + f64::EPSILON, 1.0 - f64::EPSILON);
        assert_eq!(Fused::multiply_add(a, b, -1.0), -f64::EPSILON * f64::EPSILON);
        assert_eq!(Separate::multiply_add(a, b, -1.0), 0.0);
    }

    #[test]
    fn words_name_the_sets_and_a_wrong_one_is_told() {
        assert_eq!(Isa::available().next(), Some(Isa::BASELINE));
        for isa in Isa::available() {
            assert_eq!(Isa::from_word(isa.word()), Ok(isa));
        }
        assert!(Isa::available().any(|isa| isa == Isa::best()));
        let error = Isa::from_word("sse9").unwrap_err();
        assert!(
            error.is_invalid()
                && error.to_string().contains("sse9")
                && error.to_string().contains("baseline")
        );
    }
}
