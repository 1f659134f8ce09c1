//! Small numerical tools without board words: quadrature, Fourier filters, special functions.

pub mod exponential_integral;
pub mod filter;
pub mod measure;
pub mod quadrature;
pub mod real;
pub mod small;
