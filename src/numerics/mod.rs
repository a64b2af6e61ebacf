//! Plain maths on `f64` slices.
//! Must not know lasers, units or files.
