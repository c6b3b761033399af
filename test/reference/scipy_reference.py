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


def fine_gradient(mv, rate_hz):
    """Slope of the trace resampled twentyfold by a polyphase low-pass, V/s, twenty values a sample."""
    taps = signal.firwin(20 * 80 + 1, 1 / 20, window=("kaiser", 9))
    fine = signal.resample_poly(mv - mv[0], 20, 1, window=taps)
    return (np.gradient(fine) * 20 * rate_hz / 1000).tolist()


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


def gain(rate_hz, order, low_hz, high_hz, frequency_hz):
    corners = [corner for corner in (low_hz, high_hz) if corner is not None]
    kind = "bandpass" if len(corners) == 2 else "lowpass" if low_hz is None else "highpass"
    sos = signal.butter(order, corners if len(corners) == 2 else corners[0], kind, fs=rate_hz, output="sos")
    # signal.sosfreqz in SciPy before 1.15, signal.freqz_sos from then on.
    _, response = signal.sosfreqz(sos, worN=frequency_hz, fs=rate_hz)
    return np.abs(response).tolist()


def coverage(freedom):
    return stats.t.ppf(0.975, np.asarray(freedom)).tolist()


def sine_near(mv, rate_hz, frequency_hz):
    t = np.arange(len(mv)) / rate_hz
    mv = np.asarray(mv)

    def residual(p):
        return p[0] * np.sin(2 * np.pi * p[2] * t) + p[1] * np.cos(2 * np.pi * p[2] * t) + p[3] + p[4] * t - mv

    best = optimize.least_squares(residual, [0.1, 0.1, frequency_hz, mv.mean(), 0.0], x_scale=[1, 1, 0.1, 1, 1], xtol=1e-14, ftol=1e-14)
    return {"frequency_hz": best.x[2], "amplitude": float(np.hypot(best.x[0], best.x[1]))}


def theil_sen_interval(x, y):
    slope, _, low, high = stats.theilslopes(y, x, 0.95)
    return {"low": low, "high": high}


def medians(mv, half_width):
    return signal.medfilt(mv, 2 * half_width + 1).tolist()


def means(mv, half_width):
    return np.convolve(mv, np.ones(2 * half_width + 1) / (2 * half_width + 1), mode="same").tolist()


def stretches(mv, gap):
    mv = np.array(mv)
    mv[gap] = np.nan
    runs = np.ma.clump_unmasked(np.ma.masked_invalid(mv))
    return [[int(run.start), int(run.stop)] for run in runs]


def exponential(x, y):
    def model(t, offset, amplitude, tau):
        return offset + amplitude * np.exp(-t / tau)

    x = np.asarray(x)
    start = (y[-1], y[0] - y[-1], (x[-1] - x[0]) / 4)
    best, covariance = optimize.curve_fit(model, x - x[0], y, p0=start, xtol=1e-14, ftol=1e-14, maxfev=20000)
    return {"best": best.tolist(), "se": np.sqrt(np.diag(covariance)).tolist()}


def two_exponentials(x, y):
    def model(t, offset, a, log_slow, b, log_fast):
        return offset + a * np.exp(-t / np.exp(log_slow)) + b * np.exp(-t / np.exp(log_fast))

    x, y = np.asarray(x), np.asarray(y)
    span = x[-1] - x[0]
    fits = []
    for ratio in (4, 15, 60):
        start = (y[-1], (y[0] - y[-1]) / 2, np.log(span / 5), (y[0] - y[-1]) / 2, np.log(span / 5 / ratio))
        try:
            best, covariance = optimize.curve_fit(model, x, y, p0=start, xtol=1e-14, ftol=1e-14, maxfev=20000)
        except RuntimeError:
            continue
        fits.append((float(np.sum((y - model(x, *best)) ** 2)), best, covariance))
    rss, best, covariance = min(fits, key=lambda fit: fit[0])
    return {"rss": rss, "best": best.tolist(), "se": np.sqrt(np.diag(covariance)).tolist()}


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
    tasks = {name: f for name, f in globals().items() if getattr(f, "__module__", None) == "__main__"}
    answers = []
    for request in json.load(sys.stdin):
        task = tasks[request.pop("task")]
        answers.append(task(**{k: np.asarray(v) if isinstance(v, list) else v for k, v in request.items()}))
    json.dump(answers, sys.stdout)
