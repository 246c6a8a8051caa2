//! Stretches of the genome that a run is about.

/// A stretch of one contig, both ends included.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord)]
pub struct Region {
    /// Name as in the calls.
    pub contig: String,
    /// First position, 1-based.
    pub from: u64,
    /// Last position.
    pub to: u64,
}

impl Region {
    /// The whole of a contig.
    pub fn whole(contig: &str) -> Self {
        Region {
            contig: contig.to_owned(),
            from: 0,
            to: u64::MAX,
        }
    }

    /// Reads `CONTIG`, `CONTIG:POSITION`, `CONTIG:FROM-TO` or `CONTIG:FROM-` (1-based, ends included). A
    /// colon that no number follows belongs to the name.
    ///
    /// # Errors
    /// What is wrong, in words.
    pub fn parse(text: &str) -> Result<Self, String> {
        if text.is_empty() {
            return Err("a region is a contig, as in chr3, or chr3:1000-2000".to_owned());
        }
        let Some((contig, range)) = text.rsplit_once(':').filter(|(name, range)| {
            !name.is_empty() && range.starts_with(|c: char| c.is_ascii_digit())
        }) else {
            return Ok(Region::whole(text));
        };
        let number = |text: &str| {
            text.parse::<u64>()
                .map_err(|_| format!("'{text}' in the region '{contig}:{range}' is no position"))
        };
        let (from, to) = match range.split_once('-') {
            None => (number(range)?, number(range)?),
            Some((from, "")) => (number(from)?, u64::MAX),
            Some((from, to)) => (number(from)?, number(to)?),
        };
        if from > to || from == 0 {
            return Err(format!(
                "the region '{text}' is empty: positions begin at 1, and the first comes first"
            ));
        }
        Ok(Region {
            contig: contig.to_owned(),
            from,
            to,
        })
    }
}

/// Regions in order, none touching another.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct Regions(Vec<Region>);

impl Regions {
    /// Sorts regions and joins those that overlap or touch.
    pub fn new(mut all: Vec<Region>) -> Self {
        all.sort();
        let mut joined: Vec<Region> = Vec::new();
        for region in all {
            match joined.last_mut() {
                Some(last)
                    if last.contig == region.contig && region.from <= last.to.saturating_add(1) =>
                {
                    last.to = last.to.max(region.to);
                }
                _ => joined.push(region),
            }
        }
        Regions(joined)
    }

    /// The regions, by contig and position.
    pub fn list(&self) -> &[Region] {
        &self.0
    }

    /// Whether a position lies in one of them.
    pub fn hold(&self, contig: &str, position: u64) -> bool {
        let after = self
            .0
            .partition_point(|r| (r.contig.as_str(), r.from) <= (contig, position));
        let last = after.checked_sub(1).and_then(|i| self.0.get(i));
        last.is_some_and(|r| r.contig == contig && position <= r.to)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn regions_are_read_as_they_are_written() {
        let of = |text: &str| Region::parse(text).map(|r| (r.contig, r.from, r.to));
        assert_eq!(of("chr3"), Ok(("chr3".into(), 0, u64::MAX)));
        assert_eq!(of("chr3:5-9"), Ok(("chr3".into(), 5, 9)));
        assert_eq!(of("chr3:5-"), Ok(("chr3".into(), 5, u64::MAX)));
        assert_eq!(of("chr3:5"), Ok(("chr3".into(), 5, 5)));
        // Names with colons are allowed in VCF.
        assert_eq!(of("HLA-A*01:aa"), Ok(("HLA-A*01:aa".into(), 0, u64::MAX)));
        assert_eq!(of("a:b:7-8"), Ok(("a:b".into(), 7, 8)));
        for wrong in [
            "",
            "chr3:9-5",
            "chr3:0-5",
            "chr3:5-x",
            "chr3:99999999999999999999",
        ] {
            assert!(of(wrong).is_err(), "{wrong}");
        }
    }

    proptest! {
        #[test]
        fn joined_regions_hold_what_the_plain_list_holds(
            list in prop::collection::vec((0..3u8, 1..40u64, 0..12u64), 0..12),
        ) {
            let plain: Vec<Region> = list
                .iter()
                .map(|&(c, from, more)| Region { contig: format!("c{c}"), from, to: from + more })
                .collect();
            let regions = Regions::new(plain.clone());
            for c in 0..3 {
                let contig = format!("c{c}");
                for at in 0..60 {
                    let inside = |r: &Region| r.contig == contig && (r.from..=r.to).contains(&at);
                    prop_assert_eq!(regions.hold(&contig, at), plain.iter().any(inside));
                }
            }
        }
    }
}
