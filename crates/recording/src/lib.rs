//! Recordings read by position, and encoders for WAV, CSV and NPY.
