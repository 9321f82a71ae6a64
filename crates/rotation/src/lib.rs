//! From tach pulses to the angle of a shaft at every instant, with its uncertainty and its ledger.
