import fc from 'fast-check';
import { describe, expect, it, test } from 'vitest';
import { goldmanPotential } from '../../pipeline/membrane/goldman.ts';
import {
  changePerSpikeMm,
  entryPerSpikeFmol,
  equilibriumShiftMv,
  excessFactor,
  exchangeTimeConstantS,
  peakShiftMv,
  shareRetained,
} from '../../pipeline/membrane/gradients.ts';
import { nernstPotential } from '../../pipeline/membrane/nernst.ts';

const elementaryChargeC = 1.602176634e-19;
const avogadroPerMol = 6.02214076e23;

describe('ions per spike', () => {
  // C·ΔV/e in numbers of ions, recomputed independently (charge-counting table of the reference values): a 100 pF cell,
  // the regular-spiking model of Pospischil et al. 2008 (threshold to peak), 10 nF, and 1 µF.
  test.each([
    [100, 100, 62415090.744607635],
    [289.53, 88.9, 160651556.47501475],
    [10000, 100, 6241509074.460763],
    [1e6, 100, 624150907446.0763],
  ])('%d pF and %d mV', (pf, mv, ions) =>
    expect((entryPerSpikeFmol(pf, mv, 1) * 1e-15 * avogadroPerMol) / ions).toBeCloseTo(1, 9),
  );
  it('agrees with charge over the elementary charge', () =>
    expect(entryPerSpikeFmol(100, 100, 1) * 1e-15 * avogadroPerMol * elementaryChargeC).toBeCloseTo(1e-11, 18));
  // Squid axon, 1 µF/cm²: 100 mV take 1.036427 pmol/cm². Space-clamped Hodgkin–Huxley spikes, integrated independently:
  // height, sodium entry above rest and its ratio to C·height at four temperatures (computed).
  it('is 1.036 pmol/cm² for 100 mV on 1 µF/cm²', () =>
    expect(entryPerSpikeFmol(1, 100, 1) * 1000).toBeCloseTo(1.0364269656617728, 10));
  test.each([
    [6.3, 105.40670832823412, 13.231811955070427, 14.455272244567878],
    [18.5, 96.9118956750248, 3.9912959476481014, 4.008941545700947],
    [20, 94.83162025442749, 3.515275634096096, 3.455025512143542],
    [25, 85.26748826915687, 2.4432101358377425, 2.159150899097614],
  ])('Hodgkin–Huxley at %d °C', (_celsius, height, excess, pmol) =>
    expect(entryPerSpikeFmol(1, height, excess) * 1000).toBeCloseTo(pmol, 9),
  );
  // Measured with tracers: 3.5 pmol/cm² an impulse in Loligo (Keynes & Lewis 1951, J Physiol 114:151), 3.7 in Sepia
  // (Keynes 1951, J Physiol 114:119); calculated for the propagated spike 4.33 (Hodgkin & Huxley 1952, J Physiol 117:500,
  // p. 533). From memory. The range of factors, 1 to 4, must reach them for a spike of 100 to 110 mV.
  test.each([3.5, 3.7, 4.33])('the range of excess factors reaches %d pmol/cm²', (pmol) => {
    expect(entryPerSpikeFmol(1, 105, excessFactor.low) * 1000).toBeLessThan(pmol);
    expect(entryPerSpikeFmol(1, 105, excessFactor.high) * 1000).toBeGreaterThan(pmol);
  });
  // Attwell & Laughlin 2001, J Cereb Blood Flow Metab 21:1133 (from memory): 2.9·10⁸ ions at least, four times that in
  // fact; 464 pF at 100 mV by C = N·e/V.
  it('a grey-matter neuron', () => {
    const ions = (excess: number): number => entryPerSpikeFmol(464.6, 100, excess) * 1e-15 * avogadroPerMol;
    expect(ions(1) / 2.9e8).toBeCloseTo(1, 3);
    expect(ions(4) / 11.5e8).toBeCloseTo(1.0087, 3);
  });
  it('refuses what cannot be', () => {
    expect(() => entryPerSpikeFmol(0, 100, 2)).toThrow(/capacitancePf .* got 0/);
    expect(() => entryPerSpikeFmol(10, -1, 2)).toThrow(/heightMv .* got -1/);
    expect(() => entryPerSpikeFmol(10, 100, 0.9)).toThrow(/excess .* got 0.9/);
    expect(() => changePerSpikeMm(10, 100, 2, 0)).toThrow(/volumePl .* got 0/);
  });
});

describe('change of concentration', () => {
  // Impulses of an axon whose pump is blocked, entry 4 pmol/cm²: 4·entry/diameter (charge-counting table of the
  // reference values). An axon 1 mm long stands for it; the factor is chosen so that entry is 4 pmol/cm².
  test.each([
    [500, 0.00032, 31250, 125000],
    [100, 0.0016, 6250, 25000],
    [1, 0.16, 62.5, 250],
    [0.2, 0.8, 12.5, 50],
  ])('an axon of %d µm', (diameterUm, perImpulseMm, impulsesTo10, impulsesTo40) => {
    const [radiusCm, lengthCm] = [(diameterUm * 1e-4) / 2, 0.1];
    const areaCm2 = 2 * Math.PI * radiusCm * lengthCm;
    const volumePl = Math.PI * radiusCm ** 2 * lengthCm * 1e9;
    const capacitancePf = areaCm2 * 1e6;
    const excess = 4 / 1.0364269656617728;
    const gain = changePerSpikeMm(capacitancePf, 100, excess, volumePl);
    expect(gain / perImpulseMm).toBeCloseTo(1, 9);
    expect(10 / gain / impulsesTo10).toBeCloseTo(1, 9);
    // A tenth of 400 mM potassium.
    expect(40 / gain / impulsesTo40).toBeCloseTo(1, 9);
  });
  it('a 500 µm axon conducts of the order of 10⁵ impulses without its pump (Hodgkin 1964; from memory)', () => {
    // Squid axon, 50 mM sodium in, 400 mM potassium in: after 10⁵ impulses E_Na has lost 12 mV and stays well positive.
    const lost = equilibriumShiftMv({ inside_mm: 50, outside_mm: 440 }, 1e5 * 0.00032, 20)!;
    expect(lost).toBeCloseTo(25.2617 * Math.log(50 / 82), 3);
    expect(nernstPotential(1, 440, 82, 20)).toBeGreaterThan(40);
  });
});

describe('equilibrium and peak', () => {
  const sodium = { inside_mm: 10, outside_mm: 145 };
  const potassium = { inside_mm: 140, outside_mm: 4 };
  it('by hand', () => {
    // 26.2958·ln(10/12) and ·ln(140/138), 32 °C.
    expect(equilibriumShiftMv(sodium, 2, 32)).toBeCloseTo(-4.7943, 3);
    expect(equilibriumShiftMv(potassium, -2, 32)).toBeCloseTo(0.3784, 3);
    expect(equilibriumShiftMv(potassium, -140, 32)).toBeNull();
  });
  it('the peak is the constant-field potential before and after (second implementation: goldmanPotential)', () => {
    const ratio = 20;
    const at = (gain: number): number =>
      goldmanPotential(
        [
          { valence: 1, permeability: 1, insideMm: 140 - gain, outsideMm: 4 },
          { valence: 1, permeability: ratio, insideMm: 10 + gain, outsideMm: 145 },
        ],
        32,
      );
    expect(peakShiftMv(at(0), sodium, potassium, 2, 32)).toBeCloseTo(at(2) - at(0), 9);
  });
  it('a peak at E_Na or above moves as E_Na does, one below E_K has no answer', () => {
    const ena = nernstPotential(1, 145, 10, 32);
    expect(peakShiftMv(ena + 1, sodium, potassium, 2, 32)).toBe(equilibriumShiftMv(sodium, 2, 32));
    expect(peakShiftMv(-120, sodium, potassium, 2, 32)).toBeNull();
    expect(peakShiftMv(30, sodium, potassium, 140, 32)).toBeNull();
  });
  it('never gains, and never loses more than E_Na', () =>
    fc.assert(
      fc.property(
        fc.double({ min: -40, max: 60, noNaN: true }),
        fc.double({ min: 0, max: 50, noNaN: true }),
        fc.double({ min: 5, max: 40, noNaN: true }),
        (peak, gain, celsius) => {
          const moved = peakShiftMv(peak, sodium, potassium, gain, celsius)!;
          expect(moved).toBeLessThanOrEqual(1e-9);
          // The potassium lost works against it, and never outweighs the sodium gained.
          expect(moved).toBeGreaterThanOrEqual(equilibriumShiftMv(sodium, gain, celsius)! - 1e-9);
        },
      ),
      { seed: 41 },
    ));
});

describe('exchange with the pipette', () => {
  // Pusch & Neher 1988, Pflügers Arch 411:204–211 (from memory): τ = (0.6 ± 0.17)·R_a·M^⅓ s with R_a in MΩ, in
  // chromaffin cells, 13 to 15 µm across (1.2 to 1.8 pL). Sodium, M = 23: 1.2 to 2.2 s per MΩ.
  it('comes to what was measured in chromaffin cells', () => {
    const glutamate = [
      { ion: 'K', valence: 1, millimolar: 150 },
      { ion: 'glutamate', valence: -1, millimolar: 140 },
      { ion: 'Cl', valence: -1, millimolar: 10 },
    ];
    for (const volumePl of [1.2, 1.8]) {
      const perMohm = exchangeTimeConstantS(5, volumePl, glutamate, 24) / 5;
      expect(perMohm).toBeGreaterThan(0.43 * 23 ** (1 / 3));
      expect(perMohm).toBeLessThan(0.77 * 23 ** (1 / 3));
    }
  });
  it('is resistance over resistivity times volume over the diffusion coefficient', () => {
    // 140 mM KCl at 25 °C: ρ = 1/(140·(73.48 + 76.31)·10⁻⁴) Ω·m; D of sodium 1.334·10⁻⁹ m²/s (CRC Handbook, limiting).
    // 10 MΩ and 5 pL: 10⁷/0.4769·5·10⁻¹⁵/1.334·10⁻⁹ = 78.6 s.
    const kcl = [
      { ion: 'K', valence: 1, millimolar: 140 },
      { ion: 'Cl', valence: -1, millimolar: 140 },
    ];
    expect(exchangeTimeConstantS(10, 5, kcl, 25)).toBeCloseTo(78.6, 1);
    expect(exchangeTimeConstantS(20, 2.5, kcl, 25)).toBeCloseTo(78.6, 1);
    expect(() => exchangeTimeConstantS(10, 5, [], 25)).toThrow(/pipette must hold/);
  });
  it('keeps all of it when slow, nothing when quick', () => {
    expect(shareRetained(0, 10)).toBe(1);
    expect(shareRetained(1e-6, 10)).toBeCloseTo(1, 6);
    expect(shareRetained(1000, 10)).toBeCloseTo(0.01, 9);
    // Second implementation: Euler steps of dN/dt = 1/T − N/τ.
    let left = 0;
    const steps = 200000;
    for (let step = 0; step < steps; step++) left += 1 / steps - (left * 30) / steps / 20;
    expect(shareRetained(30, 20)).toBeCloseTo(left, 5);
  });
});
