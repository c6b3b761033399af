/**
 * Weak acids and bases of physiological solutions: their forms from the most to the least protonated, their acid
 * constants with the ionic strength they hold at and their change per kelvin, and what they bind. `binding.ts` moves
 * them to the solution's own temperature and ionic strength.
 */

export interface Form {
  ion: string;
  valence: number;
}

export type Metal = 'Ca' | 'Mg';

export interface Buffer {
  forms: readonly Form[];
  /** One for each step from a form to the next, at `celsius`. */
  pka: readonly number[];
  celsius: number;
  /** Change of each pKa per kelvin. */
  perKelvin: readonly number[];
  /** Ionic strength at which all these constants hold, mol/L; 0 for thermodynamic ones. */
  strength: number;
  /** log10 of the association constants (1/M) with the fully deprotonated form, and with one proton on it. */
  binds?: Partial<Record<Metal, { bare: number; protonated?: number; perKelvin?: number }>>;
  source: string;
}

const vega = 'Vega & Bates 1976, Anal Chem 48:1293–1296 (pK at 25 °C, found)';
const goldberg = 'Goldberg, Kishore & Lennen 2002, J Phys Chem Ref Data 31:231–370 (from memory)';
/** dpK/dT = −ΔH/(ln 10·R·T²) at 25 °C for an enthalpy of ionization in kJ/mol. */
const perKelvin = (enthalpy: number): number => -(enthalpy * 1000) / (Math.LN10 * 8.314462618 * 298.15 ** 2);
const alberty =
  'Alberty 2003, Thermodynamics of Biochemical Reactions, table 1.2, moved to 0.15 M ionic strength by its Debye–Hückel rule';
const martell = 'Martell & Smith, Critical Stability Constants, 0.1 M (from memory)';
const usual = 'apparent constant near 0.15 M ionic strength (from memory)';

/** '2-', '3+', '-' for a single one, '0' for none. */
export const chargeText = (valence: number): string =>
  valence === 0 ? '0' : `${Math.abs(valence) === 1 ? '' : Math.abs(valence)}${valence > 0 ? '+' : '-'}`;

/** Forms of a buffer whose names carry their charge: chain('EGTA', 0, 5) is EGTA0, EGTA-, … EGTA4-. */
const chain = (name: string, top: number, count: number): Form[] =>
  Array.from({ length: count }, (_, step) => {
    const valence = top - step;
    return { ion: `${name}${chargeText(valence)}`, valence };
  });
/** A zwitterion that loses its one proton near neutrality: pK at 25 °C without ionic strength, enthalpy in kJ/mol. */
const zwitterion = (name: string, pk: number, enthalpy: number, source: string): Buffer => ({
  forms: [
    { ion: `${name} (uncharged)`, valence: 0 },
    { ion: name, valence: -1 },
  ],
  pka: [pk],
  celsius: 25,
  perKelvin: [perKelvin(enthalpy)],
  strength: 0,
  source,
});
const base = (name: string, pka: number, slope: number, strength: number, source: string): Buffer => ({
  forms: [
    { ion: name, valence: 1 },
    { ion: `${name} (uncharged)`, valence: 0 },
  ],
  pka: [pka],
  celsius: 25,
  perKelvin: [slope],
  strength,
  source,
});
const triphosphate = (name: string): Buffer => ({
  forms: [
    { ion: `H2${name}2-`, valence: -2 },
    { ion: `H${name}3-`, valence: -3 },
    { ion: `${name}4-`, valence: -4 },
  ],
  pka: [3.95, 6.5],
  celsius: 25,
  perKelvin: [0, 0],
  strength: 0.15,
  binds: { Mg: { bare: 4.1, protonated: 2.2 }, Ca: { bare: 3.8, protonated: 2.0 } },
  source: `${alberty}, MgATP and HATP lowered by 0.1 for the potassium they compete with (from memory)`,
});
const diphosphate = (name: string): Buffer => ({
  forms: [
    { ion: `H2${name}-`, valence: -1 },
    { ion: `H${name}2-`, valence: -2 },
    { ion: `${name}3-`, valence: -3 },
  ],
  pka: [3.89, 6.4],
  celsius: 25,
  perKelvin: [0, 0],
  strength: 0.15,
  binds: { Mg: { bare: 3.1, protonated: 1.5 }, Ca: { bare: 2.8, protonated: 1.5 } },
  source: alberty,
});

export const buffers: Readonly<Record<string, Buffer>> = {
  HEPES: zwitterion('HEPES', 7.565, 20.4, `${vega}; enthalpy ${goldberg}, 20.8 found in Thermochim Acta 2006, 447:112`),
  MES: zwitterion('MES', 6.27, 14.8, `${vega}; enthalpy ${goldberg}`),
  MOPS: zwitterion('MOPS', 7.184, 21.1, goldberg),
  TES: zwitterion('TES', 7.55, 32.1, `${vega}; enthalpy ${goldberg}`),
  BES: zwitterion('BES', 7.187, 24.2, `${vega}; enthalpy ${goldberg}`),
  PIPES: {
    forms: [
      { ion: 'PIPES-', valence: -1 },
      { ion: 'PIPES2-', valence: -2 },
    ],
    pka: [7.141],
    celsius: 25,
    perKelvin: [perKelvin(11.2)],
    strength: 0,
    source: goldberg,
  },
  Tris: base('Tris', 8.072, perKelvin(47.45), 0, goldberg),
  NMDG: base('NMDG', 9.6, -0.03, 0.15, usual),
  '4-aminopyridine': base('4-aminopyridine', 9.17, -0.028, 0.15, usual),
  phosphate: {
    forms: [
      { ion: 'H2PO4', valence: -1 },
      { ion: 'HPO4', valence: -2 },
    ],
    pka: [6.73],
    celsius: 25,
    perKelvin: [-0.0028],
    strength: 0.15,
    source: alberty,
  },
  EGTA: {
    forms: chain('EGTA', 0, 5),
    // Concentration constants plus 0.11 each: a pH electrode reads activity.
    pka: [2.11, 2.76, 8.96, 9.58],
    celsius: 20,
    perKelvin: [0, 0, -0.0148, -0.0148],
    strength: 0.1,
    binds: { Ca: { bare: 10.97, protonated: 5.3, perKelvin: -0.02 }, Mg: { bare: 5.21, protonated: 3.4 } },
    source: `${martell}; electrode correction and heats after Tsien & Pozzan 1989, Methods Enzymol 172:230–262 (from memory)`,
  },
  BAPTA: {
    forms: chain('BAPTA', -2, 3),
    pka: [5.47, 6.36],
    celsius: 22,
    perKelvin: [0, 0],
    strength: 0.1,
    binds: { Ca: { bare: 6.97 }, Mg: { bare: 1.77 } },
    source: 'Tsien 1980, Biochemistry 19:2396–2404 (from memory)',
  },
  EDTA: {
    forms: chain('EDTA', 0, 5),
    pka: [2.0, 2.68, 6.16, 10.26],
    celsius: 20,
    perKelvin: [0, 0, 0, -0.012],
    strength: 0.1,
    binds: { Ca: { bare: 10.7, protonated: 3.5 }, Mg: { bare: 8.7, protonated: 2.3 } },
    source: martell,
  },
  citrate: {
    forms: chain('citrate', 0, 4),
    pka: [2.9, 4.35, 5.7],
    celsius: 25,
    perKelvin: [0, 0, 0],
    strength: 0.1,
    binds: { Ca: { bare: 3.5, protonated: 2.1 }, Mg: { bare: 3.4, protonated: 1.8 } },
    source: martell,
  },
  ATP: triphosphate('ATP'),
  GTP: triphosphate('GTP'),
  ADP: diphosphate('ADP'),
  GDP: diphosphate('GDP'),
  phosphocreatine: {
    forms: [
      { ion: 'phosphocreatine-', valence: -1 },
      { ion: 'phosphocreatine2-', valence: -2 },
    ],
    pka: [4.6],
    celsius: 25,
    perKelvin: [0],
    strength: 0.15,
    binds: { Mg: { bare: 1.3 }, Ca: { bare: 1.15 } },
    source: usual,
  },
  spermine: {
    forms: chain('spermine', 4, 5),
    pka: [8.0, 8.9, 10.1, 10.9],
    celsius: 25,
    perKelvin: [-0.025, -0.025, -0.025, -0.025],
    strength: 0.15,
    source: usual,
  },
  succinate: {
    forms: chain('succinate', 0, 3),
    pka: [4.0, 5.3],
    celsius: 25,
    perKelvin: [0, 0],
    strength: 0.15,
    source: usual,
  },
  malate: {
    forms: chain('malate', 0, 3),
    pka: [3.3, 4.7],
    celsius: 25,
    perKelvin: [0, 0],
    strength: 0.15,
    source: usual,
  },
};

/** Ions whose charge does not change between pH 5 and 9, by name. */
export const fixedIons: Readonly<Record<string, number>> = {
  Na: 1,
  K: 1,
  Li: 1,
  Rb: 1,
  Cs: 1,
  NH4: 1,
  TEA: 1,
  TMA: 1,
  choline: 1,
  'QX-314': 1,
  Mg: 2,
  Ca: 2,
  Ba: 2,
  Sr: 2,
  Co: 2,
  Cd: 2,
  Mn: 2,
  Ni: 2,
  Zn: 2,
  Gd: 3,
  La: 3,
  Cl: -1,
  Br: -1,
  F: -1,
  I: -1,
  NO3: -1,
  ClO4: -1,
  SCN: -1,
  SO4: -2,
  HCO3: -1,
  gluconate: -1,
  methanesulfonate: -1,
  methylsulfate: -1,
  aspartate: -1,
  glutamate: -1,
  acetate: -1,
  propionate: -1,
  butyrate: -1,
  benzoate: -1,
  isethionate: -1,
  lactate: -1,
  pyruvate: -1,
  ascorbate: -1,
  kynurenate: -1,
};
