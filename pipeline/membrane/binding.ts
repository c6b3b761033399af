/** Which forms buffers take at a pH, and how much calcium and magnesium they hold. */
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

function ligandAt(name: string, total: number, ph: number, celsius: number): Ligand {
  const buffer = buffers[name]!;
  const shift = celsius - buffer.celsius;
  const weights = [1];
  for (let step = buffer.pka.length - 1; step >= 0; step--)
    weights.unshift(weights[0]! * 10 ** (buffer.pka[step]! + buffer.perKelvin[step]! * shift - ph));
  const complex = (metal: Metal): { bare: number; protonated: number } => {
    const constants = buffer.binds?.[metal];
    if (!constants) return { bare: 0, protonated: 0 };
    const moved = (constants.perKelvin ?? 0) * shift;
    return {
      bare: 10 ** (constants.bare + moved - 3),
      protonated: constants.protonated === undefined ? 0 : weights.at(-2)! * 10 ** (constants.protonated + moved - 3),
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

/** Free concentration at which free plus bound comes to the total; bound grows with free, so halving finds it. */
function solveFree(total: number, boundPerFree: (free: number) => number): number {
  if (total === 0) return 0;
  // In logarithms: free calcium beside a chelator may be a millionth of the total. 46 halvings of 40 leave 6e-13.
  let low = Math.log(total) - 40;
  let high = Math.log(total);
  for (let round = 0; round < 46; round++) {
    const middle = (low + high) / 2;
    const free = Math.exp(middle);
    if (free * (1 + boundPerFree(free)) > total) high = middle;
    else low = middle;
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
  ph: number,
  celsius: number,
): { species: Species[]; freeCalcium: number; freeMagnesium: number } {
  const ligands = [...totals].map(([name, total]) => ligandAt(name, total, ph, celsius));
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
