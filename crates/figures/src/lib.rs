//! Series, labels and marks to PNG and SVG bytes.
