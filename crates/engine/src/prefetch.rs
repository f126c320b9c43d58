//! Asking for memory before it is needed: the walk knows which nodes come next, and half its time would be waiting.

/// Asks for the cache lines of a value.
#[inline(always)]
pub(crate) fn ask_for<T>(value: &T) {
    let start = std::ptr::from_ref(value).cast::<i8>();
    for line in 0..size_of::<T>().div_ceil(64) {
        ask_for_line(start.wrapping_add(64 * line));
    }
}

#[inline(always)]
fn ask_for_line(address: *const i8) {
    #[cfg(target_arch = "x86_64")]
    // SAFETY: a prefetch reads nothing and cannot fault, whatever the address
    unsafe {
        core::arch::x86_64::_mm_prefetch::<{ core::arch::x86_64::_MM_HINT_T0 }>(address);
    }
    #[cfg(not(target_arch = "x86_64"))]
    let _ = address;
}
