import { describe, expect, it } from 'vitest';
import { broken, type Limit, score } from './score.ts';
import { trials } from './voltage-clamp.ts';

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
