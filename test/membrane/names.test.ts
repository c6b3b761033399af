import { describe, expect, it, test } from 'vitest';
import { readSubstance, readTitrant } from '../../pipeline/membrane/names.ts';

/** Parts as 'K1 gluconate1', sorted by name; '' for an uncharged substance, null for a name not known. */
const parts = (name: string): string | null => {
  const substance = readSubstance(name);
  return (
    substance &&
    [...substance.parts]
      .map(([part, count]) => `${part}${count}`)
      .sort()
      .join(' ')
  );
};

describe('readSubstance(name)', () => {
  test.each([
    ['', null],
    ['   ', null],
    ['·2H2O', null],
    ['()', null],
    ['(', null],
    ['2', null],
    ['-', null],
    ['OH', null],
    ['H', null],
    ['TTX', null],
    ['CNQX', null],
    ['D-AP5', null],
    ['Alexa 594', null],
    ['Fluo-5F', null],
    ['magic salt', null],
    ['constructor', null],
    ['__proto__', null],
    ['toString', null],
  ])('%j is nothing known', (name, expected) => expect(parts(name)).toBe(expected));

  test.each([
    ['NaCl', 'Cl1 Na1'],
    ['KCl', 'Cl1 K1'],
    ['CsCl', 'Cl1 Cs1'],
    ['LiCl', 'Cl1 Li1'],
    ['NH4Cl', 'Cl1 NH41'],
    ['CaCl2', 'Ca1 Cl2'],
    ['MgCl2', 'Cl2 Mg1'],
    ['BaCl2', 'Ba1 Cl2'],
    ['CoCl2', 'Cl2 Co1'],
    ['CdCl2', 'Cd1 Cl2'],
    ['MnCl2', 'Cl2 Mn1'],
    ['KF', 'F1 K1'],
    ['CsF', 'Cs1 F1'],
    ['NaF', 'F1 Na1'],
    ['MgSO4', 'Mg1 SO41'],
    ['K2SO4', 'K2 SO41'],
    ['NaHCO3', 'HCO31 Na1'],
    ['NaH2PO4', 'Na1 phosphate1'],
    ['Na2HPO4', 'Na2 phosphate1'],
    ['KH2PO4', 'K1 phosphate1'],
    ['K2HPO4', 'K2 phosphate1'],
    ['NaOH', 'Na1'],
    ['HCl', 'Cl1'],
  ])('formula %s', (name, expected) => expect(parts(name)).toBe(expected));

  test.each([
    ['CaCl2·2H2O', 'Ca1 Cl2'],
    ['CaCl2.2H2O', 'Ca1 Cl2'],
    ['CaCl2 x 2H2O', 'Ca1 Cl2'],
    ['CaCl2*2 H2O', 'Ca1 Cl2'],
    ['CaCl₂∙2H₂O', 'Ca1 Cl2'],
    ['CaCl2 (2H2O)', 'Ca1 Cl2'],
    ['MgCl2·6H2O', 'Cl2 Mg1'],
    ['MgSO4.7H2O', 'Mg1 SO41'],
    ['MgSO4 heptahydrate', 'Mg1 SO41'],
    ['NaH2PO4·H2O', 'Na1 phosphate1'],
    ['CaCl2 dihydrate', 'Ca1 Cl2'],
    ['NaCl (anhydrous)', 'Cl1 Na1'],
    ['Na2-GTP hydrate', 'GTP1 Na2'],
  ])('water of crystallization in %s', (name, expected) => expect(parts(name)).toBe(expected));

  test.each([
    ...[
      'K-gluconate',
      'KGluconate',
      'K gluconate',
      'K-Gluc',
      'K-D-gluconate',
      'potassium gluconate',
      'K_gluconate',
    ].map((name) => [name, 'K1 gluconate1']),
    ...['Cs-methanesulfonate', 'CsMeSO3', 'CsMeSO₃', 'Cs-MeS', 'Cesium methanesulphonate', 'caesium mesylate'].map(
      (name) => [name, 'Cs1 methanesulfonate1'],
    ),
    ['K-methanesulfonate', 'K1 methanesulfonate1'],
    ['Na-methanesulfonate', 'Na1 methanesulfonate1'],
    ['KMeSO3', 'K1 methanesulfonate1'],
    ['KMeSO4', 'K1 methylsulfate1'],
    ['K-methylsulfate', 'K1 methylsulfate1'],
    ['K-aspartate', 'K1 aspartate1'],
    ['K-Asp', 'K1 aspartate1'],
    ['TEA-Cl', 'Cl1 TEA1'],
    ['TEACl', 'Cl1 TEA1'],
    ['tetraethylammonium chloride', 'Cl1 TEA1'],
    ['NMDG-Cl', 'Cl1 NMDG1'],
    ['NMDG', 'NMDG1'],
    ['N-methyl-D-glucamine', 'NMDG1'],
    ['choline-Cl', 'Cl1 choline1'],
    ['Choline chloride', 'Cl1 choline1'],
    ['QX-314 bromide', 'Br1 QX-3141'],
    ['Na-pyruvate', 'Na1 pyruvate1'],
    ['L-ascorbic acid', 'ascorbate1'],
  ])('salt %s', (name, expected) => expect(parts(name!)).toBe(expected));

  test.each([
    ...['Mg-ATP', 'MgATP', 'ATP-Mg', 'Mg ATP', 'MgATP·H2O', 'mgatp'].map((name) => [name, 'ATP1 Mg1']),
    ...['Na2ATP', 'Na2-ATP', 'ATP-Na2', 'disodium ATP', 'ATP disodium salt'].map((name) => [name, 'ATP1 Na2']),
    ['K2-ATP', 'ATP1 K2'],
    ...['Na3-GTP', 'Na3GTP', 'GTP-Na3', 'trisodium GTP'].map((name) => [name, 'GTP1 Na3']),
    ['Na2GTP', 'GTP1 Na2'],
    ['Tris-GTP', 'GTP1 Tris1'],
    ...['Na2-phosphocreatine', 'Na2-creatine phosphate', 'phosphocreatine-(Na)2', 'Phosphocreatine disodium'].map(
      (name) => [name, 'Na2 phosphocreatine1'],
    ),
    ['phosphocreatine di(tris)', 'Tris2 phosphocreatine1'],
    ['EGTA', 'EGTA1'],
    ['EGTA (free acid)', 'EGTA1'],
    ['K2EGTA', 'EGTA1 K2'],
    ['BAPTA', 'BAPTA1'],
    ['K4BAPTA', 'BAPTA1 K4'],
    ['BAPTA-K4', 'BAPTA1 K4'],
    ['HEPES', 'HEPES1'],
    ['Hepes', 'HEPES1'],
    ['K-HEPES', 'HEPES1 K1'],
    ['Tris base', 'Tris1'],
    ['MES', 'MES1'],
    ['4-AP', '4-aminopyridine1'],
    ['spermine', 'spermine1'],
  ])('buffer or nucleotide %s', (name, expected) => expect(parts(name!)).toBe(expected));

  test.each([
    'glucose',
    'D-glucose',
    'D-(+)-Glucose',
    'Dextrose',
    'sucrose',
    'mannitol',
    'sorbitol',
    'myo-inositol',
    'biocytin',
  ])('%s carries no charge', (name) => expect(parts(name)).toBe(''));

  test.each([
    ['nacl', 'Cl1 Na1'],
    ['NACL', 'Cl1 Na1'],
    ['KCL', 'Cl1 K1'],
    ['mgcl2', 'Cl2 Mg1'],
    ['Na+', 'Na1'],
    ['Mg2+', 'Mg1'],
    ['Cl-', 'Cl1'],
    ['Mg(gluconate)2', 'Mg1 gluconate2'],
  ])('careless writing: %s', (name, expected) => expect(parts(name)).toBe(expected));

  it('completes counts that words leave out', () => {
    for (const [name, expected] of [
      ['calcium chloride', 'Ca1 Cl2'],
      ['Ca-gluconate', 'Ca1 gluconate2'],
      ['potassium sulfate', 'K2 SO41'],
    ] as const) {
      expect(parts(name)).toBe(expected);
      expect(readSubstance(name)!.completed).toBe(true);
    }
    expect(readSubstance('CaCl2')!.completed).toBe(false);
  });
  it('tells a buffer brought to its pH from its salt', () => {
    expect(readSubstance('HEPES-NaOH')).toMatchObject({ titratedWith: 'Na' });
    expect(parts('HEPES-NaOH')).toBe('HEPES1');
    expect(readSubstance('EGTA/KOH')).toMatchObject({ titratedWith: 'K' });
    expect(readSubstance('Tris-HCl')).toMatchObject({ titratedWith: 'Cl' });
    expect(readSubstance('Na-HEPES')).toMatchObject({ titratedWith: null });
  });
  it('says where a name leaves the number of cations or the counter-ion open', () => {
    expect(readSubstance('Na-GTP')!.openCation).toEqual({ ion: 'Na', most: 3 });
    expect(readSubstance('Na-phosphocreatine')!.openCation).toEqual({ ion: 'Na', most: 2 });
    expect(readSubstance('Na3-GTP')!.openCation).toBeNull();
    expect(readSubstance('Mg-ATP')!.openCation).toBeNull();
    expect(readSubstance('ATP')!.lonely).toBe(true);
    expect(readSubstance('QX-314')!.lonely).toBe(true);
    expect(readSubstance('HEPES')!.lonely).toBe(false);
    expect(readSubstance('KCl')!.lonely).toBe(false);
  });
  it('comes to an end on long nonsense', () => {
    expect(parts('NaKClMg'.repeat(20).concat('?'))).toBeNull();
    expect(parts('('.repeat(200))).toBeNull();
  });
});

test.each([
  ['KOH', 'K'],
  ['NaOH', 'Na'],
  ['CsOH', 'Cs'],
  ['LiOH', 'Li'],
  ['HCl', 'Cl'],
  ['1 M KOH', 'K'],
  ['potassium hydroxide', 'K'],
  ['Tris', 'Tris'],
  ['NMDG', 'NMDG'],
  ['methanesulfonic acid', 'methanesulfonate'],
  ['gluconic acid', 'gluconate'],
  ['H2SO4', 'SO4'],
  ['KOH or HCl', 'K'],
  ['TEA-OH', 'TEA'],
  ['Ca(OH)2', null],
  ['H3PO4', null],
  ['NaCl', null],
  ['glucose', null],
  ['magic', null],
])('readTitrant(%s)', (name, ion) => expect(readTitrant(name)).toBe(ion));
