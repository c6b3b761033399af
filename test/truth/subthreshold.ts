/**
 * Cells for the subthreshold quantities: with an h-current, rectifying, behind a sharp electrode, two compartments,
 * disturbed by spikes, in few sweeps. Recorded and measured as the family of `current-clamp.ts`.
 */
import type { Model } from '../helpers/models.ts';
import { type Cell, cleanSweeps, conditions, passiveCell, trialsOf, twoCompartments, usual } from './current-clamp.ts';
import { meanOf, slopeOfLine } from './definitions.ts';
import { type Clean, fineHz } from './recorder.ts';
import { isWanted, type Trial, type TrialOptions } from './score.ts';

/** Where a current that only depends on the potential vanishes, by bisection. */
function restOf(current: (v: number) => number): number {
  let [low, high] = [-100, -40];
  for (let k = 0; k < 60; k++) {
    const middle = (low + high) / 2;
    if (current(middle) > 0) low = middle;
    else high = middle;
  }
  return (low + high) / 2;
}

/**
 * A cell with the h-current of thalamic relay neurons: half activation −75 mV, slope 5.5 mV, reversal −43 mV
 * (Huguenard & McCormick 1992, J Neurophysiol 68:1373–1383; constants from memory). Conductances over capacitance, 1/ms.
 */
function withH(leak: number, h: number): Model {
  const open = (v: number): number => 1 / (1 + Math.exp((v + 75) / 5.5));
  const tau_ms = (v: number): number => 1 / (Math.exp(-14.59 - 0.086 * v) + Math.exp(-1.87 + 0.0701 * v));
  const rest = restOf((v) => -leak * (v + 80) - h * open(v) * (v + 43));
  return {
    start: [rest, open(rest)],
    slope(state, current, into) {
      const [v, m] = state as [number, number];
      into[0] = current - leak * (v + 80) - h * m * (v + 43);
      into[1] = (open(v) - m) / tau_ms(v);
    },
  };
}

/**
 * A cell with an inward rectifier that follows the potential at once: conductance g/(1 + exp((V − E_K + 15)/10)),
 * E_K −90 mV (form: Hagiwara & Takahashi 1974, J Membr Biol 18:61–80; constants from memory).
 */
function rectifier(leak: number, inward: number): Model {
  const current = (v: number): number => -leak * (v + 65) - (inward / (1 + Math.exp((v + 75) / 10))) * (v + 90);
  return {
    start: [restOf(current)],
    slope(state, injected, into) {
      into[0] = injected + current(state[0]!);
    },
  };
}

/** Least running mean over the width of the definition, a fiftieth of the step but at most 10 ms. */
function extremeMean(mv: Float64Array, from_s: number, to_s: number, width_s: number, sign: 1 | -1): number {
  const step = 0.0005;
  let best = sign * Number.NEGATIVE_INFINITY;
  for (let at = from_s; at + width_s <= to_s + 1e-9; at += step) {
    const value = meanOf(mv, at, at + width_s, fineHz);
    if (sign * value > sign * best) best = value;
  }
  return best;
}

interface Deflections {
  base: number;
  steady: number;
  largest: number;
  rebound: number;
}

/** By the definitions in the registry, on the clean membrane. */
function deflectionsOf(clean: Clean, { onset_s, end_s, seconds }: Cell): Deflections {
  const length = end_s - onset_s;
  const width = Math.max(0.001, Math.min(0.01, length / 50));
  const base = meanOf(clean.membrane_mv, 0, onset_s, fineHz);
  return {
    base,
    steady: meanOf(clean.membrane_mv, end_s - 0.005 - Math.min(0.05, length / 10), end_s - 0.005, fineHz) - base,
    largest: extremeMean(clean.membrane_mv, onset_s + 0.001, end_s, width, -1) - base,
    rebound: extremeMean(clean.membrane_mv, end_s + 0.001, Math.min(end_s + 0.3, seconds), width, 1) - base,
  };
}

/** Truths by definition of a cell that may sag, rebound and rectify. */
function activeTruths(cell: Cell) {
  return (clean: readonly Clean[]): Record<string, number> => {
    const down = cell.steps.flatMap((pa, k) => (pa < 0 ? [{ pa, ...deflectionsOf(clean[k]!, cell) }] : []));
    const sagging = down.reduce((best, one) => (Math.abs(one.largest + 15) < Math.abs(best.largest + 15) ? one : best));
    const deepest = Math.min(...down.map((one) => one.steady));
    const small = down.filter((one) => one.steady > 0.5 * deepest);
    const large = down.filter((one) => one.steady <= 0.5 * deepest);
    const sum = (values: number[]): number => values.reduce((total, value) => total + value, 0);
    const inner = sum(small.map((one) => one.pa * one.steady)) / sum(small.map((one) => one.pa ** 2));
    const outer = slopeOfLine(
      large.map((one) => one.pa),
      large.map((one) => one.steady),
    );
    return {
      sag_fraction: (sagging.largest - sagging.steady) / sagging.largest,
      sag_mv: sagging.steady - sagging.largest,
      rebound_mv: sagging.rebound,
      ...(large.length >= 2 && small.length >= 1 ? { rectification_ratio: outer / inner } : {}),
    };
  };
}

/** Both time constants of two compartments, ms; the pipette's capacitance hangs on the soma. */
function twoConstants(tau_ms: number, share: number, coupling: number, capacitance_pf: number, pipette_pf: number) {
  const soma = share + pipette_pf / capacitance_pf;
  const [a, b] = [share / soma / tau_ms + coupling / soma, coupling / soma];
  const [c, d] = [coupling / (1 - share), 1 / tau_ms + coupling / (1 - share)];
  const root = Math.sqrt(((a - d) / 2) ** 2 + b * c);
  return { slow: 1 / ((a + d) / 2 - root), fast: 1 / ((a + d) / 2 + root) };
}

function dendritic(name: string, tau_ms: number, share: number, coupling: number): Cell {
  const constants = twoConstants(tau_ms, share, coupling, 200, 1);
  return {
    ...usual,
    name,
    model: twoCompartments(tau_ms, share, coupling),
    capacitance_pf: 200,
    electrode: { access_mohm: 12, pipette_pf: 1 },
    steps: [-70, -50, -35, -20],
    truths: () => ({
      membrane_time_constant_ms: constants.slow,
      slow_time_constant_ms: constants.slow,
      fast_time_constant_ms: constants.fast,
    }),
  };
}

/** A fresh list, so that nobody can change another's. */
export const cells = (): Cell[] => {
  const h: Cell = {
    ...usual,
    name: 'h-current',
    model: withH(0.04, 0.03),
    capacitance_pf: 180,
    electrode: { access_mohm: 10, pipette_pf: 1 },
    steps: [-180, -130, -90, -50],
    end_s: 1,
    seconds: 1.6,
  };
  const inward: Cell = {
    ...usual,
    name: 'inward rectifier',
    model: rectifier(0.03, 0.12),
    capacitance_pf: 120,
    electrode: { access_mohm: 13, pipette_pf: 1 },
    steps: [-250, -200, -150, -100, -50, -25],
    seconds: 0.95,
  };
  return [
    { ...h, truths: activeTruths(h) },
    { ...inward, truths: activeTruths(inward) },
    { ...passiveCell(60, 10, 90, 2.5), name: 'sharp electrode 90 MΩ' },
    { ...passiveCell(200, 25, 12, 1), name: 'two sweeps', steps: [-60, -30] },
    {
      ...passiveCell(120, 15, 10, 1),
      name: 'spikes before and after the step',
      disturbed_s: [0.04, 0.12, 0.63, 0.68],
      seconds: 0.75,
    },
    dendritic('dendrite, slow exchange', 30, 0.3, 0.06),
    dendritic('dendrite, 12 % fast', 22, 0.5, 0.25),
  ];
};

/** The subset of conditions that a test looks at. */
const quickConditions = ['20 kHz, filter 8 kHz', '20 kHz, filter 10 kHz', 'hum 0.5 mV', 'bridge 6 MΩ short'];

export function trials(options: TrialOptions): Trial[] {
  const all: Trial[] = [];
  for (const cell of cells()) {
    if (!isWanted(options, cell.name)) continue;
    const clean = cleanSweeps(cell);
    for (const under of conditions) {
      if (options.quick && !quickConditions.includes(under.name)) continue;
      for (let seed = 1; seed <= options.seeds; seed++) all.push(...trialsOf(cell, clean, under, seed));
    }
  }
  return all;
}

export const subjectNames = (): string[] => cells().map(({ name }) => name);
