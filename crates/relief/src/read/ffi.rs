//! The few GDAL calls that the `gdal` crate does not wrap. All `unsafe` of this module's parent stands here.

use std::ffi::{CStr, CString, c_char, c_int};
use std::path::PathBuf;
use std::ptr;
use std::sync::Once;

use gdal::Dataset;
use gdal::config::{
    clear_thread_local_config_option, get_config_option, get_thread_local_config_option,
    set_error_handler, set_thread_local_config_option,
};
use gdal::cpl::CslStringList;
use gdal::errors::GdalError;

/// From here on GDAL prints nothing: what goes wrong comes back as an error, in the words of this program.
///
/// For the whole process, because GDAL decodes in threads of its own, which would print past a handler of this thread.
pub(super) fn silence_gdal() {
    static ONCE: Once = Once::new();
    ONCE.call_once(|| set_error_handler(|_, _, _| {}));
}

/// A GDAL option that holds for this thread until the value is dropped.
pub(super) struct ThreadOption {
    key: &'static str,
    before: String,
}

impl ThreadOption {
    pub(super) fn set(key: &'static str, value: &str) -> Self {
        let before = get_thread_local_config_option(key, "").unwrap_or_default();
        // can only fail on a NUL character inside
        let _ = set_thread_local_config_option(key, value);
        Self { key, before }
    }
}

impl Drop for ThreadOption {
    fn drop(&mut self) {
        let _ = if self.before.is_empty() {
            clear_thread_local_config_option(self.key)
        } else {
            set_thread_local_config_option(self.key, &self.before)
        };
    }
}

/// Keeps GDAL's block cache small: heights are read once, so what it holds is only doubled memory.
///
/// `needed_bytes` is what one row of blocks takes. Whoever sets GDAL_CACHEMAX keeps it.
pub(super) fn limit_block_cache(needed_bytes: usize) {
    const SMALL_BYTES: i64 = 64 << 20;
    if get_config_option("GDAL_CACHEMAX", "").is_ok_and(|set| !set.is_empty()) {
        return;
    }
    let wanted = i64::try_from(needed_bytes)
        .unwrap_or(i64::MAX)
        .max(SMALL_BYTES);
    // SAFETY: plain setters and getters of a number, guarded by GDAL's own lock.
    unsafe {
        if gdal_sys::GDALGetCacheMax64() > wanted {
            gdal_sys::GDALSetCacheMax64(wanted);
        }
    }
}

/// Files behind a data set, as GDAL lists them.
pub(super) fn file_list(dataset: &Dataset) -> Vec<PathBuf> {
    let mut files = Vec::new();
    // SAFETY: the handle is alive as long as `dataset`; the list is NULL or a NULL-terminated array of C strings that
    // is ours to free.
    unsafe {
        let list = gdal_sys::GDALGetFileList(dataset.c_dataset());
        if list.is_null() {
            return files;
        }
        let mut entry = list;
        while !(*entry).is_null() {
            let name = CStr::from_ptr(*entry).to_string_lossy().into_owned();
            files.push(PathBuf::from(name));
            entry = entry.add(1);
        }
        gdal_sys::CSLDestroy(list);
    }
    files
}

/// A virtual data set of one band of another, by GDAL's translate function.
pub(super) fn single_band(source: &Dataset, band: usize) -> Result<Dataset, GdalError> {
    let args = arguments(&["-of", "VRT", "-b", &band.to_string()])?;
    let empty = CString::default();
    let mut misuse: c_int = 0;
    // SAFETY: handles and strings live through the calls; the options are freed once; a non-NULL result is a new data
    // set that holds its own reference to the source.
    unsafe {
        let options = gdal_sys::GDALTranslateOptionsNew(args.as_ptr(), ptr::null_mut());
        let made =
            gdal_sys::GDALTranslate(empty.as_ptr(), source.c_dataset(), options, &raw mut misuse);
        gdal_sys::GDALTranslateOptionsFree(options);
        owned(made, "GDALTranslate")
    }
}

/// A virtual data set that warps another while it is read, by GDAL's warp function.
pub(super) fn warped(source: &Dataset, args: &[&str]) -> Result<Dataset, GdalError> {
    let args = arguments(args)?;
    let empty = CString::default();
    let mut misuse: c_int = 0;
    let mut handle = source.c_dataset();
    // SAFETY: as in `single_band`; `handle` is an array of one.
    unsafe {
        let options = gdal_sys::GDALWarpAppOptionsNew(args.as_ptr(), ptr::null_mut());
        let made = gdal_sys::GDALWarp(
            empty.as_ptr(),
            ptr::null_mut(),
            1,
            &raw mut handle,
            options,
            &raw mut misuse,
        );
        gdal_sys::GDALWarpAppOptionsFree(options);
        owned(made, "GDALWarp")
    }
}

fn arguments(args: &[&str]) -> Result<CslStringList, GdalError> {
    let mut list = CslStringList::new();
    for arg in args {
        list.add_string(arg)?;
    }
    Ok(list)
}

/// # Safety
/// `handle` is NULL or a data set that nobody else closes.
unsafe fn owned(
    handle: gdal_sys::GDALDatasetH,
    method_name: &'static str,
) -> Result<Dataset, GdalError> {
    if handle.is_null() {
        return Err(GdalError::NullPointer {
            method_name,
            msg: last_message(),
        });
    }
    // SAFETY: by the contract of this function.
    Ok(unsafe { Dataset::from_c_dataset(handle) })
}

/// The last message GDAL had for this thread.
fn last_message() -> String {
    // SAFETY: GDAL returns a NUL-terminated string of this thread, never NULL, valid until its next error.
    unsafe {
        let text: *const c_char = gdal_sys::CPLGetLastErrorMsg();
        CStr::from_ptr(text).to_string_lossy().into_owned()
    }
}
