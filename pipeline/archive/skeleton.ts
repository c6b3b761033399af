/** A new archive to fill: every file the tool knows, each with its explanation, and nothing invented about data. */
import { existsSync, mkdirSync, readdirSync, statSync, writeFileSync } from 'node:fs';
import path from 'node:path';
import { factKeys, shippedClasses } from './fact-keys.ts';

const wrap = (words: readonly string[], indent: string): string => {
  const lines = [''];
  for (const [index, word] of words.entries()) {
    const piece = index < words.length - 1 ? `${word}, ` : word;
    if (`${indent}${lines.at(-1)}${piece}`.length > 110) lines.push('');
    lines[lines.length - 1] += piece;
  }
  return lines.map((line) => `${indent}${line.trimEnd()}`).join('\n');
};

const almanac = `# What holds for the whole archive. Every line may be changed or removed; only the recordings are needed.
title: Our recordings
lab: Cell physiology
timezone: UTC                    # such as Europe/Lisbon
mains_hz: 50                     # 50 or 60

# Short codes stand in the facts below; the long names are shown on pages.
rigs:
  a: "Rig A"
people:
  k: "K., bench 1"

# Cell classes. 'like' takes the expected ranges of a class that comes with the tool:
${wrap(shippedClasses, '#   ')}
classes:
  deep-pyramidal: { label: Layer 5 pyramidal neuron, like: cortical-pyramidal }

# The lab's own limits: any quantity by its id, with below, above or between: [low, high].
limits:
  # access_resistance_mohm: { below: 25 }

# Facts for everything that follows, until something nearer says otherwise. Uncomment what is true of your recordings:
# a wrong fact is worse than a missing one, which is simply "not measured".
defaults:
  audience: private              # private | public
  # temperature_c: 33
  # bath: acsf                   # solutions/acsf.yaml
  # pipette: k-gluconate         # solutions/k-gluconate.yaml
  # configuration: whole-cell    # whole-cell | perforated | sharp | loose | other
  # junction: uncorrected        # corrected | uncorrected | unstated
`;

const bath = `# A recipe: salts and buffers in mM, as weighed. The file's name is the name that facts use.
name: Artificial cerebrospinal fluid
role: bath                       # pipette | bath
ph: 7.4
gas: carbogen                    # none | carbogen
osmolality_mosm: 305
millimolar: { NaCl: 125, KCl: 2.5, NaHCO3: 25, NaH2PO4: 1.25, CaCl2: 2, MgCl2: 1, glucose: 20 }
`;

const pipette = `name: K-gluconate pipette solution
role: pipette
ph: 7.3
titrant: KOH                     # the base or acid that brought it to pH: its ion counts
gas: none
osmolality_mosm: 290
millimolar: { K-gluconate: 130, KCl: 4, NaCl: 4, HEPES: 10, EGTA: 0.3, Mg-ATP: 4, Na3-GTP: 0.3 }
`;

const folder = `# Put recordings into this folder (.nwb, .csv, .tsv, .txt, .dat, .asc, .tab); name and depth of folders are free.
# This file speaks for every recording in this folder and below. For one file alone, write NAME.EXT.yaml beside it,
# such as s1c1.nwb.yaml. Files become one cell by an equal "cell" fact.
facts:
  # date: 2026-01-15
  # rig: a
  # person: k
  # class: deep-pyramidal
  # spike_ion: sodium            # sodium | calcium | mixed

# All keys that facts may have:
${wrap(
  factKeys.map((entry) => entry.key),
  '#   ',
)}

# What changed during the recording, from a sweep or a clock time on; in a sidecar, without either, for the whole file.
# conditions:
#   - { from_sweep: 20, label: TTX, bath: acsf-ttx }
#   - { from_time: 14:35, label: wash }

# How to read text files that do not say so themselves; all of it may stand in a sidecar instead.
# table:
#   sweeps: columns                # columns | rows | one
#   time:    { column: 1, unit: s }           # or, without a time column,  rate_hz: 20000
#   voltage: { columns: [2, 3, 4], unit: mV }
#   stimulus: { kind: step, start_s: 0.2, end_s: 0.7, from_pa: -100, by_pa: 50 }
#   clamp: current
# In voltage clamp without a recorded command:  clamp: voltage  and as the stimulus the command that was given,
#   { kind: levels, at_s: [0, 0.1, 0.15], mv: [-70, -65, -70] }

# A file or folder that holds no recording:
# other: "calibration pulses into the bath"

# Several cells in one file, in its sidecar only:
# cells:
#   electrode_0: { cell: s1c1 }
#   electrode_1: { cell: s1c2, class: fast-spiking-interneuron }
`;

const decisions = `# A person's word beside the automatic standing: include, exclude or apply (an explanation the tool offered).
# - { cell: 2026-01-15-s1c1, decision: exclude, by: k, date: 2026-01-20, why: "slice from the wrong plane" }
`;

const events = `# Dated events that charts over time shall show: a new pump, a new batch, a rig that moved.
# - { date: 2026-02-02, text: "New perfusion pump", rig: a, kind: pump }
`;

const criteria = `# One set of limits for one reuse of the data. 'missing' says what becomes of a cell without the number:
# keep, drop, or list (neither: it is listed for a person to decide).
title: Spike shape near body temperature
select:
  class: [deep-pyramidal]
  temperature_c: { between: [31, 36] }
  condition: [baseline]
require:
  standing:               { not: [unsound, unread] }
  access_resistance_mohm: { below: 20, missing: list }
  noise_rms_mv:           { below: 0.2, missing: drop }
`;

const note = `---
title: How this archive is kept
date: 2026-01-12
---

Meeting and bench notes are Markdown files in this folder. They appear on the site and can be searched.
`;

const contents: Readonly<Record<string, string>> = {
  'almanac.yaml': almanac,
  'solutions/acsf.yaml': bath,
  'solutions/k-gluconate.yaml': pipette,
  'recordings/2026-01-15/folder.yaml': folder,
  'decisions.yaml': decisions,
  'events.yaml': events,
  'criteria/spike-shape.yaml': criteria,
  'notes/2026-01-12-start.md': note,
};

/**
 * Writes a commented archive that reads back without a problem.
 *
 * @param dir a folder that does not exist yet or is empty
 * @returns the paths written, relative to `dir`, with forward slashes
 * @throws Error with a sentence for people when `dir` is a file, holds anything, or cannot be written
 */
export function writeSkeleton(dir: string): string[] {
  if (existsSync(dir)) {
    if (!statSync(dir).isDirectory()) throw new Error(`${dir} is a file. Name a folder that does not exist yet.`);
    const names = readdirSync(dir);
    if (names.length > 0)
      throw new Error(
        `${dir} is not empty (it holds ${names.sort()[0]}). Nothing was written. Name a folder that is empty or does not exist yet.`,
      );
  }
  try {
    for (const [below, text] of Object.entries(contents)) {
      const file = path.join(dir, below);
      mkdirSync(path.dirname(file), { recursive: true });
      writeFileSync(file, text, { flag: 'wx' });
    }
  } catch (error) {
    throw new Error(
      `The archive could not be written to ${dir} (${(error as Error).message}). Check the path and its permissions.`,
    );
  }
  return Object.keys(contents);
}
