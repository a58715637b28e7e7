//! Roots of chords, against what others published.

use trued::intonation::PitchClasses;
use trued::intonation::root::parncutt::{Model, OF_1988, OF_2006};
use trued::intonation::root::root;

/// R. Parncutt's ambiguity of a chord: the root of all weights' sum over the largest.
fn ambiguity(model: &Model, chord: PitchClasses) -> f64 {
    let weights = model.weights(chord).map(f64::from);
    let most = weights.iter().copied().fold(0.0, f64::max);
    (weights.iter().sum::<f64>() / most).sqrt()
}

/// R. Parncutt, Music Perception 6(1), 1988, Table 4, as P. Harrison's parn88 (doi 10.5281/zenodo.1491909) tests itself
/// against it in `tests/testthat/test-regression.R`.
#[test]
fn parncutt_1988_table_4() {
    const TABLE: [(&[u8], f64); 15] = [
        (&[0, 1], 2.2),
        (&[0, 2], 2.0),
        (&[0, 3], 2.1),
        (&[0, 4], 1.9),
        (&[0, 5], 1.8),
        (&[0, 6], 2.2),
        (&[0, 4, 7], 2.0),
        (&[0, 3, 7], 2.1),
        (&[0, 4, 8], 2.3),
        (&[0, 3, 6], 2.5),
        (&[0, 4, 7, 10], 2.1),
        (&[0, 3, 7, 10], 2.3),
        (&[0, 4, 7, 11], 2.3),
        (&[0, 3, 6, 10], 2.4),
        (&[0, 3, 6, 9], 2.9),
    ];
    for (chord, published) in TABLE {
        let ours = ambiguity(&OF_1988, PitchClasses::of(chord));
        assert!(
            (ours - published).abs() <= 0.05,
            "{chord:?}: {ours}, printed {published}"
        );
    }
}

/// What the README of parn88 prints for the weights of R. Parncutt, Empirical Musicology Review 1(4), 2006.
#[test]
fn parncutt_2006_vectors() {
    let major = PitchClasses::of(&[0, 4, 7]);
    assert_eq!(
        OF_2006.weights(major),
        [18, 0, 3, 3, 10, 6, 2, 10, 3, 7, 1, 0]
    );
    for (chord, published) in [
        (&[0, 4, 7], 1.870829),
        (&[0, 3, 7], 2.04939),
        (&[0, 4, 8], 2.201398),
        (&[0, 3, 6], 2.50998),
    ] {
        let ours = ambiguity(&OF_2006, PitchClasses::of(chord));
        assert!((ours - published).abs() < 5.1e-6, "{chord:?}: {ours}");
    }
    for (chord, published) in [(&[2, 5, 7, 11][..], 7), (&[0, 4, 9], 9), (&[1, 4, 9], 9)] {
        let ours = OF_2006.roots(PitchClasses::of(chord));
        assert_eq!(ours, PitchClasses::of(&[published]), "{chord:?}");
    }
}

/// Chord, its classes, weights of 2006 from C to B, their roots and ambiguity, then roots and ambiguity of 1988. Not
/// published: worked out from the two papers' weights by a second hand, in Python with floating point.
const WORKED_OUT: &str = "
C | 0 4 7 | 18 0 3 3 10 6 2 10 3 7 1 0 | 0 | 1.871 | 0 | 1.975
Cm | 0 3 7 | 15 1 2 13 0 8 0 10 8 2 1 3 | 0 | 2.049 | 0 | 2.114
Cdim | 0 3 6 | 10 1 5 10 1 7 10 0 10 0 1 8 | 0 3 6 8 | 2.510 | 0 3 | 2.550
Caug | 0 4 8 | 13 5 3 0 13 5 3 0 13 5 3 0 | 0 4 8 | 2.201 | 0 4 8 | 2.316
C7 | 0 4 7 10 | 20 0 3 8 10 6 5 10 4 7 11 0 | 0 | 2.049 | 0 | 2.139
Cm7 | 0 3 7 10 | 17 1 2 18 0 8 3 10 9 2 11 3 | 3 | 2.160 | 0 | 2.270
Cmaj7 | 0 4 7 11 | 18 2 3 3 15 6 2 13 3 8 1 10 | 0 | 2.160 | 0 | 2.280
C6 | 0 4 7 9 | 18 0 8 3 10 9 2 11 3 17 1 2 | 0 | 2.160 | 9 | 2.270
Cm6 | 0 3 7 9 | 15 1 7 13 0 11 0 11 8 12 1 5 | 0 | 2.366 | 0 | 2.441
Cm7b5 | 0 3 6 10 | 12 1 5 15 1 7 13 0 11 0 11 8 | 3 | 2.366 | 3 | 2.441
Cdim7 | 0 3 6 9 | 10 1 10 10 1 10 10 1 10 10 1 10 | 0 2 3 5 6 8 9 11 | 2.898 | 0 3 6 9 | 2.944
Csus4 | 0 5 7 | 15 3 2 4 0 16 0 12 3 2 6 0 | 5 | 1.984 | 5 | 2.051
Csus2 | 0 2 7 | 16 0 12 3 2 6 0 15 3 2 4 0 | 0 | 1.984 | 0 | 2.051
C5 | 0 7 | 15 0 2 3 0 6 0 10 3 2 1 0 | 0 | 1.673 | 0 | 1.783
C-E | 0 4 | 13 0 3 0 10 5 2 0 3 5 1 0 | 0 | 1.797 | 0 | 1.891
C-Eb | 0 3 | 10 1 2 10 0 7 0 0 8 0 1 3 | 0 3 | 2.049 | 0 | 2.082
C-F | 0 5 | 10 3 2 1 0 15 0 2 3 0 6 0 | 5 | 1.673 | 5 | 1.783
C-A | 0 9 | 10 0 7 0 0 8 0 1 3 10 1 2 | 0 9 | 2.049 | 9 | 2.082
E-Bb | 4 10 | 5 0 1 5 10 0 5 0 1 5 10 0 | 4 10 | 2.049 | 4 10 | 2.183
C7 no root | 4 7 10 | 10 0 1 8 10 1 5 10 1 7 10 0 | 0 4 7 10 | 2.510 | 4 7 | 2.550
C9 no root | 2 4 7 10 | 11 0 11 8 12 1 5 15 1 7 13 0 | 7 | 2.366 | 7 | 2.441
C9 | 0 2 4 7 10 | 21 0 13 8 12 6 5 15 4 7 14 0 | 0 | 2.236 | 0 | 2.285
Cadd9 | 0 2 4 7 | 19 0 13 3 12 6 2 15 3 7 4 0 | 0 | 2.103 | 0 | 2.165
";

#[test]
fn parncutts_weights_of_many_chords() {
    let mut rows = 0;
    for row in WORKED_OUT.lines().filter(|row| !row.is_empty()) {
        let fields: Vec<&str> = row.split('|').map(str::trim).collect();
        let numbers = |field: usize| -> Vec<u16> {
            let words = fields[field].split(' ');
            words.map(|word| word.parse().expect("a number")).collect()
        };
        let classes = |field: usize| -> PitchClasses {
            numbers(field).into_iter().map(|n| n as u8).collect()
        };
        let chord = classes(1);
        assert_eq!(OF_2006.weights(chord).to_vec(), numbers(2), "{row}");
        for (model, roots, figure) in [(&OF_2006, 3, 4), (&OF_1988, 5, 6)] {
            assert_eq!(model.roots(chord), classes(roots), "{row}");
            let wanted: f64 = fields[figure].parse().expect("a figure");
            assert!((ambiguity(model, chord) - wanted).abs() < 0.00051, "{row}");
        }
        rows += 1;
    }
    assert_eq!(rows, 23);
}

/// Common practice: the roots that a harmony book gives these chords, in every inversion and on every key.
#[test]
fn roots_of_the_book() {
    let same = |root: u8| move |_: u8| root;
    let check = |chord: &[u8], wanted: &dyn Fn(u8) -> u8| {
        for on in 0..12 {
            for bass in chord {
                let keys: PitchClasses = chord.iter().map(|class| class + on).collect();
                let found = root(keys, bass + on, None);
                assert_eq!(
                    found,
                    Some((wanted(*bass) + on) % 12),
                    "{chord:?} over {bass}"
                );
            }
        }
    };
    for (chord, root) in [
        (&[0, 4, 7][..], 0),
        (&[0, 3, 7], 0),
        (&[0, 3, 6], 0),
        (&[0, 7], 0),
        (&[0, 4], 0),
        (&[0, 3], 0),
        (&[0, 5], 5),
        (&[0, 9], 9),
        (&[0, 10], 0),
        (&[0, 4, 7, 10], 0),
        (&[0, 4, 7, 11], 0),
        (&[0, 3, 7, 10], 0),
        (&[0, 3, 6, 10], 0),
        (&[0, 4, 7, 9], 9),
        (&[0, 2, 4, 7, 10], 0),
        (&[0, 2, 4, 7], 0),
        (&[4, 7, 10], 4),
    ] {
        check(chord, &same(root));
    }
    // Symmetric chords: the bass.
    check(&[0, 4, 8], &|bass| bass);
    check(&[0, 3, 6, 9], &|bass| bass);
    // A suspended fourth is one over its root, else a suspended second of the fourth.
    check(&[0, 5, 7], &|bass| if bass == 0 { 0 } else { 5 });
}
