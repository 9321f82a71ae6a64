//! banded
