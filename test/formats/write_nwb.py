"""Writes NWB files with h5py, as a second program would, for the tests of the reader.

usage: write_nwb.py OUT_FOLDER

Every number is a small closed formula of its sample's index, so that the tests know what to expect.
"""

import os
import sys

import h5py
import numpy as np

out = sys.argv[1]
n = 2000
text = h5py.string_dtype("utf-8")
ramp = np.arange(n)


def potential(k):
    """Volts, all multiples of 2^-15."""
    return -0.0703125 + ((ramp * 7 + k * 13) % 64) / 32768


def command(k):
    """Amperes: a step of (k - 2) * 50 pA in the middle."""
    return np.where((ramp >= 500) & (ramp < 1500), (k - 2) * 50e-12, 0.0)


def start(name, **session):
    f = h5py.File(os.path.join(out, name), "w")
    f.attrs["neurodata_type"] = "NWBFile"
    f.attrs["namespace"] = "core"
    f.attrs["nwb_version"] = session.get("version", "2.7.0")
    f["session_start_time"] = session.get("start", "2026-03-12T14:05:09.250000+01:00")
    f["session_description"] = "made up"
    f["identifier"] = name
    f["timestamps_reference_time"] = session.get("start", "2026-03-12T14:05:09.250000+01:00")
    f.create_group("acquisition")
    f.create_group("stimulus/presentation")
    f.create_group("stimulus/templates")
    f.create_group("general/intracellular_ephys")
    return f


def electrode(f, name, **texts):
    g = f.create_group("general/intracellular_ephys/" + name)
    g.attrs["neurodata_type"] = "IntracellularElectrode"
    for key, value in texts.items():
        g.create_dataset(key, data=value, dtype=text)
    return g


def series(f, path, kind, data, unit, rate=20000.0, at=0.0, electrode=None, sweep=None, label="", **rest):
    g = f.create_group(path)
    g.attrs["neurodata_type"] = kind
    g.attrs["namespace"] = "core"
    if label:
        g.attrs["stimulus_description"] = label
    if sweep is not None:
        g.attrs["sweep_number"] = np.uint32(sweep)
    d = g.create_dataset("data", data=data, **rest.get("storage", {}))
    d.attrs["unit"] = unit
    d.attrs["conversion"] = rest.get("conversion", 1.0)
    if "offset" in rest:
        d.attrs["offset"] = rest["offset"]
    if rest.get("times") is not None:
        t = g.create_dataset("timestamps", data=rest["times"])
        t.attrs["unit"] = "seconds"
        t.attrs["interval"] = 1
    elif rate is not None:
        s = g.create_dataset("starting_time", data=at)
        s.attrs["rate"] = rate
        s.attrs["unit"] = "seconds"
    if electrode:
        g["electrode"] = h5py.SoftLink("/general/intracellular_ephys/" + electrode)
    for key in ("bridge_balance", "bias_current", "capacitance_compensation", "gain"):
        if key in rest:
            g.create_dataset(key, data=rest[key])
    return g


# Storage: chunked and compressed, integers with conversion and offset, big-endian, single precision, 64 bit.
with start("storage.nwb") as f:
    electrode(f, "e0", description="made up")
    counts = ((ramp * 7) % 64 - 2304).astype("i2")
    packed = {"chunks": (256,), "compression": "gzip", "shuffle": True}
    kinds = {
        "int16_gzip_shuffle": (counts, packed, 1 / 32768),
        "int16_big_endian": (counts.astype(">i2"), {}, 1 / 32768),
        "int32": (counts.astype("i4"), {"chunks": (300,), "fletcher32": True}, 1 / 32768),
        "int64": (counts.astype("i8"), {}, 1 / 32768),
        "float32": (potential(0).astype("f4"), {"compression": "gzip"}, 1.0),
        "float64_big_endian": (potential(0).astype(">f8"), {}, 1.0),
        "float64_millivolts": (potential(0) * 1000, {}, 0.001),
    }
    for at, (name, (data, storage, conversion)) in enumerate(kinds.items()):
        series(f, "acquisition/" + name, "CurrentClampSeries", data, "volts", at=float(at), electrode="e0",
               storage=storage, conversion=conversion)
    series(f, "acquisition/with_offset", "CurrentClampSeries", counts, "volts", at=90.0, electrode="e0",
           conversion=1 / 32768, offset=-0.015625)
    holed = potential(0)
    holed[[3, 700]] = np.nan
    holed[1999] = np.inf
    series(f, "acquisition/with_holes", "CurrentClampSeries", holed, "V", at=91.0, electrode="e0")

# The intracellular recording tables: one long series cut into pieces, and a row without a stimulus.
with start("tables.nwb") as f:
    electrode(f, "e0", description="made up", filtering="Bessel 10 kHz", resistance="4.5 MOhm", seal="2.5 GOhm",
              initial_access_resistance="12 MOhm", slice="coronal, 300 um", location="layer 5")
    subject = f.create_group("general/subject")
    for key, value in dict(subject_id="m41", species="Mus musculus", age="P30D", sex="F", genotype="wild type").items():
        subject.create_dataset(key, data=value, dtype=text)
    series(f, "acquisition/long", "CurrentClampSeries", np.concatenate([potential(0), potential(1), potential(2)]),
           "volts", electrode="e0", bridge_balance=14e6, bias_current=-20e-12)
    series(f, "stimulus/presentation/first", "CurrentClampStimulusSeries", command(0), "amperes", electrode="e0")
    series(f, "stimulus/presentation/second", "CurrentClampStimulusSeries", command(1), "amperes", at=0.1, electrode="e0")
    piece = np.dtype([("idx_start", "i4"), ("count", "i4"), ("timeseries", h5py.ref_dtype)])
    table = f.create_group("general/intracellular_ephys/intracellular_recordings")
    table.attrs["neurodata_type"] = "IntracellularRecordingsTable"
    table.create_dataset("id", data=np.arange(3))
    rows = [(0, n, "acquisition/long"), (n, n, "acquisition/long"), (2 * n, n, "acquisition/long")]
    for part, column, cells in (
        ("responses", "response", rows),
        ("stimuli", "stimulus", [(0, n, "stimulus/presentation/first"), (0, n, "stimulus/presentation/second"),
                                 (-1, -1, "acquisition/long")]),
    ):
        g = table.create_group(part)
        d = g.create_dataset(column, (3,), dtype=piece)
        d[...] = np.array([(a, b, f[c].ref) for a, b, c in cells], dtype=piece)
    e = table.create_group("electrodes").create_dataset("electrode", (3,), dtype=h5py.ref_dtype)
    for row in range(3):
        e[row] = f["general/intracellular_ephys/e0"].ref
    simultaneous = f.create_group("general/intracellular_ephys/simultaneous_recordings")
    simultaneous.create_dataset("id", data=np.array([10, 11, 12]))
    simultaneous.create_dataset("recordings", data=np.array([0, 1, 2]))
    simultaneous.create_dataset("recordings_index", data=np.array([1, 2, 3]))
    sequential = f.create_group("general/intracellular_ephys/sequential_recordings")
    sequential.create_dataset("id", data=np.array([0, 1]))
    sequential.create_dataset("simultaneous_recordings", data=np.array([0, 1, 2]))
    sequential.create_dataset("simultaneous_recordings_index", data=np.array([2, 3]))
    sequential.create_dataset("stimulus_type", data=["long step", "rest"], dtype=text)

# The older sweep table; names that say nothing; two electrodes; a stimulus shared by its number.
with start("sweep_table.nwb") as f:
    for name in ("e0", "e1"):
        electrode(f, name, description="made up", filtering="low-pass 5000 Hz", location="layer " + name[1])
    refs, index, numbers = [], [], []
    for k in range(3):
        for e in ("e0", "e1"):
            a = series(f, f"acquisition/r{k}{e}", "CurrentClampSeries", potential(k), "volts", at=float(k), electrode=e)
            s = series(f, f"stimulus/presentation/z{9 - k}{e}", "CurrentClampStimulusSeries",
                       command(k) * (1 if e == "e0" else -1), "amperes", at=float(k), electrode=e)
            refs += [a.ref, s.ref]
        index.append(len(refs))
        numbers.append(40 + k)
    table = f.create_group("general/intracellular_ephys/sweep_table")
    table.attrs["neurodata_type"] = "SweepTable"
    table.create_dataset("id", data=np.arange(3))
    table.create_dataset("sweep_number", data=np.array(numbers, dtype="u4"))
    table.create_dataset("series_index", data=np.array(index, dtype="u4"))
    table.create_dataset("series", data=np.array(refs, dtype=object), dtype=h5py.ref_dtype)

# Timestamps: regular, rounded, with missing samples, irregular.
with start("timestamps.nwb") as f:
    t = ramp / 20000 + 5
    series(f, "acquisition/regular", "CurrentClampSeries", potential(0), "volts", times=t)
    series(f, "acquisition/rounded", "CurrentClampSeries", potential(0), "volts", times=np.round(t, 5))
    keep = np.delete(ramp, [100, 101, 1500])
    series(f, "acquisition/gaps", "CurrentClampSeries", potential(0)[keep], "volts", times=t[keep])
    series(f, "acquisition/irregular", "CurrentClampSeries", potential(0), "volts", times=5 + (ramp / 20000) ** 1.2)
    series(f, "acquisition/short", "CurrentClampSeries", potential(0), "volts", times=t[:1900])
    series(f, "acquisition/neither", "CurrentClampSeries", potential(0), "volts", rate=None)

# Links: samples that stand in another series, a link to nothing, a link into a missing file, a chain in a circle.
with start("links.nwb") as f:
    g = series(f, "acquisition/deep/er/real", "CurrentClampSeries", potential(3), "volts")
    h = series(f, "acquisition/linked", "CurrentClampSeries", potential(4), "volts", at=1.0)
    del h["data"]
    h["data"] = h5py.SoftLink("/acquisition/deep/er/real/data")
    b = series(f, "acquisition/broken", "CurrentClampSeries", potential(4), "volts", at=2.0)
    del b["data"]
    b["data"] = h5py.SoftLink("/acquisition/nowhere")
    x = series(f, "acquisition/outside", "CurrentClampSeries", potential(4), "volts", at=3.0)
    del x["data"]
    x["data"] = h5py.ExternalLink("missing_part.h5", "/data")
    f["acquisition/circle"] = h5py.SoftLink("/acquisition")

# Labels against data.
with start("mislabelled.nwb", start="1871-05-18T00:00:00+00:00") as f:
    series(f, "acquisition/potential_in_amperes", "CurrentClampSeries", potential(0), "amperes")
    series(f, "acquisition/arbitrary_millivolts", "CurrentClampSeries", potential(0) * 1000, "a.u.", at=1.0)
    series(f, "acquisition/arbitrary_huge", "CurrentClampSeries", potential(0) * 1e9, "a.u.", at=2.0)
    series(f, "acquisition/voltage_clamp_in_volts", "VoltageClampSeries", potential(0), "volts", at=3.0)
    series(f, "acquisition/current_clamp_of_a_current", "CurrentClampSeries", command(0) - 1e-11, "A", at=4.0)
    series(f, "acquisition/millivolts_called_volts", "CurrentClampSeries", potential(0) * 1000, "volts", at=5.0)
    series(f, "acquisition/plain", "PatchClampSeries", potential(0), "V", at=6.0)
    series(f, "acquisition/undecided", "CurrentClampSeries", 50 + potential(0), "pA", at=7.0)
    series(f, "acquisition/zero_conversion", "CurrentClampSeries", potential(0), "volts", conversion=0.0, at=8.0)
    series(f, "acquisition/bridge_in_megohms", "CurrentClampSeries", potential(0), "volts", at=9.0, bridge_balance=14.0)
    series(f, "acquisition/temperature", "TimeSeries", potential(0), "celsius", at=10.0)
    series(f, "acquisition/at_rest", "IZeroClampSeries", potential(0), "volts", at=11.0)
    series(f, "acquisition/empty", "CurrentClampSeries", np.zeros(0), "volts", at=12.0)
    series(f, "acquisition/words", "CurrentClampSeries", np.array([b"a", b"b"]), "volts", at=13.0)
    series(f, "acquisition/cube", "CurrentClampSeries", np.zeros((4, 4, 4)), "volts", at=14.0)
    series(f, "acquisition/lzf", "CurrentClampSeries", potential(0), "volts", at=15.0,
           storage={"chunks": (256,), "compression": "lzf"})
    two = np.stack([potential(0), potential(1)], axis=1)
    series(f, "acquisition/two_columns", "CurrentClampSeries", two, "volts", at=16.0)
    series(f, "acquisition/two_rows", "CurrentClampSeries", two.T, "volts", at=17.0, storage={"chunks": (1, 500)})

# Stimuli by number, by name, of another length or rate, ambiguous, of the wrong kind; amplitude in a label.
with start("stimuli.nwb") as f:
    series(f, "acquisition/data_00000_AD0", "CurrentClampSeries", potential(0), "volts", sweep=0, label="step -100 pA")
    series(f, "stimulus/presentation/data_00000_DA0", "CurrentClampStimulusSeries", command(0), "amperes", sweep=0)
    series(f, "acquisition/VoltageClampSeries007", "VoltageClampSeries", command(3) * 2, "amperes", at=1.0)
    series(f, "stimulus/presentation/VoltageClampStimulusSeries007", "VoltageClampStimulusSeries", potential(1), "volts",
           at=1.0, label="to -70 mV and back")
    # NWB core schema, VoltageClampSeries: farads and percent, each a scalar dataset with a fixed unit.
    for name, value, unit in [("whole_cell_capacitance_comp", 42.5e-12, "farads"),
                              ("resistance_comp_correction", 70.0, "percent")]:
        f["acquisition/VoltageClampSeries007"].create_dataset(name, data=value).attrs["unit"] = unit
    series(f, "acquisition/short_stimulus_8", "CurrentClampSeries", potential(2), "volts", at=2.0)
    series(f, "stimulus/presentation/short_stimulus_8", "CurrentClampStimulusSeries", command(2)[:1500] + 1e-12, "A", at=2.0)
    series(f, "acquisition/slow_stimulus_9", "CurrentClampSeries", potential(2), "volts", at=3.0)
    series(f, "stimulus/presentation/slow_stimulus_9", "CurrentClampStimulusSeries", command(4)[::4], "amperes",
           rate=5000.0, at=3.0)
    series(f, "acquisition/twins", "CurrentClampSeries", potential(2), "volts", at=4.0, sweep=77)
    series(f, "stimulus/presentation/a", "CurrentClampStimulusSeries", command(0), "amperes", at=4.0, sweep=77)
    series(f, "stimulus/presentation/b", "CurrentClampStimulusSeries", command(1), "amperes", at=4.0, sweep=77)
    series(f, "acquisition/wrong_kind_10", "CurrentClampSeries", potential(2), "volts", at=5.0)
    series(f, "stimulus/presentation/wrong_kind_10", "VoltageClampStimulusSeries", potential(3), "volts", at=5.0)
    series(f, "acquisition/late_11", "CurrentClampSeries", potential(2), "volts", at=6.0)
    series(f, "stimulus/presentation/late_11", "CurrentClampStimulusSeries", command(3), "amperes", at=6.01)
    series(f, "acquisition/elsewhere_12", "CurrentClampSeries", potential(2), "volts", at=7.0)
    series(f, "stimulus/presentation/elsewhere_12", "CurrentClampStimulusSeries", command(3), "amperes", at=700.0)
    series(f, "acquisition/not_zero_13", "IZeroClampSeries", potential(2), "volts", at=8.0)
    series(f, "stimulus/presentation/not_zero_13", "CurrentClampStimulusSeries", command(3), "amperes", at=8.0)
    series(f, "acquisition/alone", "CurrentClampSeries", potential(2), "volts", at=9.0)

# HDF5, but no NWB.
with h5py.File(os.path.join(out, "other.nwb"), "w") as f:
    f["traces/vm"] = np.zeros((3, 100))
    f["fs"] = 20000.0
with start("no_sweeps.nwb") as f:
    series(f, "acquisition/pupil", "TimeSeries", potential(0), "mm")
