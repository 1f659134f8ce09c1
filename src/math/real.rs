//! Single and double precision behind one trait, for iterations that run in either.

use num_complex::{Complex, Complex64};
use rustfft::FftNum;
use rustfft::num_traits::NumAssign;

/// `f32` or `f64`.
pub trait Real: FftNum + NumAssign + Default {
    /// The nearest number.
    fn of(value: f64) -> Self;
    /// The same number in double precision.
    fn double(self) -> f64;
}

impl Real for f64 {
    fn of(value: f64) -> Self {
        value
    }
    fn double(self) -> f64 {
        self
    }
}

impl Real for f32 {
    fn of(value: f64) -> Self {
        value as f32
    }
    fn double(self) -> f64 {
        f64::from(self)
    }
}

/// The nearest complex number.
pub fn complex_of<T: Real>(value: Complex64) -> Complex<T> {
    Complex::new(T::of(value.re), T::of(value.im))
}

/// The same complex number in double precision.
pub fn complex_double<T: Real>(value: Complex<T>) -> Complex64 {
    Complex64::new(value.re.double(), value.im.double())
}
