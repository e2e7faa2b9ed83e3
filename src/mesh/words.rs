//! Large scratch memory for 32-bit words.

use memmap2::MmapMut;

/// Zeroed words. Large ones are mapped in huge pages where the system gives them: hundreds of
/// megabytes in small pages cost more to be handed out than to be filled.
pub(crate) enum Words {
    Small(Vec<u32>),
    Large(MmapMut),
}

/// Below this many words an ordinary allocation is as good.
const LARGE: usize = 1 << 21;

impl Words {
    /// `len` words, zero.
    pub(crate) fn new(len: usize) -> Self {
        if len < LARGE {
            return Self::Small(vec![0; len]);
        }
        match MmapMut::map_anon(len * 4) {
            Ok(map) => {
                // A refusal costs time, not correctness.
                #[cfg(target_os = "linux")]
                let _ = map.advise(memmap2::Advice::HugePage);
                Self::Large(map)
            }
            Err(_) => Self::Small(vec![0; len]),
        }
    }

    /// At least `len` words, their values left as they are: `old` itself where it is large enough.
    pub(crate) fn reuse(old: Option<Self>, len: usize) -> Self {
        match old {
            Some(old) if old.as_slice().len() >= len => old,
            _ => Self::new(len),
        }
    }

    pub(crate) fn as_slice(&self) -> &[u32] {
        match self {
            Self::Small(v) => v,
            // A map starts at a page and its length is a multiple of four.
            Self::Large(m) => bytemuck::cast_slice(m),
        }
    }

    pub(crate) fn as_mut_slice(&mut self) -> &mut [u32] {
        match self {
            Self::Small(v) => v,
            Self::Large(m) => bytemuck::cast_slice_mut(m),
        }
    }
}
