//! Run file, settings and the engine.
