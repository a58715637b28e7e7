"""Reads Bach chorales out of the music21 corpus, for tests that score what trued makes of them.

  export.py check              are the packages of requirements.txt here, in just these versions?
  export.py chorales TAKE OUT  pieces as JSON; TAKE is START:STEP:COUNT over the sorted file names
  export.py printed OUT        all of them, as they are printed and without their keys, by a reader that takes seconds
  export.py analyses OUT       the chorales with a hand-made harmonic analysis, slice by slice, as JSON

A piece is taken if it has parts named Soprano, Alto, Tenor and Bass, and then only those. Ties are merged, grace notes
left out, repeats not played. Times are exact quarters from the start, [numerator, denominator].
"""
import glob
import json
import os
import re
import sys
from concurrent.futures import ProcessPoolExecutor
from fractions import Fraction
from importlib.metadata import PackageNotFoundError, version
from importlib.util import find_spec
from xml.etree import ElementTree
from zipfile import ZipFile

VOICES = ("Soprano", "Alto", "Tenor", "Bass")
QUARTER_S = 0.75
SPREAD_S = 0.03
SHORTEST_S = 0.02


def check():
    here = os.path.dirname(os.path.abspath(__file__))
    for line in open(os.path.join(here, "requirements.txt"), encoding="ascii"):
        package, wanted = line.strip().split("==")
        try:
            found = version(package)
        except PackageNotFoundError:
            found = "missing"
        if found != wanted:
            sys.exit(f"{package} is {found}, not {wanted}")


def folder():
    return os.path.join(os.path.dirname(find_spec("music21").origin), "corpus", "bach")


def names():
    return sorted(os.path.basename(path) for path in glob.glob(os.path.join(folder(), "bwv*.mxl")))


def exact(quarters):
    return Fraction(quarters).limit_denominator(48)


def load(name):
    """(score, notes) with notes as (on, voice, key, spelling, off) in order; None if it is not in the four voices."""
    from music21 import converter

    score = converter.parse(os.path.join(folder(), name))
    notes = []
    for voice, part_name in enumerate(VOICES):
        part = next((part for part in score.parts if part.partName == part_name), None)
        if part is None:
            return None
        for note in part.stripTies().flatten().notes:
            if note.duration.isGrace:
                continue
            on = exact(note.offset)
            off = on + exact(note.quarterLength)
            notes += [(on, voice, pitch.midi, pitch.name.replace("-", "b"), off) for pitch in note.pitches]
    # Stable, and by no more than these three: the hands' dice are thrown in this order.
    notes.sort(key=lambda note: note[:3])
    return score, notes


def read(name):
    """A piece, still without hands."""
    loaded = load(name)
    if loaded is None:
        return None
    score, notes = loaded
    key = score.analyze("key")
    return {
        "name": name.removesuffix(".mxl"),
        "tonic": key.tonic.name.replace("-", "b"),
        "mode": key.mode,
        "notes": listed(notes),
    }


def listed(notes):
    return [
        {"voice": voice, "key": midi, "name": spelling, "on": pair(on), "off": pair(off)}
        for on, voice, midi, spelling, off in notes
    ]


def pair(fraction):
    return [fraction.numerator, fraction.denominator]


def perform(place, piece):
    """As hands would: each onset up to 30 ms late, each release 30 ms early or late."""
    import numpy

    dice = numpy.random.default_rng(place)
    for note in piece["notes"]:
        on_s, off_s = (float(Fraction(*note[edge])) * QUARTER_S for edge in ("on", "off"))
        on_s += dice.uniform(0, SPREAD_S)
        off_s = max(off_s + dice.uniform(-SPREAD_S, SPREAD_S), on_s + SHORTEST_S)
        note["performed_s"] = [on_s, off_s]


def chorales(take, out):
    start, step, count = (int(number) for number in take.split(":"))
    with ProcessPoolExecutor() as pool:
        pieces = [piece for piece in pool.map(read, names()[start::step]) if piece is not None][:count]
    for place, piece in enumerate(pieces):
        perform(place, piece)
    write(out, pieces)


def printed(out):
    pieces = []
    with ProcessPoolExecutor() as pool:
        for place, (name, notes) in enumerate(zip(names(), pool.map(read_printed, names(), chunksize=8))):
            if notes is not None:
                piece = {"place": place, "name": name.removesuffix(".mxl"), "notes": listed(notes)}
                perform(place, piece)
                pieces.append(piece)
    write(out, pieces)


def read_printed(name):
    """The notes of `load`, straight from the MusicXML; None if it is not in the four voices."""
    with ZipFile(os.path.join(folder(), name)) as packed:
        inside = next(file for file in packed.namelist() if re.match(r"(?!META-INF).*xml$", file))
        score = ElementTree.fromstring(packed.read(inside))
    ids = [next((part.get("id") for part in score.iter("score-part") if part.findtext("part-name") == voice), None)
           for voice in VOICES]
    if None in ids:
        return None
    parts = {part.get("id"): part for part in score.findall("part")}
    notes = [(on, voice, midi, spelling, off)
             for voice, part in enumerate(ids) for on, midi, spelling, off in read_part(parts[part])]
    notes.sort(key=lambda note: note[:3])
    return notes


def read_part(part):
    notes, tied = [], {}
    begin, divisions = Fraction(0), 1
    for measure in part.findall("measure"):
        at = end = begin
        for element in measure:
            if element.tag == "attributes":
                divisions = int(element.findtext("divisions") or divisions)
            if element.tag not in ("note", "backup", "forward") or element.find("grace") is not None:
                continue
            lasts = Fraction(int(element.findtext("duration")), divisions)
            is_chord = element.find("chord") is not None
            on = at - lasts if is_chord else at
            if element.find("pitch") is not None:
                midi, spelling = read_pitch(element.find("pitch"))
                ties = {tie.get("type") for tie in element.findall("tie")}
                note = tied.pop((midi, spelling), None)
                if note is None or "stop" not in ties or note[3] != on:
                    note = [on, midi, spelling, on]
                    notes.append(note)
                note[3] = on + lasts
                if "start" in ties:
                    tied[midi, spelling] = note
            if not is_chord:
                at += -lasts if element.tag == "backup" else lasts
            end = max(end, at)
        begin = end
    return notes


def read_pitch(pitch):
    step, alter = pitch.findtext("step"), int(float(pitch.findtext("alter") or 0))
    natural = {"C": 0, "D": 2, "E": 4, "F": 5, "G": 7, "A": 9, "B": 11}[step]
    midi = 12 * (int(pitch.findtext("octave")) + 1) + natural + alter
    return midi, step + "#" * alter + "b" * -alter


def analyses(out):
    files = sorted(glob.glob(os.path.join(folder(), "choraleAnalyses", "*.rntxt")))
    with ProcessPoolExecutor() as pool:
        write(out, [analysis for analysis in pool.map(analyse, files) if analysis is not None])


def analyse(path):
    """One analysis laid over its chorale; None where there is no such chorale or the two do not fit together."""
    from music21 import converter

    text = open(path, encoding="utf8", errors="replace").read()
    name = "bwv" + re.search(r"^BWV:\s*([0-9.]+)", text, re.MULTILINE).group(1) + ".mxl"
    if not os.path.exists(os.path.join(folder(), name)):
        return None
    loaded = load(name)
    if loaded is None:
        return None
    _, notes = loaded
    chords = []
    parsed = converter.parse(path, format="romantext")
    for figure in parsed.recurse().getElementsByClass("RomanNumeral"):
        if "Chord" in figure.classes:
            at = exact(figure.getOffsetInHierarchy(parsed))
            chords.append((at, figure.root().pitchClass, sorted({pitch.pitchClass for pitch in figure.pitches})))
    chords.sort(key=lambda chord: chord[0])
    sounding = list(slices(notes))
    # Upbeats are counted differently here and there: the shift at which most notes belong to their chord.
    laid = [[(end - begin, keys, chord_at(chords, begin + Fraction(halves, 2))) for begin, end, keys in sounding]
            for halves in range(-8, 9)]
    overlap, best = max(((fit(one), one) for one in laid), key=lambda found: found[0])
    if overlap <= 0.85:
        return None
    return {
        "name": name.removesuffix(".mxl"),
        "slices": [
            {"quarters": pair(quarters), "keys": keys, "root": chord and chord[1], "chord": chord[2] if chord else []}
            for quarters, keys, chord in best
        ],
    }


def slices(notes):
    """(begin, end, keys) between two edges of notes."""
    edges = sorted({edge for note in notes for edge in (note[0], note[4])})
    for begin, end in zip(edges, edges[1:]):
        keys = sorted(midi for on, _, midi, _, off in notes if on <= begin and off >= end)
        if keys:
            yield begin, end, keys


def chord_at(chords, at):
    return next((chord for chord in reversed(chords) if chord[0] <= at), None)


def fit(laid):
    """The share of the time's pitch classes that belong to the annotated chord."""
    inside = total = 0.0
    for quarters, keys, chord in laid:
        if chord is not None:
            classes = {key % 12 for key in keys}
            total += float(quarters)
            inside += float(quarters) * len(classes & set(chord[2])) / len(classes)
    return inside / total if total else 0.0


def write(out, what):
    with open(out, "w", encoding="ascii") as file:
        json.dump(what, file)


if __name__ == "__main__":
    {"check": check, "chorales": chorales, "printed": printed, "analyses": analyses}[sys.argv[1]](*sys.argv[2:])
