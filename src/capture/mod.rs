//! Bytes of a digitizer export → channels with a checked time base.
//! Must not open a file.
