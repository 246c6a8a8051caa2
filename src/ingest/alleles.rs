//! Whether contig names and alleles are written as the standard says.
#![expect(
    clippy::indexing_slicing,
    reason = "places in an allele lie between its first and last letter, which were compared"
)]

use super::call::AlleleKind;
use super::fault::{Fault, WRITE_AGAIN};
use super::remarks::{Remark, Remarks};
use crate::model::Locus;

/// Whether a contig name, as written in a record, has only characters the standard allows.
///
/// `<name>` is a contig of an assembly file. The colon was forbidden up to VCF 4.2; from 4.3 on the
/// names of the SAM specification hold (section 1.2.1), which have it but do not begin with `*` or `=`.
pub(super) fn is_contig_name(name: &[u8], minor_version: u32) -> bool {
    let bare = match name {
        [b'<', inner @ .., b'>'] => inner,
        other => other,
    };
    let allowed = |byte: &u8| match byte {
        b':' => minor_version >= 3,
        b'\\' | b',' | b'"' | b'`' | b'\'' | b'(' | b')' | b'[' | b']' | b'{' | b'}' | b'<'
        | b'>' => false,
        other => other.is_ascii_graphic(),
    };
    let begins_well = minor_version < 3 || !matches!(bare, [b'*' | b'=', ..]);
    !bare.is_empty() && begins_well && bare.iter().all(allowed)
}

/// Whether an allele is made of bases.
pub(super) fn is_bases(allele: &[u8]) -> bool {
    !allele.is_empty()
        && allele
            .iter()
            .all(|byte| matches!(byte.to_ascii_uppercase(), b'A' | b'C' | b'G' | b'T' | b'N'))
}

/// Whether an ALT allele is of a kind the standard knows: bases, `*`, `<name>`, a breakend, or a
/// single breakend.
pub(super) fn is_alternate(allele: &[u8]) -> bool {
    match allele {
        b"*" | b"." => true,
        [b'<', name @ .., b'>'] => {
            !name.is_empty() && !name.iter().any(|byte| matches!(byte, b'<' | b'>' | b' '))
        }
        [b'.', bases @ ..] | [bases @ .., b'.'] => is_bases(bases),
        other if other.iter().any(|byte| matches!(byte, b'[' | b']')) => is_breakend(other),
        other => is_bases(other),
    }
}

/// Bases before or after a place in brackets that point the same way: `A[lake:5[`, `]lake:5]A`.
fn is_breakend(allele: &[u8]) -> bool {
    let bracket = |byte: &u8| matches!(byte, b'[' | b']');
    let (Some(first), Some(last)) = (
        allele.iter().position(bracket),
        allele.iter().rposition(bracket),
    ) else {
        return false;
    };
    let place = allele.get(first + 1..last).unwrap_or_default();
    let bases = [&allele[..first], &allele[last + 1..]];
    allele[first] == allele[last]
        && place.contains(&b':')
        && !place.iter().any(bracket)
        && bases.iter().filter(|side| is_bases(side)).count() == 1
        && bases.iter().filter(|side| side.is_empty()).count() == 1
}

/// Looks at the alleles of a locus: remarks on what is odd, and notes their kinds when not all are
/// ordinary (`kinds` is empty otherwise).
///
/// Where ALT is a dot, the standard's own valid files have genotypes of allele 1: an alternate that is
/// not named. It gets a kind though it is not listed.
///
/// # Errors
/// An allele is empty.
pub(super) fn check(
    locus: &Locus,
    kinds: &mut Vec<AlleleKind>,
    remarks: &mut Remarks,
) -> Result<(), Fault> {
    kinds.clear();
    let list = || (0..locus.allele_count()).map(|i| locus.allele(i).unwrap_or_default());
    if list().any(<[u8]>::is_empty) {
        return Err(Fault::new(
            "an allele is empty, so the numbers of the others are in doubt",
            WRITE_AGAIN,
        ));
    }
    if !list().take(1).all(is_bases) {
        remarks.add(Remark::ReferenceBases, locus.record);
    }
    if !list().skip(1).all(is_alternate) {
        remarks.add(Remark::AlternateBases, locus.record);
    }
    if has_repeat(list()) {
        remarks.add(Remark::RepeatedAllele, locus.record);
    }
    if locus.allele_count() == 1 {
        kinds.extend([AlleleKind::Ordinary, AlleleKind::Unspecified]);
    } else if list()
        .skip(1)
        .any(|allele| AlleleKind::of(allele) != AlleleKind::Ordinary)
    {
        kinds.push(AlleleKind::Ordinary);
        kinds.extend(list().skip(1).map(AlleleKind::of));
    }
    Ok(())
}

/// Whether an allele is listed twice. Symbolic alleles may be: they differ in INFO.
fn has_repeat<'a>(mut alleles: impl ExactSizeIterator<Item = &'a [u8]>) -> bool {
    let named = |allele: &&[u8]| allele.first() != Some(&b'<');
    if alleles.len() <= 2 {
        return alleles.next() == alleles.next();
    }
    let mut sorted: Vec<&[u8]> = alleles.filter(named).collect();
    sorted.sort_unstable();
    sorted.windows(2).any(|pair| pair[0] == pair[1])
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Alleles of VCF 4.3, sections 1.1, 1.4.5 and 5.4.
    #[test]
    fn knows_the_kinds_of_alleles() {
        for good in [
            "A",
            "acgtn",
            "*",
            "<DEL>",
            "<INS:ME:ALU>",
            "G]17:198982]",
            "]13:123456]T",
            "C[<ctg1>:7[",
            ".A",
            "G.",
            "<*>",
        ] {
            assert!(is_alternate(good.as_bytes()), "{good}");
        }
        for bad in [
            "R",
            "A T",
            "<INS>BLAH>",
            "]1:5]",
            "A]1:5]C",
            "A[1:5]",
            "",
            "<>",
        ] {
            assert!(!is_alternate(bad.as_bytes()), "{bad}");
        }
    }

    #[test]
    fn contig_names_by_version() {
        assert!(is_contig_name(b"HLA:1", 3) && !is_contig_name(b"HLA:1", 2));
        assert!(is_contig_name(b"<ctg1*>", 1) && is_contig_name(b"1.A", 1));
        assert!(is_contig_name(b"*1", 2) && !is_contig_name(b"*1", 3));
        for bad in ["a b", "a,b", "a<b", "<>", ""] {
            assert!(!is_contig_name(bad.as_bytes(), 5), "{bad}");
        }
    }

    #[test]
    fn repeated_alleles() {
        let repeat = |list: &[&'static str]| has_repeat(list.iter().map(|a| a.as_bytes()));
        assert!(repeat(&["A", "A"]) && repeat(&["A", "C", "C"]));
        assert!(!repeat(&["A", "<DEL>", "<DEL>"]) && !repeat(&["A"]) && !repeat(&["A", "C"]));
    }
}
