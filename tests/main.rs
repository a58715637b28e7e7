//! One integration binary; each module says what belongs there.

/// Rig, receiver and figures that the others use.
mod support;

/// Bytes to messages, and parameter sequences, against printed examples.
mod midi_stream;

/// Random play while songs, plans, ports and parts change under it.
mod changes;

/// What the README shows.
mod readme;

/// A wire that carries less than a player does.
mod thinning;

/// Two keyboards on the same keys.
mod unisons;

/// Every form of a cue with every action, against a small model of its own.
mod cue_forms;

/// Random play on a keyboard that sends each note on a channel of its own.
mod expressive;

/// Songs that follow the harmony, played as densely as hands can.
mod dense;

/// The example stages that come with trued, played song by song.
mod evenings;

/// A counting allocator: the engine takes nothing from the heap once it is made.
mod no_alloc;

/// Ten thousand random notes, through both dialects, three bend ranges and five tunings, heard from outside.
mod random_play;

/// Script in, transcript out: what the engine promises, one story each.
mod scenes;

/// A thousand song changes under held and pedalled notes.
mod song_changes;

/// Arrows between rooms, banned words in the core, file length.
mod tidy;

/// The daemon's score between simulated ports: order, deadlines, stop, full and lost ports, a panic.
mod score;

/// Stage files: every form loads, every mistake is told exactly.
mod stage;

/// Against what we did not write: a real synth, published tables, a real sequencer.
mod outside;

/// The built-in rehearsal, measured from its sound.
mod rehearse;

/// MIDI files through the engine.
mod retune;

/// The binary as players type it: files, words and exit codes.
mod command_line;

/// The chart on the command line.
mod chart;

/// A running daemon as people and a supervisor meet it: control socket, `tell`, `status`, readiness, watchdog.
mod control;

/// What outlasts a restart or a pulled plug.
mod remembered;

/// Edits of a stage file while it plays, on real files and real time.
mod edits;
