"""Answers requests with SciPy and NumPy: a JSON list on standard input, the list of answers on standard output.

A request is {"task": name, ...}; see the functions below, one a task. Used by scipy.test.ts and by nothing else.
"""

import json
import sys

import numpy as np
from scipy import optimize, signal, stats


def peaks(mv, prominence):
    found, _ = signal.find_peaks(mv, prominence=prominence)
    prominences = signal.peak_prominences(mv, found)
    widths = signal.peak_widths(mv, found, rel_height=0.5, prominence_data=prominences)
    return {
        "index": found.tolist(),
        "prominence": prominences[0].tolist(),
        "half_width_samples": widths[0].tolist(),
    }


def maxima(mv):
    return signal.find_peaks(mv)[0].tolist()


def gradient(mv, rate_hz):
    return (np.gradient(mv) * rate_hz / 1000).tolist()


def savgol(mv, rate_hz, half_width):
    slope = signal.savgol_filter(mv, 2 * half_width + 1, 1, deriv=1, delta=1000 / rate_hz, mode="interp")
    return slope.tolist()


def butter(mv, rate_hz, order, low_hz, high_hz):
    if low_hz is None:
        corner, kind = high_hz, "lowpass"
    elif high_hz is None:
        corner, kind = low_hz, "highpass"
    else:
        corner, kind = [low_hz, high_hz], "bandpass"
    sos = signal.butter(order, corner, kind, fs=rate_hz, output="sos")
    return signal.sosfiltfilt(sos, mv).tolist()


def exponential(x, y):
    def model(t, offset, amplitude, tau):
        return offset + amplitude * np.exp(-t / tau)

    x = np.asarray(x)
    start = (y[-1], y[0] - y[-1], (x[-1] - x[0]) / 4)
    best, covariance = optimize.curve_fit(model, x - x[0], y, p0=start, xtol=1e-14, ftol=1e-14, maxfev=20000)
    return {"best": best.tolist(), "se": np.sqrt(np.diag(covariance)).tolist()}


def line(x, y):
    fit = stats.linregress(x, y)
    return {
        "slope": fit.slope,
        "intercept": fit.intercept,
        "se_slope": fit.stderr,
        "se_intercept": fit.intercept_stderr,
        "r_squared": fit.rvalue**2,
    }


def theil_sen(x, y):
    slope, intercept, _, _ = stats.theilslopes(y, x)
    return {"slope": slope, "intercept": intercept}


def spread(values):
    return {
        "mad": stats.median_abs_deviation(values, scale="normal"),
        "quantiles": np.quantile(values, [0, 0.05, 0.25, 0.5, 0.9, 1]).tolist(),
        "sd": float(np.std(values, ddof=1)),
    }


def sine(mv, rate_hz, frequency_hz):
    t = np.arange(len(mv)) / rate_hz
    columns = [np.sin(2 * np.pi * frequency_hz * t), np.cos(2 * np.pi * frequency_hz * t), np.ones_like(t), t]
    best = np.linalg.lstsq(np.stack(columns, axis=1), np.asarray(mv), rcond=None)[0]
    return float(np.hypot(best[0], best[1]))


if __name__ == "__main__":
    tasks = {
        f.__name__: f
        for f in (peaks, maxima, gradient, savgol, butter, exponential, line, theil_sen, spread, sine)
    }
    answers = []
    for request in json.load(sys.stdin):
        task = tasks[request.pop("task")]
        answers.append(task(**{k: np.asarray(v) if isinstance(v, list) else v for k, v in request.items()}))
    json.dump(answers, sys.stdout)
