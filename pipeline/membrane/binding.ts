/** Which forms buffers take at a pH, and how much calcium and magnesium they hold. */
import { daviesTerm } from './activity.ts';
import { type Buffer, buffers, chargeText, type Metal } from './buffers.ts';

export interface Species {
  ion: string;
  valence: number;
  millimolar: number;
}

interface Ligand {
  name: string;
  buffer: Buffer;
  total: number;
  /** Weight of each form at this pH, the fully deprotonated one being 1. */
  weights: number[];
  weightSum: number;
  /** Weight per mmol/L of free metal of the bare and the protonated complex. */
  complexes: Record<Metal, { bare: number; protonated: number }>;
  /** Both complexes together. */
  affinity: Record<Metal, number>;
}

/** What the constants are read at. */
export interface Surroundings {
  ph: number;
  celsius: number;
  /** Ionic strength, mol/L. */
  strength: number;
  /** Added to every log₁₀ of an association constant with one metal: to see what their uncertainty does. */
  shifted?: { metal: Metal; by: number };
}

/**
 * Constants of one buffer, moved to the solution's temperature and ionic strength. A constant changes by the Davies
 * term times the change of the sum of squared charges: 2z − 1 for a proton leaving a form of charge z (the pH is an
 * activity and stays as it is), 4z for a divalent metal joining a form of charge z.
 */
function ligandAt(name: string, total: number, around: Surroundings): Ligand {
  const buffer = buffers[name]!;
  const warmer = around.celsius - buffer.celsius;
  const stronger = daviesTerm(around.strength, around.celsius) - daviesTerm(buffer.strength, around.celsius);
  const weights = [1];
  for (let step = buffer.pka.length - 1; step >= 0; step--) {
    const pka = buffer.pka[step]! + buffer.perKelvin[step]! * warmer + (2 * buffer.forms[step]!.valence - 1) * stronger;
    weights.unshift(weights[0]! * 10 ** (pka - around.ph));
  }
  const bare = buffer.forms.at(-1)!.valence;
  const complex = (metal: Metal): { bare: number; protonated: number } => {
    const constants = buffer.binds?.[metal];
    if (!constants) return { bare: 0, protonated: 0 };
    const moved = (constants.perKelvin ?? 0) * warmer + (around.shifted?.metal === metal ? around.shifted.by : 0) - 3;
    return {
      bare: 10 ** (constants.bare + 4 * bare * stronger + moved),
      protonated:
        constants.protonated === undefined
          ? 0
          : weights.at(-2)! * 10 ** (constants.protonated + 4 * (bare + 1) * stronger + moved),
    };
  };
  const complexes = { Ca: complex('Ca'), Mg: complex('Mg') };
  return {
    name,
    buffer,
    total,
    weights,
    weightSum: weights.reduce((sum, weight) => sum + weight, 0),
    complexes,
    affinity: {
      Ca: complexes.Ca.bare + complexes.Ca.protonated,
      Mg: complexes.Mg.bare + complexes.Mg.protonated,
    },
  };
}

const bareForm = (ligand: Ligand, calcium: number, magnesium: number): number =>
  ligand.total / (ligand.weightSum + calcium * ligand.affinity.Ca + magnesium * ligand.affinity.Mg);

/**
 * Free concentration at which free plus bound comes to the total. In logarithms, since free calcium beside a chelator
 * may be a millionth of the total; there free plus bound rises with free, by a slope between 0 and 1, so that false
 * position with the kept end's weight halved (Illinois; Dowell & Jarratt 1971, from memory) takes some ten steps.
 */
function solveFree(total: number, boundPerFree: (free: number) => number): number {
  if (total === 0) return 0;
  const wanted = Math.log(total);
  const excess = (log: number): number => log + Math.log1p(boundPerFree(Math.exp(log))) - wanted;
  let high = wanted;
  let low = wanted - 40;
  let above = excess(high);
  let below = excess(low);
  if (above <= 0) return total;
  let kept: 'low' | 'high' | null = null;
  for (let round = 0; round < 100 && high - low > 1e-13; round++) {
    const next = high - (above * (high - low)) / (above - below);
    const value = excess(next);
    if (Math.abs(value) < 1e-14) return Math.exp(next);
    if (value > 0) {
      high = next;
      above = value;
      if (kept === 'low') below /= 2;
      kept = 'low';
    } else {
      low = next;
      below = value;
      if (kept === 'high') above /= 2;
      kept = 'high';
    }
  }
  return Math.exp((low + high) / 2);
}

/**
 * All forms of the buffers in a solution at one pH, with calcium and magnesium shared out between them.
 * @param totals buffer name → mmol/L
 * @param calcium total calcium, mmol/L @param magnesium total magnesium, mmol/L
 * @returns every form above 0, and free calcium and magnesium, mmol/L
 */
export function speciate(
  totals: ReadonlyMap<string, number>,
  calcium: number,
  magnesium: number,
  around: Surroundings,
): { species: Species[]; freeCalcium: number; freeMagnesium: number } {
  const ligands = [...totals].map(([name, total]) => ligandAt(name, total, around));
  const binding = ligands.filter((ligand) => ligand.buffer.binds);
  const boundTo = (metal: Metal, freeCalcium: number, freeMagnesium: number): number =>
    binding.reduce((sum, ligand) => sum + ligand.affinity[metal] * bareForm(ligand, freeCalcium, freeMagnesium), 0);
  const magnesiumBeside = (freeCalcium: number): number =>
    solveFree(magnesium, (free) => boundTo('Mg', freeCalcium, free));
  const freeCalcium =
    binding.length === 0 ? calcium : solveFree(calcium, (free) => boundTo('Ca', free, magnesiumBeside(free)));
  const freeMagnesium = binding.length === 0 ? magnesium : magnesiumBeside(freeCalcium);

  const species: Species[] = [];
  for (const ligand of ligands) {
    const bare = bareForm(ligand, freeCalcium, freeMagnesium);
    ligand.buffer.forms.forEach((form, index) => {
      species.push({ ...form, millimolar: bare * ligand.weights[index]! });
    });
    const last = ligand.buffer.forms.at(-1)!;
    for (const [metal, free] of [
      ['Ca', freeCalcium],
      ['Mg', freeMagnesium],
    ] as const) {
      const { bare: strong, protonated } = ligand.complexes[metal];
      for (const [amount, valence, name] of [
        [bare * strong * free, last.valence + 2, `${metal}${ligand.name}`],
        [bare * protonated * free, last.valence + 3, `${metal}H${ligand.name}`],
      ] as const) {
        if (amount === 0) continue;
        species.push({ ion: `${name}${chargeText(valence)}`, valence, millimolar: amount });
      }
    }
  }
  return { species, freeCalcium, freeMagnesium };
}
