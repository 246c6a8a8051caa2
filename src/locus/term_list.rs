//! What a list of per-locus terms is: a struct of named numbers that sums can walk over.

/// A set of named per-locus terms that are summed over loci.
pub trait Terms: Copy + Default {
    /// Number of terms.
    const LEN: usize;
    /// Writes the terms in declaration order; `out` has length [`Terms::LEN`].
    fn write(&self, out: &mut [f64]);
    /// Reads what [`Terms::write`] wrote.
    fn read(values: &[f64]) -> Self;
}

/// Values of one term at one locus: as it is, and with one individual of some genotype class left out.
pub type Lane = [f64; 8];

/// Declares a struct of `f64` terms with its place in the sums and, if named, the same with a [`Lane`]
/// a term.
macro_rules! terms {
    ($(#[$meta:meta])* $name:ident { $($(#[$field_meta:meta])* $field:ident),+ $(,)? }) => {
        $(#[$meta])*
        #[derive(Debug, Clone, Copy, Default, PartialEq)]
        pub struct $name {
            $($(#[$field_meta])* pub $field: f64),+
        }

        impl $crate::locus::Terms for $name {
            const LEN: usize = [$(stringify!($field)),+].len();

            fn write(&self, out: &mut [f64]) {
                out.copy_from_slice(&[$(self.$field),+]);
            }

            fn read(values: &[f64]) -> Self {
                let mut values = values.iter().copied();
                $name { $($field: values.next().unwrap_or_default()),+ }
            }
        }
    };

    ($(#[$meta:meta])* $name:ident, $lanes:ident {
        $($(#[$field_meta:meta])* $field:ident),+ $(,)?
    }) => {
        terms! { $(#[$meta])* $name { $($(#[$field_meta])* $field),+ } }

        #[doc = concat!("A lane for each term of [`", stringify!($name), "`].")]
        #[derive(Debug, Clone, Copy, Default, PartialEq)]
        pub struct $lanes {
            $($(#[$field_meta])* pub $field: $crate::locus::Lane),+
        }

        impl $lanes {
            /// The lanes, in the order of [`Terms::write`](crate::locus::Terms::write).
            pub fn columns(&self) -> [&$crate::locus::Lane; <$name as $crate::locus::Terms>::LEN] {
                [$(&self.$field),+]
            }
        }
    };
}

pub(crate) use terms;
