import { describe, expect, it } from 'vitest';
import { broken, type Limit, score } from './score.ts';
import { readingsOf, rigs, trials } from './voltage-clamp.ts';

const all = trials({ seeds: 1, quick: true });

// The figures promised for 20 kHz and more with a filter of 5 to 10 kHz and moderate noise.
const limits: Limit[] = [
  { quantity: 'access_resistance_mohm', condition: /./, within: 0.05, measure: 'relative' },
  { quantity: 'membrane_resistance_mohm', condition: /./, within: 0.03, measure: 'relative' },
  { quantity: 'cell_capacitance_pf', condition: /./, within: 0.05, measure: 'relative' },
  { quantity: 'holding_current_pa', condition: /./, within: 3, measure: 'absolute' },
];

describe('voltage clamp of known truth', () => {
  for (const limit of limits)
    it(`keeps ${limit.quantity} within ${limit.measure === 'relative' ? `${100 * limit.within} %` : limit.within}`, () => {
      expect(broken(limit, all)).toEqual([]);
    });

  it('holds the truth in its intervals', () => {
    // Of 48 intervals at 95 %, 40 or fewer would hold by chance in less than one of 200 runs (binomial).
    expect(score(all).held).toBeGreaterThan(40 / 48);
    // And they are no wider than they must be to say something.
    const access = all.filter(({ quantity }) => quantity === 'access_resistance_mohm');
    for (const { u95, truth } of access) expect(u95! / truth).toBeLessThan(0.08);
  });
});

describe('a transient that the amplifier took away', () => {
  const circuit = { name: 'compensated', access_mohm: 10, membrane_mohm: 200, pf: 100 };
  const rig = { ...rigs[0]!, pulses: 4 };
  const read = (transient_taken: number, taken_tau: number) =>
    readingsOf(circuit, { ...rig, transient_taken, taken_tau }, 3).readings;

  it('gives no access and no capacitance, and the resistance in all', () => {
    for (const [share, tau] of [
      [0.7, 1.5],
      [0.7, 0.6],
      [1, 1],
      [1, 1.3],
      [1.1, 1],
    ] as const) {
      const readings = read(share, tau);
      for (const id of ['access_resistance_mohm', 'cell_capacitance_pf']) expect(readings[id]!.value).toBeNull();
      expect(readings['access_resistance_mohm']!.note).toMatch(/compensated|takes more away/);
      const total = readings['membrane_resistance_mohm']!;
      if (total.value !== null) expect(total.note).toContain('total');
    }
  });
});
