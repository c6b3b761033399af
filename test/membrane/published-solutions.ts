/**
 * Recipes as printed, the sums of ions that their dissolved salts bring, and equilibrium potentials of every pair from
 * those sums. Sources. acsf-a, gluconate-c, cscl: J Physiol 2009, 587:4249, table 1, doi:10.1113/jphysiol.2009.175349
 * (found; the alignment of CaCl2 and MgCl2 in the table is ambiguous). gluconate-a: Ekins et al. 2020, eLife 9:e62373
 * (found). gluconate-b: Surmeli et al. 2015, Neuron (found, as a curated list). acsf-b, kcl: articles in eLife and
 * J Neurosci whose identity was not noted (found). acsf-c, gluconate-d, hepes-saline, methanesulfonate: methods texts
 * without identity (found). tyrode, sea-water: common practice, from memory. Sums and potentials: computed
 * independently.
 */
export interface PublishedSolution {
  millimolar: Record<string, number>;
  sums: Record<string, number>;
}

export const solutions: Record<string, PublishedSolution> = {
  'acsf-a': {
    millimolar: { NaCl: 125, KCl: 2.5, NaH2PO4: 1.25, NaHCO3: 25, CaCl2: 2, MgCl2: 2, glucose: 10 },
    sums: { Na: 151.25, K: 2.5, Cl: 135.5, HCO3: 25, Ca: 2, Mg: 2, phosphate: 1.25 },
  },
  'acsf-b': {
    millimolar: { NaCl: 130, KCl: 3.5, NaH2PO4: 1.25, NaHCO3: 24, CaCl2: 2, MgSO4: 1, glucose: 10 },
    sums: { Na: 155.25, K: 3.5, Cl: 137.5, HCO3: 24, Ca: 2, Mg: 1, SO4: 1, phosphate: 1.25 },
  },
  'acsf-c': {
    millimolar: { NaCl: 120, KCl: 3.5, CaCl2: 2.6, MgCl2: 1.3, NaH2PO4: 1.25, NaHCO3: 26, glucose: 10 },
    sums: { Na: 147.25, K: 3.5, Cl: 131.3, HCO3: 26, Ca: 2.6, Mg: 1.3, phosphate: 1.25 },
  },
  'hepes-saline': {
    millimolar: { NaCl: 140, KCl: 5, CaCl2: 2, MgCl2: 1, glucose: 10, 'HEPES-NaOH': 10 },
    sums: { Na: 144, K: 5, Cl: 151, Ca: 2, Mg: 1 },
  },
  tyrode: {
    millimolar: { NaCl: 140, KCl: 5.4, CaCl2: 1.8, MgCl2: 1, HEPES: 5, glucose: 10 },
    sums: { Na: 142, K: 5.4, Cl: 151, Ca: 1.8, Mg: 1 },
  },
  'sea-water': {
    millimolar: { NaCl: 430, KCl: 10, CaCl2: 10, MgCl2: 50, 'Tris/HEPES': 10 },
    sums: { Na: 430, K: 10, Cl: 560, Ca: 10, Mg: 50 },
  },
  'gluconate-a': {
    millimolar: { 'K-gluconate': 130, KCl: 5, HEPES: 10, MgCl2: 3, Na2ATP: 2, NaGTP: 0.3, EGTA: 0.6 },
    sums: { K: 135, Na: 4.3, Cl: 11, Mg: 3, gluconate: 130 },
  },
  'gluconate-b': {
    millimolar: {
      'K-gluconate': 130,
      KCl: 10,
      HEPES: 10,
      MgCl2: 2,
      EGTA: 0.1,
      Na2ATP: 2,
      Na2GTP: 0.3,
      'Na2-phosphocreatine': 10,
    },
    sums: { K: 140, Na: 24.6, Cl: 14, Mg: 2, gluconate: 130 },
  },
  'gluconate-c': {
    millimolar: {
      'K-gluconate': 110,
      KCl: 20,
      HEPES: 10,
      EGTA: 10,
      MgCl2: 2,
      'Mg-ATP': 4,
      'Tris-GTP': 0.4,
      'Na2-phosphocreatine': 10,
    },
    sums: { K: 130, Na: 20, Cl: 24, Mg: 2, gluconate: 110 },
  },
  'gluconate-d': {
    millimolar: { 'K-gluconate': 170, HEPES: 10, NaCl: 10, MgCl2: 2, EGTA: 1.33, CaCl2: 0.133, MgATP: 3.5, GTP: 1 },
    sums: { K: 170, Na: 10, Cl: 14.266, Mg: 2, gluconate: 170 },
  },
  methanesulfonate: {
    millimolar: {
      KMeSO3: 130,
      NaCl: 10,
      HEPES: 10,
      MgCl2: 2,
      EGTA: 0.5,
      CaCl2: 0.16,
      Na2ATP: 4,
      NaGTP: 0.4,
      'Tris-creatine-phosphate': 14,
    },
    sums: { K: 130, Na: 18.4, Cl: 14.32, Mg: 2, methanesulfonate: 130 },
  },
  kcl: {
    millimolar: { KCl: 120, HEPES: 10, 'Mg-ATP': 4, 'Na-GTP': 0.3, 'Na-phosphocreatine': 10 },
    sums: { K: 120, Na: 10.3, Cl: 120 },
  },
  cscl: {
    millimolar: { CsCl: 133, HEPES: 10, EGTA: 10, MgCl2: 2, 'Tris-GTP': 0.4, 'Mg-ATP': 4, 'Na2-phosphocreatine': 10 },
    sums: { Cs: 133, Na: 20, Cl: 137, Mg: 2 },
  },
};

/** Bath, pipette, °C, E_K, E_Na, E_Cl, E_Ca at 100 nM free inside; null where an ion is missing. */
export const pairs: [string, string, number, number | null, number | null, number | null, number | null][] = [
  ['acsf-a', 'gluconate-a', 22, -101.46, 90.55, -63.87, 125.94],
  ['acsf-a', 'gluconate-a', 34, -105.58, 94.24, -66.46, 131.06],
  ['acsf-a', 'gluconate-b', 22, -102.38, 46.19, -57.73, 125.94],
  ['acsf-a', 'gluconate-b', 34, -106.54, 48.07, -60.08, 131.06],
  ['acsf-a', 'gluconate-c', 22, -100.5, 51.46, -44.02, 125.94],
  ['acsf-a', 'gluconate-c', 34, -104.58, 53.55, -45.81, 131.06],
  ['acsf-a', 'gluconate-d', 22, -107.32, 69.09, -57.25, 125.94],
  ['acsf-a', 'gluconate-d', 34, -111.68, 71.9, -59.58, 131.06],
  ['acsf-a', 'methanesulfonate', 22, -100.5, 53.58, -57.16, 125.94],
  ['acsf-a', 'methanesulfonate', 34, -104.58, 55.76, -59.48, 131.06],
  ['acsf-a', 'kcl', 22, -98.46, 68.34, -3.09, 125.94],
  ['acsf-a', 'kcl', 34, -102.46, 71.11, -3.22, 131.06],
  ['acsf-a', 'cscl', 22, null, 51.46, 0.28, 125.94],
  ['acsf-a', 'cscl', 34, null, 53.55, 0.29, 131.06],
  ['acsf-b', 'gluconate-a', 22, -92.9, 91.22, -64.24, 125.94],
  ['acsf-b', 'gluconate-a', 34, -96.68, 94.93, -66.85, 131.06],
  ['acsf-b', 'gluconate-b', 22, -93.82, 46.86, -58.11, 125.94],
  ['acsf-b', 'gluconate-b', 34, -97.64, 48.76, -60.47, 131.06],
  ['acsf-b', 'gluconate-c', 22, -91.94, 52.12, -44.4, 125.94],
  ['acsf-b', 'gluconate-c', 34, -95.68, 54.24, -46.2, 131.06],
  ['acsf-b', 'gluconate-d', 22, -98.76, 69.75, -57.63, 125.94],
  ['acsf-b', 'gluconate-d', 34, -102.78, 72.59, -59.97, 131.06],
  ['acsf-b', 'methanesulfonate', 22, -91.94, 54.24, -57.53, 125.94],
  ['acsf-b', 'methanesulfonate', 34, -95.68, 56.45, -59.87, 131.06],
  ['acsf-b', 'kcl', 22, -89.9, 69.0, -3.46, 125.94],
  ['acsf-b', 'kcl', 34, -93.56, 71.81, -3.6, 131.06],
  ['acsf-b', 'cscl', 22, null, 52.12, -0.09, 125.94],
  ['acsf-b', 'cscl', 34, null, 54.24, -0.1, 131.06],
  ['acsf-c', 'gluconate-a', 22, -92.9, 89.87, -63.07, 129.28],
  ['acsf-c', 'gluconate-a', 34, -96.68, 93.53, -65.63, 134.54],
  ['acsf-c', 'gluconate-b', 22, -93.82, 45.51, -56.93, 129.28],
  ['acsf-c', 'gluconate-b', 34, -97.64, 47.36, -59.25, 134.54],
  ['acsf-c', 'gluconate-c', 22, -91.94, 50.78, -43.22, 129.28],
  ['acsf-c', 'gluconate-c', 34, -95.68, 52.84, -44.98, 134.54],
  ['acsf-c', 'gluconate-d', 22, -98.76, 68.41, -56.45, 129.28],
  ['acsf-c', 'gluconate-d', 34, -102.78, 71.19, -58.75, 134.54],
  ['acsf-c', 'methanesulfonate', 22, -91.94, 52.9, -56.36, 129.28],
  ['acsf-c', 'methanesulfonate', 34, -95.68, 55.05, -58.65, 134.54],
  ['acsf-c', 'kcl', 22, -89.9, 67.65, -2.29, 129.28],
  ['acsf-c', 'kcl', 34, -93.56, 70.4, -2.38, 134.54],
  ['acsf-c', 'cscl', 22, null, 50.78, 1.08, 129.28],
  ['acsf-c', 'cscl', 34, null, 52.84, 1.12, 134.54],
  ['hepes-saline', 'gluconate-a', 22, -83.83, 89.3, -66.62, 125.94],
  ['hepes-saline', 'gluconate-a', 34, -87.23, 92.93, -69.33, 131.06],
  ['hepes-saline', 'gluconate-b', 22, -84.75, 44.94, -60.49, 125.94],
  ['hepes-saline', 'gluconate-b', 34, -88.2, 46.77, -62.95, 131.06],
  ['hepes-saline', 'gluconate-c', 22, -82.87, 50.21, -46.78, 125.94],
  ['hepes-saline', 'gluconate-c', 34, -86.24, 52.25, -48.68, 131.06],
  ['hepes-saline', 'gluconate-d', 22, -89.69, 67.84, -60.01, 125.94],
  ['hepes-saline', 'gluconate-d', 34, -93.34, 70.6, -62.45, 131.06],
  ['hepes-saline', 'methanesulfonate', 22, -82.87, 52.33, -59.91, 125.94],
  ['hepes-saline', 'methanesulfonate', 34, -86.24, 54.46, -62.35, 131.06],
  ['hepes-saline', 'kcl', 22, -80.83, 67.09, -5.84, 125.94],
  ['hepes-saline', 'kcl', 34, -84.12, 69.81, -6.08, 131.06],
  ['hepes-saline', 'cscl', 22, null, 50.21, -2.47, 125.94],
  ['hepes-saline', 'cscl', 34, null, 52.25, -2.58, 131.06],
  ['tyrode', 'gluconate-a', 22, -81.87, 88.95, -66.62, 124.6],
  ['tyrode', 'gluconate-a', 34, -85.2, 92.56, -69.33, 129.67],
  ['tyrode', 'gluconate-b', 22, -82.79, 44.59, -60.49, 124.6],
  ['tyrode', 'gluconate-b', 34, -86.16, 46.4, -62.95, 129.67],
  ['tyrode', 'gluconate-c', 22, -80.91, 49.85, -46.78, 124.6],
  ['tyrode', 'gluconate-c', 34, -84.2, 51.88, -48.68, 129.67],
  ['tyrode', 'gluconate-d', 22, -87.73, 67.48, -60.01, 124.6],
  ['tyrode', 'gluconate-d', 34, -91.3, 70.23, -62.45, 129.67],
  ['tyrode', 'methanesulfonate', 22, -80.91, 51.97, -59.91, 124.6],
  ['tyrode', 'methanesulfonate', 34, -84.2, 54.09, -62.35, 129.67],
  ['tyrode', 'kcl', 22, -78.87, 66.73, -5.84, 124.6],
  ['tyrode', 'kcl', 34, -82.08, 69.44, -6.08, 129.67],
  ['tyrode', 'cscl', 22, null, 49.85, -2.47, 124.6],
  ['tyrode', 'cscl', 34, null, 51.88, -2.58, 129.67],
  ['sea-water', 'gluconate-a', 22, -66.2, 117.13, -99.96, 146.41],
  ['sea-water', 'gluconate-a', 34, -68.89, 121.89, -104.02, 152.36],
  ['sea-water', 'gluconate-b', 22, -67.12, 72.77, -93.82, 146.41],
  ['sea-water', 'gluconate-b', 34, -69.85, 75.73, -97.64, 152.36],
  ['sea-water', 'gluconate-c', 22, -65.24, 78.03, -80.11, 146.41],
  ['sea-water', 'gluconate-c', 34, -67.89, 81.21, -83.37, 152.36],
  ['sea-water', 'gluconate-d', 22, -72.06, 95.66, -93.34, 146.41],
  ['sea-water', 'gluconate-d', 34, -74.99, 99.55, -97.14, 152.36],
  ['sea-water', 'methanesulfonate', 22, -65.24, 80.15, -93.25, 146.41],
  ['sea-water', 'methanesulfonate', 34, -67.89, 83.41, -97.04, 152.36],
  ['sea-water', 'kcl', 22, -63.2, 94.91, -39.18, 146.41],
  ['sea-water', 'kcl', 34, -65.77, 98.77, -40.77, 152.36],
  ['sea-water', 'cscl', 22, null, 78.03, -35.81, 146.41],
  ['sea-water', 'cscl', 34, null, 81.21, -37.27, 152.36],
];
