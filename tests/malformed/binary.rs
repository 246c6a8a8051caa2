//! Binary records with hostile lengths and values.

use super::{binary, error};

/// Byte patterns in the first binary record, and what is said of hostile values put there.
#[test]
fn hostile_binary_lengths_are_refused() {
    let bytes = binary();
    let header = 9 + u32::from_le_bytes([bytes[5], bytes[6], bytes[7], bytes[8]]) as usize;
    let patched = |at: usize, new: &[u8]| {
        let mut out = bytes.clone();
        out[at..at + new.len()].copy_from_slice(new);
        error(&out).1
    };
    let all = u32::MAX.to_le_bytes();
    let told = |problem: String, part: &str| assert!(problem.contains(part), "{problem}");
    told(patched(5, &all), "the header is longer than");
    told(patched(header, &all), "the record claims to be");
    told(patched(header + 4, &all), "the record claims to be");
    told(patched(header, &[3, 0, 0, 0]), "reaches beyond its end");
    told(
        patched(header + 8, &7u32.to_le_bytes()),
        "no contig number 7",
    );
    told(
        patched(header + 8, &all),
        "the number of the contig is negative",
    );
    told(
        patched(header + 12, &(-5i32).to_le_bytes()),
        "the position is negative",
    );
    told(patched(header + 24, &[0xff, 0xff, 2, 0]), "beyond its end");
    told(patched(header + 24, &[0, 0, 0xff, 0xff]), "");
    told(patched(header + 24, &[0, 0, 0, 0]), "lists no allele");
    told(
        patched(header + 28, &[0xff, 0xff, 0xff, 1]),
        "has 16777215 samples",
    );
    told(patched(header + 28, &[3, 0, 0, 0xff]), "beyond its end");
    // The GT key: name 1 of the header, two one-byte values a sample.
    let genotypes = header
        + bytes[header..]
            .windows(3)
            .position(|w| w == [0x11, 1, 0x21])
            .unwrap();
    told(patched(genotypes, &[0x17]), "no number of a name");
    told(patched(genotypes + 2, &[0x2f]), "unknown type");
    told(
        patched(genotypes + 2, &[0x27]),
        "GT values are not integers",
    );
    told(
        patched(genotypes + 2, &[0xf1, 0x13, 0xff, 0xff, 0xff, 0x7f]),
        "beyond its end",
    );
    told(patched(genotypes + 2, &[0xf1, 0x11, 0xff]), "negative");
    told(patched(genotypes + 3, &[6, 4]), "names allele 2");
    told(
        patched(genotypes + 3, &[0x85, 4]),
        "is not written as VCF says",
    );
    told(
        patched(genotypes + 3, &[0x81, 4]),
        "is not written as VCF says",
    );
}
