//! GDAL's own messages: kept for our errors instead of going to standard error.
use gdal::errors::{CplErrType, GdalError};
use std::sync::{Mutex, MutexGuard, PoisonError};

/// Held while this crate uses GDAL: GDAL has one message handler for the process.
static IN_USE: Mutex<()> = Mutex::new(());
static FAILURES: Mutex<Vec<String>> = Mutex::new(Vec::new());
const KEPT: usize = 8;

/// GDAL's failures are heard while this lives; its words go nowhere else, then or later.
pub(crate) struct Listening {
    _in_use: MutexGuard<'static, ()>,
}

/// Starts to listen; waits until no other thread of this crate does.
///
/// The handler is set each time, because whoever used GDAL in between may have set another.
pub(crate) fn listen() -> Listening {
    let in_use = IN_USE.lock().unwrap_or_else(PoisonError::into_inner);
    failures().clear();
    gdal::config::set_error_handler(|class, _number, text| {
        if matches!(class, CplErrType::Failure | CplErrType::Fatal) {
            let mut kept = failures();
            if kept.len() < KEPT {
                kept.push(text.to_owned());
            }
        }
    });
    Listening { _in_use: in_use }
}

fn failures() -> MutexGuard<'static, Vec<String>> {
    FAILURES.lock().unwrap_or_else(PoisonError::into_inner)
}

impl Listening {
    /// What GDAL said about an error: the first failure heard, which is the cause of those after it, else the words of
    /// the wrapper.
    pub(crate) fn detail(&self, error: &GdalError) -> String {
        let heard = failures().first().cloned();
        heard.unwrap_or_else(|| match error {
            GdalError::CplError { msg, .. } | GdalError::NullPointer { msg, .. }
                if !msg.trim().is_empty() =>
            {
                msg.clone()
            }
            other => other.to_string(),
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use gdal::spatial_ref::SpatialRef;

    #[test]
    fn gdal_is_heard_even_after_another_handler() {
        for _ in 0..2 {
            let gdal = listen();
            let error = SpatialRef::from_epsg(999_999).unwrap_err();
            assert!(
                gdal.detail(&error).contains("crs not found"),
                "{}",
                gdal.detail(&error)
            );
            gdal::config::set_error_handler(|_, _, _| {});
        }
    }
}
