//! Any bytes as a digitizer's export: an error in words, or a capture that keeps its promises; never a panic, never slow.
//! Run with `cargo +nightly fuzz run read -s none fuzz/corpus/read fixtures/layouts -- -max_total_time=600 -timeout=1`.
#![no_main]

use libfuzzer_sys::fuzz_target;
use tubewright::capture::{Capture, CaptureError, read, read_many};

fuzz_target!(|bytes: &[u8]| {
    let (_, rest) = bytes.split_at(bytes.len() / 2);
    let columns = "time=1,ramp=2,photodiode=3".parse().ok();
    keeps_promises(read("a.csv", bytes, None));
    keeps_promises(read("a.csv", bytes, columns.as_ref()));
    keeps_promises(read_many(&[("aCH1.csv", bytes), ("aCH2.csv", rest)], None));
});

fn keeps_promises(result: Result<Capture, CaptureError>) {
    match result {
        Ok(capture) => {
            for channel in [Some(&capture.photodiode), capture.ramp.as_ref(), capture.crossed.as_ref()].into_iter().flatten() {
                assert_eq!(channel.len(), capture.time.n);
                assert!(channel.iter().all(|v| v.is_finite()));
            }
            assert!(capture.time.step > 0.0 && capture.time.at(capture.time.n).is_finite());
            capture.remarks.iter().for_each(|remark| assert!(!remark.to_string().is_empty()));
        }
        Err(error) => assert!(!error.to_string().is_empty()),
    }
}
