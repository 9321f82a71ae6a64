//! Results to figures, tables and findings, written whole or not at all.
