/**
 * The filter in closed form and the fit of test pulses against SciPy. Runs where a Python with SciPy is found; elsewhere
 * it is skipped and says so.
 */
import { spawnSync } from 'node:child_process';
import { fileURLToPath } from 'node:url';
import { describe, expect, test } from 'vitest';
import { besselLowPass, type FilteredStep } from '../../pipeline/signal/bessel.ts';
import { numberIn } from '../measure/made.ts';
import { findPython } from '../tooling/prepare.ts';
import { protocol, recordClamp } from '../truth/clamp-recorder.ts';
import { readingsOf, rigs } from '../truth/voltage-clamp.ts';

const python = findPython();
const script = fileURLToPath(new URL('clamp_reference.py', import.meta.url));
if (!python) console.warn('No Python with SciPy found: the checks of the clamp against SciPy are skipped.');

function scipy<T>(requests: Record<string, unknown>[]): T[] {
  const { status, stdout, stderr } = spawnSync(python!, [script], {
    input: JSON.stringify(requests),
    encoding: 'utf8',
    maxBuffer: 1 << 28,
  });
  if (status !== 0) throw new Error(`SciPy could not answer: ${stderr}`);
  return JSON.parse(stdout) as T[];
}

describe.skipIf(!python)('a filtered step of the command', () => {
  test('comes out of the closed form as out of SciPy’s Bessel filter', () => {
    const cases = [
      { corner_khz: 8, tau_ms: 0.9 },
      { corner_khz: 2, tau_ms: 0.1 },
      { corner_khz: 10, tau_ms: 6 },
    ];
    const ms = Array.from({ length: 200 }, (_, i) => i * 0.01);
    const answers = scipy<Record<'step' | 'impulse' | 'decay', number[]>>(
      cases.map((one) => ({ task: 'responses', ...one, ms })),
    );
    cases.forEach(({ corner_khz, tau_ms }, k) => {
      const filter = besselLowPass(corner_khz);
      const own: FilteredStep = { impulse: 0, impulseSlope: 0, step: 0, decay: 0, decayByLogTau: 0 };
      ms.forEach((time, i) => {
        filter.at(time, tau_ms, own);
        for (const id of ['step', 'impulse', 'decay'] as const)
          expect(Math.abs(own[id] - answers[k]![id][i]!)).toBeLessThan(id === 'impulse' ? 1e-4 : 1e-6);
      });
    });
  });

  // Brute simulation of circuit and filter under SciPy's own least squares, on the same samples.
  test('gives the circuit that a slow least-squares fit gives', () => {
    const circuit = { name: 'reference', access_mohm: 15, membrane_mohm: 250, pf: 60 };
    const rig = { ...rigs[0]!, pulses: 1, noise_pa: 1, pipette_pf: 0, command_us: 2 };
    const { edges } = protocol(rig);
    const { readings } = readingsOf(circuit, rig, 5);
    const { current } = recordClamp(circuit, rig, 5);
    const [found] = scipy<number[]>([
      {
        task: 'fit',
        current: Array.from(current),
        rate_hz: rig.rate_hz,
        corner_khz: rig.filter_khz,
        mv: edges.map(({ mv }) => mv),
        edges_s: edges.map(({ at_s }) => at_s),
        start: [10, 200, 100, -40, 0.001, 0.001],
      },
    ]);
    // The slow fit alone recovers the circuit it was made from, to 1 %.
    expect(Math.abs(found![0]! / 15 - 1)).toBeLessThan(0.01);
    expect(Math.abs(found![2]! / 60 - 1)).toBeLessThan(0.01);
    const ids = ['access_resistance_mohm', 'membrane_resistance_mohm', 'cell_capacitance_pf'];
    ids.forEach((id, k) => {
      expect(Math.abs(numberIn(readings, id) - found![k]!)).toBeLessThan(readings[id]!.u95!);
      expect(Math.abs(numberIn(readings, id) / found![k]! - 1)).toBeLessThan(0.02);
    });
  });
});
