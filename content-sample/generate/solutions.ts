/**
 * What the generator knows of the solutions in `archive/solutions/`: their ions after titration, and from them the
 * equilibrium and junction potentials that the simulated membranes obey. Counted by hand, apart from the tool's own
 * chemistry, so that the two can be held against each other.
 */

export interface Ion {
  mm: number;
  valence: number;
  /** Mobility relative to potassium, charge taken out: Ng & Barry 1995, J Neurosci Methods 56:37–41 (from memory). */
  mobility: number;
}

const ion =
  (valence: number, mobility: number) =>
  (mm: number): Ion => ({ mm, valence, mobility });
const K = ion(1, 1);
const Na = ion(1, 0.682);
const Cl = ion(-1, 1.0388);
const gluconate = ion(-1, 0.33);
const methanesulfonate = ion(-1, 0.664);
const aspartate = ion(-1, 0.3);
const glutamate = ion(-1, 0.26);
const HCO3 = ion(-1, 0.605);
const Ca = ion(2, 0.4047);
const Mg = ion(2, 0.361);
const HEPES = ion(-1, 0.3);
const HPO4 = ion(-2, 0.39);
/** EGTA, ATP, GTP and phosphocreatine as anions of charge −2. */
const chelator = ion(-2, 0.24);

/**
 * Ions in mM. Potassium holds what the KOH of the titration brings: about 0.4 a HEPES and 2 an EGTA at pH 7.3, and
 * about 2.2 a Mg-ATP, which is sold as the acid.
 */
export const solutions: Record<string, Record<string, Ion>> = {
  'k-gluconate': {
    K: K(125 + 5 + 4 + 1 + 8.8),
    Na: Na(6 + 8 + 0.9),
    Cl: Cl(5 + 6),
    gluconate: gluconate(125),
    HEPES: HEPES(4),
    chelator: chelator(8),
    Mg: Mg(0.6),
  },
  'k-methanesulfonate': {
    K: K(120 + 10 + 4 + 0.4 + 8.8),
    Na: Na(10 + 0.9),
    Cl: Cl(10),
    methanesulfonate: methanesulfonate(120),
    HEPES: HEPES(4),
    chelator: chelator(9),
    Mg: Mg(0.6),
  },
  'k-aspartate': {
    K: K(110 + 20 + 4 + 17),
    Na: Na(10 + 6),
    Cl: Cl(20 + 10 + 8),
    aspartate: aspartate(110),
    HEPES: HEPES(4),
    chelator: chelator(8),
    Mg: Mg(1.2),
  },
  'axon-perfusate': {
    K: K(220 + 4),
    Na: Na(50),
    glutamate: glutamate(220),
    Cl: Cl(50),
    HEPES: HEPES(4),
  },
  acsf: {
    Na: Na(125 + 1.25 + 25),
    K: K(2.5),
    Cl: Cl(125 + 2.5 + 4 + 2),
    HCO3: HCO3(25),
    HPO4: HPO4(0.9),
    Ca: Ca(2),
    Mg: Mg(1),
  },
  tyrode: { Na: Na(142), K: K(5.4), Cl: Cl(140 + 5.4 + 3.6 + 2), HEPES: HEPES(2), Ca: Ca(1.8), Mg: Mg(1) },
  'tyrode-k10': { Na: Na(142), K: K(10), Cl: Cl(140 + 10 + 3.6 + 2), HEPES: HEPES(2), Ca: Ca(1.8), Mg: Mg(1) },
  'sea-water': { Na: Na(435), K: K(10), Cl: Cl(560), HEPES: HEPES(5), Ca: Ca(10), Mg: Mg(50) },
};
for (const [drugged, plain] of [
  ['acsf-ttx', 'acsf'],
  ['acsf-4ap', 'acsf'],
  ['tyrode-nifedipine', 'tyrode'],
  ['sea-water-ttx', 'sea-water'],
] as const)
  solutions[drugged] = solutions[plain]!;

const solution = (id: string): Record<string, Ion> => {
  const found = solutions[id];
  if (!found) throw new RangeError(`no solution "${id}" in the sample`);
  return found;
};

/** RT/F in mV; R and F are exact in the SI of 2019. */
export const thermalMv = (celsius: number): number => (1000 * 8.31446261815324 * (273.15 + celsius)) / 96485.33212331;

/** Nernst potential of sodium or potassium between two of the sample's solutions, mV. */
export function equilibriumMv(name: 'Na' | 'K', bath: string, pipette: string, celsius: number): number {
  return thermalMv(celsius) * Math.log(solution(bath)[name]!.mm / solution(pipette)[name]!.mm);
}

/**
 * Junction potential, bath minus pipette, mV.
 * @see Barry & Lynch 1991, J Membr Biol 121:101–117 (generalized Henderson equation; from memory)
 */
export function junctionMv(bath: string, pipette: string, celsius: number): number {
  const outside = solution(bath);
  const inside = solution(pipette);
  let difference = 0;
  let weighted = 0;
  let sumOutside = 0;
  let sumInside = 0;
  for (const name of new Set([...Object.keys(outside), ...Object.keys(inside)])) {
    const { valence, mobility } = (outside[name] ?? inside[name])!;
    const out = outside[name]?.mm ?? 0;
    const into = inside[name]?.mm ?? 0;
    difference += valence * mobility * (out - into);
    weighted += valence * valence * mobility * (out - into);
    sumOutside += valence * valence * mobility * out;
    sumInside += valence * valence * mobility * into;
  }
  return thermalMv(celsius) * (difference / weighted) * Math.log(sumInside / sumOutside);
}
