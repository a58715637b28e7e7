//! trued against what its authors did not write. Nothing here is skipped: what is missing is named, and how to get it.

/// A real synth, and the pitch of what it plays.
mod fluidsynth;

/// A real sequencer, in a virtual machine.
mod alsa;

/// A real JACK server.
mod jack;

/// Tunings, beats and words on the wire, against published tables.
mod tables;

/// Roots of chords, against published models and a harmony book.
mod roots;

/// Chords placed by least squares, against numpy.
mod least_squares;

/// Chorales in tunings that follow the chord, against published figures.
mod adaptive;
