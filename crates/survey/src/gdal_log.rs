//! GDAL's own messages: kept for our errors instead of going to standard error.
use gdal::errors::{CplErrType, GdalError};
use std::sync::{Mutex, Once, PoisonError};

static FIRST_USE: Once = Once::new();
static MESSAGES: Mutex<Vec<String>> = Mutex::new(Vec::new());
const KEPT: usize = 8;

/// Call before using GDAL: keeps its messages from standard error and forgets those of earlier calls.
pub(crate) fn listen() {
    FIRST_USE.call_once(|| {
        gdal::config::set_error_handler(|class, _number, text| {
            if matches!(class, CplErrType::Failure | CplErrType::Fatal) {
                let mut kept = MESSAGES.lock().unwrap_or_else(PoisonError::into_inner);
                if kept.len() < KEPT {
                    kept.push(text.to_owned());
                }
            }
        });
    });
    MESSAGES
        .lock()
        .unwrap_or_else(PoisonError::into_inner)
        .clear();
}

/// What GDAL said about an error: the first failure heard since [`listen`], which is the cause of those after it, else
/// the words of the wrapper.
pub(crate) fn detail(error: &GdalError) -> String {
    let heard = MESSAGES
        .lock()
        .unwrap_or_else(PoisonError::into_inner)
        .first()
        .cloned();
    heard.unwrap_or_else(|| match error {
        GdalError::CplError { msg, .. } | GdalError::NullPointer { msg, .. }
            if !msg.trim().is_empty() =>
        {
            msg.clone()
        }
        other => other.to_string(),
    })
}
