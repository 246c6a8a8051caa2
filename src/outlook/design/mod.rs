//! What a sampling design can tell, before the field season: precision by formula, the smallest
//! sample that does, and the simulated power to see a decline.

mod precision;
mod rehearsal;

pub use precision::{
    Expected, Temporal, individuals_for_cv, individuals_to_see, linkage, loci_for_cv, missed,
    temporal,
};
pub use rehearsal::{Setting, scenario};
