//! The weighing of designs, as a document and as a short table.

mod document;
mod text;

pub use document::{
    AlleleDetection, Choice, DESIGN_FORMAT, DESIGN_VERSION, Design, Missed, NeededForCv, Power,
    Precision, Sampling,
};
pub use text::text_table;

/// What the numbers of a design assume.
pub const ASSUMPTIONS: [&str; 5] = [
    "Precision by formula counts loci as independent (Nei & Tajima 1981; Waples 1989, 2006; Hill \
     1981). Loci share one pedigree and the same individuals, so real intervals are wider, the more \
     so the more loci: trust the simulated power where the two differ.",
    "Two visits with as many individuals at each; sampled individuals do not breed (plan II).",
    "Seeing an allele: gene copies of individuals are independent (Brown & Marshall 1995).",
    "Simulated populations have constant size, discrete generations, two sexes in equal numbers, \
     random mating, chromosomes of one Morgan, and loci that vary at the first visit (two alleles: \
     minor frequency 0.05 to 0.5; more: flat).",
    "A cost is that of the individuals of all visits plus that of the loci, paid once.",
];
