//! Angle grids and the averages fed from them.
