//! Small numerical tools without board words: quadrature, Krylov loops, special functions.
