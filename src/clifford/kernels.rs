#![doc = include_str!("kernels.md")]

use std::sync::OnceLock;

/// Which instructions a kernel uses. A level exists only on a processor that has
/// its instructions.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub struct Level(pub(super) Instructions);

/// The sets of instructions kernels are compiled for.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub(super) enum Instructions {
    /// What every processor of the target has.
    Plain,
    /// 256-bit vectors and bit counting.
    #[cfg(target_arch = "x86_64")]
    Avx2,
    /// 512-bit vectors.
    #[cfg(target_arch = "x86_64")]
    Avx512,
}

impl Level {
    /// The plain twin.
    pub const PLAIN: Level = Level(Instructions::Plain);

    /// The widest this processor has.
    pub fn widest() -> Level {
        static WIDEST: OnceLock<Level> = OnceLock::new();
        *WIDEST.get_or_init(|| Level::all().pop().unwrap_or(Level::PLAIN))
    }

    /// All levels of this processor, the plain one first.
    pub fn all() -> Vec<Level> {
        #[cfg_attr(not(target_arch = "x86_64"), expect(unused_mut))]
        let mut levels = vec![Level::PLAIN];
        #[cfg(target_arch = "x86_64")]
        {
            let avx2 = is_x86_feature_detected!("avx2")
                && is_x86_feature_detected!("bmi1")
                && is_x86_feature_detected!("bmi2")
                && is_x86_feature_detected!("lzcnt")
                && is_x86_feature_detected!("popcnt");
            if avx2 {
                levels.push(Level(Instructions::Avx2));
            }
            let avx512 = is_x86_feature_detected!("avx512f")
                && is_x86_feature_detected!("avx512bw")
                && is_x86_feature_detected!("avx512cd")
                && is_x86_feature_detected!("avx512dq")
                && is_x86_feature_detected!("avx512vl");
            if avx2 && avx512 {
                levels.push(Level(Instructions::Avx512));
            }
        }
        levels
    }

    /// Its name, for people.
    pub fn word(self) -> &'static str {
        match self.0 {
            Instructions::Plain => "plain",
            #[cfg(target_arch = "x86_64")]
            Instructions::Avx2 => "256-bit vectors",
            #[cfg(target_arch = "x86_64")]
            Instructions::Avx512 => "512-bit vectors",
        }
    }
}

/// Makes a function of a level and the arguments out of an `#[inline(always)]`
/// function of the arguments, generic in the number of words.
macro_rules! kernel {
    (
        $(#[$about:meta])*
        $access:vis fn $name:ident<$words:ident>($($argument:ident: $type:ty),* $(,)?) -> $out:ty
            = $body:ident;
    ) => {
        $(#[$about])*
        #[allow(unsafe_code)]
        $access fn $name<const $words: usize>(
            level: $crate::clifford::kernels::Level,
            $($argument: $type),*
        ) -> $out {
            use $crate::clifford::kernels::Instructions;

            #[cfg(target_arch = "x86_64")]
            #[target_feature(enable = "avx2,bmi1,bmi2,lzcnt,popcnt")]
            fn avx2<const $words: usize>($($argument: $type),*) -> $out {
                $body::<$words>($($argument),*)
            }

            #[cfg(target_arch = "x86_64")]
            #[target_feature(enable = "avx2,bmi1,bmi2,lzcnt,popcnt,avx512f,avx512bw,avx512cd")]
            #[target_feature(enable = "avx512dq,avx512vl")]
            fn avx512<const $words: usize>($($argument: $type),*) -> $out {
                $body::<$words>($($argument),*)
            }

            match level.0 {
                Instructions::Plain => $body::<$words>($($argument),*),
                // SAFETY: the only danger is a processor without the instructions,
                // and a level is made only where they were found.
                #[cfg(target_arch = "x86_64")]
                Instructions::Avx2 => unsafe { avx2::<$words>($($argument),*) },
                // SAFETY: as above.
                #[cfg(target_arch = "x86_64")]
                Instructions::Avx512 => unsafe { avx512::<$words>($($argument),*) },
            }
        }
    };
}

pub(crate) use kernel;

#[cfg(test)]
mod tests {
    use super::Level;

    #[test]
    fn the_plain_twin_is_always_there() {
        assert_eq!(Level::all()[0], Level::PLAIN);
        assert!(Level::all().contains(&Level::widest()));
    }
}
