"""Answers requests about filtered voltage-clamp steps with SciPy: a JSON list in, the list of answers out.

A request is {"task": name, ...}; used by clamp.test.ts and by nothing else.
"""

import json
import sys

import numpy as np
from scipy import optimize, signal


def bessel(corner_khz):
    # Time in ms, so that corners stand in kHz.
    return signal.bessel(4, 2 * np.pi * corner_khz, analog=True, norm="mag", output="ba")


def responses(corner_khz, tau_ms, ms):
    b, a = bessel(corner_khz)
    _, step = signal.step((b, a), T=ms)
    _, impulse = signal.impulse((b, a), T=ms)
    # A step that decays is the impulse answer of H/(s + 1/tau).
    _, decay = signal.impulse((b, np.polymul(a, [1, 1 / tau_ms])), T=ms)
    return {"step": step.tolist(), "impulse": impulse.tolist(), "decay": decay.tolist()}


def fit(current, rate_hz, corner_khz, mv, edges_s, start):
    """Least squares of circuit, filter, level, slope and lag by brute simulation at four times the rate."""
    b, a = bessel(corner_khz)
    over = 4
    n = len(current)
    # Longer than the answer lasts; after that it keeps its last value.
    ms = np.arange(0, 25, 1000 / rate_hz / over)
    sampled = np.arange(n) * 1000 / rate_hz

    def model(p):
        access, membrane, pf, level, slope, lag = p
        parallel = access * membrane / (access + membrane) * pf / 1000
        # Admittance, nS: 1/R_a · (s + 1/(R_m·C)) / (s + 1/tau).
        num = np.polymul(b, np.array([1, 1000 / (membrane * pf)]) * 1000 / access)
        den = np.polymul(a, [1, 1 / parallel])
        _, answer = signal.step((num, den), T=ms)
        out = level + slope * sampled
        for at, size in zip(edges_s, mv):
            out = out + size * np.interp(sampled - at * 1000 - lag, ms, answer, left=0.0)
        return out

    found = optimize.least_squares(lambda p: model(p) - current, start, x_scale=np.abs(start) + 1e-3)
    return found.x.tolist()


if __name__ == "__main__":
    tasks = {f.__name__: f for f in (responses, fit)}
    answers = []
    for request in json.load(sys.stdin):
        task = tasks[request.pop("task")]
        answers.append(task(**{k: np.asarray(v) if isinstance(v, list) else v for k, v in request.items()}))
    json.dump(answers, sys.stdout)
