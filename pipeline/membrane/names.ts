/** Reads what laboratories write for a salt, a buffer or a sugar: 'K-gluconate', 'CaCl2·2H2O', 'Na3-GTP', 'HEPES-NaOH'. */
import { buffers, fixedIons } from './buffers.ts';

/** What one mole of a named substance brings into a solution. */
export interface Substance {
  /** Moles of each fixed ion or buffer per mole; empty for an uncharged substance. */
  parts: ReadonlyMap<string, number>;
  /** 'HEPES-NaOH', 'Tris-HCl': a buffer brought to its pH with this ion; the ion's amount follows from the pH. */
  titratedWith: string | null;
  /** A salt whose number of cations the name leaves open ('Na-GTP'): counted once, though up to `most` are sold. */
  openCation: { ion: string; most: number } | null;
  /** An ion or acid without its counter-ion ('ATP', 'TEA'). */
  lonely: boolean;
  /** Counts were completed so that the charges cancel ('Ca-gluconate', 'calcium chloride'). */
  completed: boolean;
}

interface Token {
  text: string;
  /** Symbols keep their case ('Co' is not 'CO'), words do not. */
  symbol: boolean;
  means: string | { cationCount: number } | 'proton' | 'hydroxide';
}

const symbols: Record<string, string[]> = {
  Na: ['Na'],
  K: ['K'],
  Li: ['Li'],
  Rb: ['Rb'],
  Cs: ['Cs'],
  NH4: ['NH4'],
  Mg: ['Mg'],
  Ca: ['Ca'],
  Ba: ['Ba'],
  Sr: ['Sr'],
  Co: ['Co'],
  Cd: ['Cd'],
  Mn: ['Mn'],
  Ni: ['Ni'],
  Zn: ['Zn'],
  Gd: ['Gd'],
  La: ['La'],
  Cl: ['Cl'],
  Br: ['Br'],
  F: ['F'],
  I: ['I'],
  NO3: ['NO3'],
  ClO4: ['ClO4'],
  SCN: ['SCN'],
  SO4: ['SO4'],
  HCO3: ['HCO3', 'CO3'],
  phosphate: ['PO4', 'HPO4', 'H2PO4', 'H3PO4'],
  acetate: ['Ac', 'OAc', 'CH3COO', 'CH3CO2', 'C2H3O2'],
  gluconate: ['C6H11O7'],
  methanesulfonate: ['MeS', 'MeSO3', 'CH3SO3', 'MSO3', 'MeSul'],
  methylsulfate: ['MeSO4', 'CH3SO4', 'CH3OSO3', 'MSO4'],
  aspartate: ['Asp'],
  phosphocreatine: ['PCr', 'CrP', 'PCreat'],
  choline: ['Ch', 'Cho'],
  TMA: ['TMA'],
  proton: ['H'],
  hydroxide: ['OH'],
};
const words: Record<string, string[]> = {
  Na: ['sodium'],
  K: ['potassium'],
  Li: ['lithium'],
  Rb: ['rubidium'],
  Cs: ['caesium', 'cesium'],
  NH4: ['ammonium'],
  Mg: ['magnesium'],
  Ca: ['calcium'],
  Ba: ['barium'],
  Sr: ['strontium'],
  Co: ['cobalt'],
  Cd: ['cadmium'],
  Mn: ['manganese'],
  Ni: ['nickel'],
  Zn: ['zinc'],
  Gd: ['gadolinium'],
  La: ['lanthanum'],
  TEA: ['tea', 'tetraethylammonium'],
  TMA: ['tetramethylammonium'],
  choline: ['choline'],
  'QX-314': ['qx314'],
  Cl: ['chloride', 'hydrochloride'],
  Br: ['bromide'],
  F: ['fluoride'],
  I: ['iodide'],
  NO3: ['nitrate'],
  ClO4: ['perchlorate'],
  SCN: ['thiocyanate'],
  SO4: ['sulfate', 'sulphate'],
  HCO3: ['bicarbonate', 'hydrogencarbonate', 'carbonate'],
  gluconate: ['gluconate', 'gluconicacid', 'gluc', 'glucon'],
  methanesulfonate: [
    'methanesulfonate',
    'methanesulphonate',
    'methansulfonate',
    'methylsulfonate',
    'methylsulphonate',
    'mesylate',
    'methanesulfonicacid',
    'methanesulphonicacid',
    'meso3',
  ],
  methylsulfate: ['methylsulfate', 'methylsulphate', 'methosulfate', 'methosulphate', 'meso4'],
  aspartate: ['aspartate', 'asparticacid'],
  glutamate: ['glutamate', 'glutamicacid'],
  acetate: ['acetate', 'aceticacid'],
  propionate: ['propionate', 'propionicacid'],
  butyrate: ['butyrate', 'butyricacid'],
  benzoate: ['benzoate', 'benzoicacid'],
  isethionate: ['isethionate', 'isethionicacid'],
  lactate: ['lactate', 'lacticacid'],
  pyruvate: ['pyruvate', 'pyruvicacid'],
  ascorbate: ['ascorbate', 'ascorbicacid'],
  kynurenate: ['kynurenate', 'kynurenicacid'],
  citrate: ['citrate', 'citricacid'],
  succinate: ['succinate', 'succinicacid'],
  malate: ['malate', 'malicacid'],
  phosphate: ['phosphate', 'hydrogenphosphate', 'dihydrogenphosphate', 'phosphoricacid'],
  HEPES: ['hepes'],
  MES: ['mes'],
  MOPS: ['mops'],
  TES: ['tes'],
  BES: ['bes'],
  PIPES: ['pipes'],
  Tris: ['tris', 'trizma', 'tromethamine'],
  NMDG: ['nmdg', 'nmg', 'nmethylglucamine', 'nmethyldglucamine', 'meglumine'],
  '4-aminopyridine': ['4ap', '4aminopyridine'],
  EGTA: ['egta'],
  EDTA: ['edta'],
  BAPTA: ['bapta'],
  ATP: ['atp', 'adenosinetriphosphate', 'adenosine5triphosphate'],
  GTP: ['gtp', 'guanosinetriphosphate', 'guanosine5triphosphate'],
  ADP: ['adp'],
  GDP: ['gdp'],
  phosphocreatine: ['phosphocreatine', 'creatinephosphate', 'phosphocreatinine', 'creatinphosphate', 'pcreatine'],
  spermine: ['spermine'],
  hydroxide: ['hydroxide'],
};
const prefixes: Record<string, number> = { mono: 1, di: 2, bis: 2, tri: 3, tetra: 4 };

/** Substances without charge at physiological pH, after cleaning. */
const uncharged = new Set([
  'glucose',
  'dextrose',
  'glc',
  'sucrose',
  'mannitol',
  'sorbitol',
  'trehalose',
  'raffinose',
  'fructose',
  'galactose',
  'inositol',
  'myoinositol',
  'creatine',
  'taurine',
  'glycine',
  'glutamine',
  'alanine',
  'serine',
  'gaba',
  'thiourea',
  'urea',
  'glycerol',
  'ethanol',
  'dmso',
  'caffeine',
  'biocytin',
  'picrotoxin',
  'water',
  'h2o',
]);

const tokens: Token[] = [
  ...Object.entries(symbols).flatMap(([means, texts]) => texts.map((text) => ({ text, symbol: true, means }))),
  ...Object.entries(words).flatMap(([means, texts]) => texts.map((text) => ({ text, symbol: false, means }))),
  ...Object.entries(prefixes).map(([text, cationCount]) => ({ text, symbol: false, means: { cationCount } })),
].sort((a, b) => b.text.length - a.text.length || Number(b.symbol) - Number(a.symbol));

interface Part {
  means: string;
  /** Null where the name gives no number. */
  count: number | null;
}

/** Removes hydrates, stereo-descriptors, charges, remarks and separators; keeps case, digits and brackets. */
function clean(name: string): string {
  return name
    .normalize('NFKC')
    .replace(/\((?:\+|-|±|\+\/-|\+-)\)/g, '')
    .replace(/(\d?)\+(?=$|[\s,;/-])/g, '')
    .replace(/\((?:[ivx]+)\)/gi, '')
    .replace(/\b(?:hemi|mono|di|tri|tetra|penta|hexa|hepta)?hydrate\b/gi, '')
    .replace(/[\s·•∙⋅*.×x(-]+\d*(?:\.\d+)?\s*H2O\)?$/, '')
    .replace(/\b(?:anhydrous|free acid|free base|base|salt|buffer|ultrapure)\b/gi, '')
    .replace(/\(\s*\)/g, '')
    .replace(/\b(?:[DL]|DL)-/g, '')
    .replace(/\bmyo-/gi, '')
    .replace(/[\s\-–—−_/·•∙⋅*.,;'’:]+/g, '');
}

/** Every way to read a cleaned name as tokens with counts, the reading with the longest tokens first. */
function readParts(text: string, caseMatters: boolean): Part[] | null {
  if (text === '') return [];
  if (text.startsWith('(')) {
    const close = text.indexOf(')');
    if (close < 2) return null;
    const inner = readParts(text.slice(1, close), caseMatters);
    const count = /^\d+(?:\.\d+)?/.exec(text.slice(close + 1))?.[0] ?? '';
    const rest = inner && readParts(text.slice(close + 1 + count.length), caseMatters);
    if (!inner || !rest) return null;
    const times = count === '' ? null : Number(count);
    return [
      ...inner.map((part) => ({ ...part, count: times === null ? part.count : (part.count ?? 1) * times })),
      ...rest,
    ];
  }
  const lower = text.toLowerCase();
  for (const token of tokens) {
    const matches =
      token.symbol && caseMatters ? text.startsWith(token.text) : lower.startsWith(token.text.toLowerCase());
    if (!matches) continue;
    const after = text.slice(token.text.length);
    if (typeof token.means === 'object') {
      const rest = readParts(after, caseMatters);
      const next = rest?.[0];
      if (!rest || !next || next.count !== null) continue;
      return [{ ...next, count: token.means.cationCount }, ...rest.slice(1)];
    }
    const count = /^\d+(?:\.\d+)?/.exec(after)?.[0] ?? '';
    const rest = readParts(after.slice(count.length), caseMatters);
    if (rest) return [{ means: token.means, count: count === '' ? null : Number(count) }, ...rest];
  }
  return null;
}

const isBuffer = (name: string): boolean => Object.hasOwn(buffers, name);
/** Buffers that gain charge from protons and so pair with anions. */
const basic = new Set(['Tris', 'NMDG', '4-aminopyridine', 'spermine']);
const acts = (name: string): 'cation' | 'anion' =>
  isBuffer(name) ? (basic.has(name) ? 'cation' : 'anion') : fixedIons[name]! > 0 ? 'cation' : 'anion';

/** Monovalent cations in the fullest salt that is sold. */
const mostCations: Record<string, number> = { ATP: 2, GTP: 3, ADP: 2, GDP: 2, phosphocreatine: 2 };

const nothing: Substance = {
  parts: new Map(),
  titratedWith: null,
  openCation: null,
  lonely: false,
  completed: false,
};

function toSubstance(parts: Part[]): Substance | null {
  const hydroxide = parts.some((part) => part.means === 'hydroxide');
  const proton = parts.some((part) => part.means === 'proton');
  const real = parts.filter((part) => part.means !== 'hydroxide' && part.means !== 'proton');
  if (real.length === 0) return null;
  const acidBuffer = real.find((part) => isBuffer(part.means) && acts(part.means) === 'anion');
  const baseBuffer = real.find((part) => isBuffer(part.means) && acts(part.means) === 'cation');
  const strongCation = real.find((part) => !isBuffer(part.means) && acts(part.means) === 'cation');
  const strongAnion = real.find((part) => !isBuffer(part.means) && acts(part.means) === 'anion');
  // 'HEPES-NaOH', 'Tris-HCl': the last ion is there to bring the buffer to its pH, in an amount the pH decides.
  if (hydroxide && acidBuffer && strongCation && !strongAnion)
    return { ...nothing, parts: new Map([[acidBuffer.means, 1]]), titratedWith: strongCation.means };
  if (proton && baseBuffer && strongAnion && !acidBuffer && !strongCation)
    return { ...nothing, parts: new Map([[baseBuffer.means, 1]]), titratedWith: strongAnion.means };

  const counted = new Map<string, number>();
  for (const part of real) counted.set(part.means, (counted.get(part.means) ?? 0) + (part.count ?? 1));
  const cations = real.filter((part) => acts(part.means) === 'cation');
  const anions = real.filter((part) => acts(part.means) === 'anion');
  let completed = false;
  if (
    !hydroxide &&
    !proton &&
    cations.length === 1 &&
    anions.length === 1 &&
    !isBuffer(cations[0]!.means) &&
    !isBuffer(anions[0]!.means) &&
    anions[0]!.means !== 'HCO3'
  ) {
    const [cation, anion] = [cations[0]!, anions[0]!];
    const up = fixedIons[cation.means]!;
    const down = -fixedIons[anion.means]!;
    if (up * (cation.count ?? 1) !== down * (anion.count ?? 1)) {
      // One count may follow from the other; two stated counts that disagree stay as written.
      if (anion.count === null && cation.count === null && down > up) counted.set(cation.means, down / up);
      else if (anion.count === null) counted.set(anion.means, (up * (cation.count ?? 1)) / down);
      else if (cation.count === null) counted.set(cation.means, (down * anion.count) / up);
      completed = anion.count === null || cation.count === null;
    }
  }
  const polyacid = anions.find((part) => Object.hasOwn(mostCations, part.means));
  const openCation =
    polyacid && cations.length === 1 && cations[0]!.count === null && fixedIons[cations[0]!.means] !== 2
      ? { ion: cations[0]!.means, most: mostCations[polyacid.means]! }
      : null;
  const selfContained = real.every((part) => isBuffer(part.means)) && !polyacid;
  const lonely = !selfContained && !hydroxide && !proton && (cations.length === 0 || anions.length === 0);
  return { parts: counted, titratedWith: null, openCation, lonely, completed };
}

/**
 * What a name in a recipe stands for.
 * @param name as written: chemical formulas with or without hydrate, hyphenated salts, words, common short forms
 * @returns null where the name is none that is known
 */
export function readSubstance(name: string): Substance | null {
  const text = clean(name);
  if (text === '') return null;
  const lower = text.toLowerCase();
  if (uncharged.has(lower)) return nothing;
  const uniform = text === lower || text === text.toUpperCase();
  const parts = readParts(text, true) ?? (uniform ? readParts(text, false) : null);
  return parts && toSubstance(parts);
}

/**
 * The ion that a stated base or acid brings: 'KOH' gives K, 'HCl' gives Cl, 'Tris' gives Tris, 'NaOH' gives Na.
 * @returns null where the name is no strong base, strong acid or organic base that is known
 */
export function readTitrant(name: string): string | null {
  const first = name.replace(/^\s*\d+(?:\.\d+)?\s*m?[MN]\s+/, '').split(/\s+(?:or|and|then)\s+|[,;+]|\/(?=[A-Z])/)[0]!;
  const substance = readSubstance(first);
  if (substance?.parts.size !== 1) return null;
  const ion = [...substance.parts.keys()][0]!;
  return isBuffer(ion) ? (basic.has(ion) ? ion : null) : Math.abs(fixedIons[ion]!) === 1 || ion === 'SO4' ? ion : null;
}
