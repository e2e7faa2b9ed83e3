//! What vector arithmetic this processor has. The results are the same on all of them.

/// The kernels that a hot loop is compiled for.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(
    target_arch = "x86_64",
    allow(dead_code, reason = "Fused is for others")
)]
pub(crate) enum Level {
    /// x86-64 with AVX-512 F, DQ, VL and BW, AVX2 and FMA.
    #[cfg(target_arch = "x86_64")]
    Wide512,
    /// x86-64 with AVX2 and FMA.
    #[cfg(target_arch = "x86_64")]
    Wide256,
    /// A fused multiply-add that needs no asking for.
    Fused,
    /// Nothing beyond the target's baseline.
    Plain,
}

impl Level {
    /// The best of this processor.
    #[inline]
    pub(crate) fn of_processor() -> Self {
        #[cfg(target_arch = "x86_64")]
        {
            use std::arch::is_x86_feature_detected as has;
            if has!("avx2") && has!("fma") {
                let all = has!("avx512f") && has!("avx512dq") && has!("avx512vl");
                if all && has!("avx512bw") {
                    return Self::Wide512;
                }
                return Self::Wide256;
            }
        }
        // Every aarch64 processor has the fused multiply-add.
        if cfg!(target_arch = "aarch64") {
            Self::Fused
        } else {
            Self::Plain
        }
    }
}
