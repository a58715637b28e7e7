"""Random chords as springs, placed by numpy.

  numpy_cases.py COUNT    prints COUNT chords, one line of JSON each, with numpy's places where it could try every
                          combination of sizes
  numpy_cases.py judge    reads chords with somebody's places, one line of JSON each, and prints for each where numpy
                          puts it if every interval keeps the size it has there, and the strain, one line of JSON each

For tones x with keys k, anchors v of weight h, rest r and a leash L on the mean over all K keys:

  V(x) = sum over pairs of w k_i k_j (x_j - x_i - d)^2 + sum of h (x - v)^2 + K L (sum of k (x - r) / K)^2

All in cents from twelve-equal; V is least where its derivative is zero, which is the linear system below.
"""
import itertools
import json
import math
import random
import sys

import numpy

COMBINATIONS_MAX = 60_000

FIVE = {
    0: [(1, 1)], 1: [(16, 15)], 2: [(9, 8), (10, 9)], 3: [(6, 5)], 4: [(5, 4)], 5: [(4, 3)],
    6: [(45, 32), (64, 45)], 7: [(3, 2)], 8: [(8, 5)], 9: [(5, 3)], 10: [(16, 9), (9, 5)], 11: [(15, 8)],
}
SEVEN = {2: [(8, 7)], 3: [(7, 6)], 6: [(7, 5), (10, 7)], 9: [(12, 7)], 10: [(7, 4)]}
CONSONANT = (3, 4, 5, 7, 8, 9)


def pairs(case):
    """(lower, upper, weight, sizes) of every two tones."""
    tones = case["tones"]
    for i, j in itertools.combinations(range(len(tones)), 2):
        semitones = (tones[j]["key"] - tones[i]["key"]) % 12
        ratios = FIVE[semitones] + (SEVEN.get(semitones, []) if case["sevens"] else [])
        sizes = [1200 * math.log2(over / under) - 100 * semitones for over, under in ratios]
        weight = 2 if semitones == 0 else 1 if semitones in CONSONANT else case["dissonance"]
        yield i, j, weight * tones[i]["keys"] * tones[j]["keys"], sizes


def equations(case):
    tones = case["tones"]
    n = len(tones)
    keys = numpy.array([tone["keys"] for tone in tones], float)
    rest = numpy.array([tone["rest"] for tone in tones])
    held = numpy.array([tone["weight"] for tone in tones])
    at = numpy.array([tone["anchor"] for tone in tones])
    matrix = numpy.diag(held) + case["leash"] / keys.sum() * numpy.outer(keys, keys)
    home = held * at + case["leash"] / keys.sum() * keys * (keys @ rest)
    for i, j, weight, _ in pairs(case):
        matrix[[i, j], [i, j]] += weight
        matrix[[i, j], [j, i]] -= weight
    return matrix, home


def strain(case, x, sizes):
    """x and sizes: one column for each combination."""
    total = sum(w * (x[j] - x[i] - sizes[p]) ** 2 for p, (i, j, w, _) in enumerate(pairs(case)))
    for tone, place in zip(case["tones"], x):
        total = total + tone["weight"] * (place - tone["anchor"]) ** 2
    keys = sum(tone["keys"] for tone in case["tones"])
    mean = sum(t["keys"] * (place - t["rest"]) for t, place in zip(case["tones"], x)) / keys
    return total + keys * case["leash"] * mean ** 2


def place(case, sizes):
    """sizes: pairs x combinations."""
    matrix, home = equations(case)
    right = numpy.repeat(home[:, None], sizes.shape[1], axis=1)
    for p, (i, j, weight, _) in enumerate(pairs(case)):
        right[i] -= weight * sizes[p]
        right[j] += weight * sizes[p]
    x = numpy.linalg.solve(matrix, right)
    return x, strain(case, x, sizes)


def combinations(case):
    return math.prod(len(sizes) for _, _, _, sizes in pairs(case))


def best(case):
    """Places of least strain, that strain, and how much more the next other combination has."""
    choices = [sizes for _, _, _, sizes in pairs(case)]
    sizes = numpy.array(list(itertools.product(*choices))).T
    x, v = place(case, sizes)
    order = numpy.argsort(v)
    gap = v[order[1]] - v[order[0]] if len(order) > 1 else 1e9
    return x[:, order[0]].tolist(), float(v[order[0]]), float(gap)


def judge(case):
    x = case["places"]
    sizes = [min(s, key=lambda size: abs(x[j] - x[i] - size)) for i, j, _, s in pairs(case)]
    places, v = place(case, numpy.array(sizes)[:, None])
    return {"places": places[:, 0].tolist(), "strain": float(v[0])}


def millionths(value):
    return round(value * 1e6) / 1e6


def deal(dice):
    """A chord of one to ten keys: each key a tone, or each pitch class."""
    keys = sorted(dice.sample(range(36, 84), dice.randint(1, 10)))
    counts = [(key, 1) for key in keys]
    if dice.random() < 0.4:
        classes = sorted({key % 12 for key in keys})
        counts = [(c, sum(key % 12 == c for key in keys)) for c in classes]
    tuned = dice.random() < 0.5
    anchored = dice.choice([0, 0.3, 0.6, 1])
    tones = []
    for key, count in counts:
        holds = dice.random() < anchored
        tones.append({
            "key": key,
            "keys": count,
            "rest": millionths(dice.uniform(-25, 25)) if tuned else 0,
            "anchor": millionths(dice.uniform(-30, 30)) if holds else 0,
            "weight": millionths(10 ** dice.uniform(-3, 1.5)) if holds else 0,
        })
    holds = any(tone["weight"] for tone in tones)
    return {
        "tones": tones,
        "sevens": dice.random() < 0.5,
        "dissonance": dice.choice([0.05, 0.1, 0.25, 1]),
        "leash": dice.choice([0, 0.001, 0.06, 0.4, 5] if holds else [0.001, 0.06, 0.4, 5]),
    }


def main():
    if sys.argv[1] == "judge":
        for line in sys.stdin:
            print(json.dumps(judge(json.loads(line))))
        return
    dice = random.Random(1)
    for _ in range(int(sys.argv[1])):
        case = deal(dice)
        case["combinations"] = combinations(case)
        if case["combinations"] <= COMBINATIONS_MAX:
            case["places"], case["strain"], case["gap"] = best(case)
        print(json.dumps(case))


main()
