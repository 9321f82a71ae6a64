//! bspline
