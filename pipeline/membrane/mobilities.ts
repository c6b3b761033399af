/**
 * Mobilities of ions in water relative to potassium, 25 °C, limiting: u = λ/(|z|·73.48), λ the equivalent
 * conductivity. One table serves every temperature and concentration; what that costs is `transfer`.
 */

export interface Mobility {
  /** Relative to potassium. */
  relative: number;
  /** 95 % half-width as a share of the value. */
  uncertainty: number;
  /** Where the number comes from; 'assumed' where nobody has measured it. */
  source: string;
  assumed: boolean;
}

const handbook = 'equivalent conductivity, CRC Handbook of Chemistry and Physics 86th/87th ed., Vanysek, 5-9x';
const handbookRemembered = `${handbook} (from memory)`;
const barry = 'Ng & Barry 1995, J Neurosci Methods 56:37–41 (from memory)';
const potassium = 73.48;

/**
 * How much a ratio of mobilities moves, as a share, from infinite dilution at 25 °C to a physiological solution at the
 * bath's temperature. Sodium against potassium: 50.08/73.48 = 0.682 in the limit, 0.651 in 0.1 M chlorides (Λ 106.74 and
 * 128.96, transport numbers 0.3854 and 0.4898; Robinson & Stokes 1959, from memory), 4.5 % less.
 */
const transfer = 0.045;

const conductivity = (equivalent: number, valence: number, source: string, own: number): Mobility => ({
  relative: equivalent / (Math.abs(valence) * potassium),
  uncertainty: Math.hypot(own, transfer),
  source,
  assumed: false,
});
const found = (equivalent: number, valence = 1): Mobility => conductivity(equivalent, valence, handbook, 0.01);
const remembered = (equivalent: number, valence = 1): Mobility =>
  conductivity(equivalent, valence, handbookRemembered, 0.03);
const relative = (value: number): Mobility => ({
  relative: value,
  uncertainty: Math.hypot(0.1, transfer),
  source: barry,
  assumed: false,
});
const assumed = (value: number, uncertainty: number, why: string): Mobility => ({
  relative: value,
  uncertainty,
  source: `assumed: ${why}`,
  assumed: true,
});

const chelate = 'like EGTA; no measured value known';
const nucleotide = 'no measured value known; common practice is about 0.2';

const table: Record<string, Mobility> = {
  K: found(73.48),
  Cs: found(77.2),
  Li: found(38.66),
  NH4: found(73.5),
  H: found(349.65),
  Ca: found(59.47, 2),
  Mg: found(53.0, 2),
  Ba: found(63.6, 2),
  Co: found(55.0, 2),
  Mn: found(53.5, 2),
  Cd: found(54.0, 2),
  La: found(69.7, 3),
  Gd: found(67.3, 3),
  Na: remembered(50.08),
  Cl: remembered(76.31),
  Br: remembered(78.1),
  F: remembered(55.4),
  I: remembered(76.8),
  NO3: remembered(71.42),
  HCO3: remembered(44.5),
  SO4: remembered(80.0, 2),
  H2PO4: remembered(33.0),
  HPO4: remembered(57.0, 2),
  OH: remembered(198.0),
  acetate: remembered(40.9),
  ClO4: remembered(67.3),
  TEA: remembered(32.6),
  TMA: remembered(44.9),
  methanesulfonate: remembered(48.8),
  lactate: remembered(38.8),
  'citrate3-': remembered(70.2, 3),
  'succinate2-': remembered(58.8, 2),
  Rb: remembered(77.8),
  Sr: remembered(59.4, 2),
  Ni: remembered(50.0, 2),
  Zn: remembered(52.8, 2),
  choline: relative(0.51),
  NMDG: relative(0.33),
  Tris: relative(0.4),
  gluconate: relative(0.33),
  aspartate: relative(0.3),
  glutamate: relative(0.26),
  HEPES: relative(0.3),
  isethionate: relative(0.52),
  MES: relative(0.37),
  MOPS: relative(0.35),
  'EGTA2-': relative(0.24),
  'EGTA3-': relative(0.25),
  SCN: relative(0.9),
  propionate: relative(0.487),
  butyrate: relative(0.44),
  benzoate: relative(0.441),
  methylsulfate: assumed(0.66, 0.15, 'like methanesulfonate'),
  'EGTA4-': assumed(0.25, 0.3, chelate),
  'CaEGTA2-': assumed(0.24, 0.3, chelate),
  'MgEGTA2-': assumed(0.24, 0.3, chelate),
  'ATP4-': assumed(0.2, 0.5, nucleotide),
  'HATP3-': assumed(0.2, 0.5, nucleotide),
  'MgATP2-': assumed(0.2, 0.5, nucleotide),
  'phosphocreatine2-': assumed(0.25, 0.5, 'no measured value known'),
  'CaATP2-': assumed(0.2, 0.5, nucleotide),
  'PIPES-': assumed(0.3, 0.4, 'like HEPES'),
  'PIPES2-': assumed(0.3, 0.4, 'like HEPES'),
  TES: assumed(0.3, 0.4, 'like HEPES'),
  BES: assumed(0.3, 0.4, 'like HEPES'),
};

/**
 * Mobility of one ion relative to potassium.
 * @param ion name as `dissolve` writes it: 'K', 'gluconate', 'EGTA2-'
 * @param valence signed charge number; decides the assumption where the ion is not tabulated
 */
export function mobilityOf(ion: string, valence: number): Mobility {
  const known = table[ion];
  if (known) return known;
  return Math.abs(valence) === 1
    ? assumed(0.4, 0.5, 'an organic ion of one charge; no measured value known')
    : assumed(0.22, 0.5, 'a large ion of several charges; no measured value known');
}

/** Ions with a tabulated mobility. */
export const tabulatedIons: readonly string[] = Object.freeze(
  Object.keys(table)
    .filter((ion) => !table[ion]!.assumed)
    .sort(),
);
