//! Asks the processor to bring memory near before it is needed. The only `unsafe` of the crate.

/// Starts to bring the cache line of `items[index]` near. Does nothing if there is no such item, or on processors for
/// which it is not written.
#[inline(always)]
pub fn fetch<T>(items: &[T], index: usize) {
    #[cfg(target_arch = "x86_64")]
    if let Some(item) = items.get(index) {
        use std::arch::x86_64::{_MM_HINT_T0, _mm_prefetch};
        // Sound: a prefetch reads and writes nothing that the program sees and faults on no address; this one is that of
        // a live reference all the same. SSE, which has the instruction, is part of every x86-64 processor.
        #[allow(unsafe_code)]
        unsafe {
            _mm_prefetch::<_MM_HINT_T0>(std::ptr::from_ref(item).cast());
        }
    }
    #[cfg(not(target_arch = "x86_64"))]
    let _ = (items, index);
}
