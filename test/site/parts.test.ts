import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { absenceSentences } from '../../pipeline/measure/absence.ts';
import { quantities } from '../../pipeline/measure/quantities.ts';
import { printedReading, spikeValues } from '../../site/cell/view.ts';
import { bytes, cutTogether, longDate, mondayOf, number, withUnit } from '../../site/format.ts';
import { relativeLink } from '../../site/links.ts';
import { pageNames } from '../../site/names.ts';
import { escaped, resolvedHtml, withFigures } from '../../site/notes.ts';
import { sizesText } from '../../site/sizes.ts';
import { readState, type TableState, writeState } from '../../site/table-state.ts';
import { pieces } from '../../site/words.ts';

describe('links between pages', () => {
  const cases: [from: string, to: string, link: string][] = [
    ['index.html', 'index.html', 'index.html'],
    ['index.html', 'cells/index.html', 'cells/index.html'],
    ['cells/index.html', 'index.html', '../index.html'],
    ['cells/index.html', 'cells/a/index.html', 'a/index.html'],
    ['cells/a/index.html', 'cells/b/index.html', '../b/index.html'],
    ['cells/a/index.html', 'notes/index.html#x', '../../notes/index.html#x'],
    ['notes/index.html', 'cells/index.html?rig=a/b#t', '../cells/index.html?rig=a/b#t'],
  ];
  test.each(cases)('from %s to %s is %s', (from, to, link) => expect(relativeLink(from, to)).toBe(link));
  test.each(['', '/index.html', 'cells/', 'https://example.org/a.html', '#top'])('%j is refused', (to) =>
    expect(() => relativeLink('index.html', to)).toThrow(RangeError),
  );
  test('a link resolves to its target, wherever the site lies', () => {
    const name = fc.stringMatching(/^[a-z]{1,4}$/);
    const file = fc.array(name, { minLength: 1, maxLength: 4 }).map((parts) => `${parts.join('/')}.html`);
    const place = fc.constantFrom('file:///share/lab/', 'http://localhost/lab/cells/', 'http://localhost/');
    fc.assert(
      fc.property(place, file, file, (root, from, to) => {
        expect(new URL(relativeLink(from, to), root + from).href).toBe(root + to);
      }),
      { seed: 11 },
    );
  });
});

describe('names of pages', () => {
  test('a plain id is its own name', () =>
    expect(pageNames(['2026-03-12-s2c1', 'old-07~2'])).toEqual(
      new Map([
        ['2026-03-12-s2c1', '2026-03-12-s2c1'],
        ['old-07~2', 'old-07~2'],
      ]),
    ));
  test('names are safe on any file system and never meet, whatever the ids', () =>
    fc.assert(
      fc.property(fc.uniqueArray(fc.string({ unit: 'grapheme', minLength: 1, maxLength: 90 })), (ids) => {
        const names = [...pageNames(ids).values()];
        expect(names).toHaveLength(ids.length);
        for (const name of names) {
          expect(name).toMatch(/^[A-Za-z0-9_~-][A-Za-z0-9._~-]*$/);
          expect(name).not.toMatch(/\.$/);
          expect(name.length).toBeLessThanOrEqual(64);
        }
        expect(new Set(names.map((name) => name.toLowerCase())).size).toBe(ids.length);
      }),
      { seed: 3 },
    ));
  test('ids that differ only in case, and names that Windows keeps for itself, get a digest', () => {
    const names = pageNames(['S1', 's1', 'con', 'aux.1', '../up', 'a/b', 'a b']);
    for (const name of names.values()) expect(name).toMatch(/-[0-9a-f]{8}$/);
  });
});

describe('state in the address', () => {
  const choices = { standing: ['sound', 'caution'], rig: ['a', 'b', ''] };
  const columns = ['cell', 'date', 'rheobase_pa'];
  test('an empty address is the plain table, and the plain table an empty address', () => {
    const state = readState('', choices, columns);
    expect(state).toEqual({ words: '', chosen: {}, sort: { column: 'cell', descending: false } });
    expect(writeState(state, columns)).toBe('');
  });
  test('what the table does not hold is ignored', () =>
    expect(readState('?standing=sound&standing=perfect&colour=red&sort=mood.desc', choices, columns)).toEqual({
      words: '',
      chosen: { standing: ['sound'] },
      sort: { column: 'cell', descending: false },
    }));
  test('what was written is read again', () => {
    const state = fc.record({
      words: fc.string().map((text) => text.trim()),
      chosen: fc.record(
        {
          standing: fc.uniqueArray(fc.constantFrom('sound', 'caution'), { minLength: 1 }),
          rig: fc.uniqueArray(fc.constantFrom('a', 'b', ''), { minLength: 1 }),
        },
        { requiredKeys: [] },
      ),
      sort: fc.record({ column: fc.constantFrom(...columns), descending: fc.boolean() }),
    });
    fc.assert(
      fc.property(state, (one) => {
        expect(readState(writeState(one as TableState, columns), choices, columns)).toEqual(one);
      }),
      { seed: 5 },
    );
  });
});

describe('numbers and dates as printed', () => {
  test.each([
    [0, 1, '0.0'],
    [-0.04, 1, '0.0'],
    [-68.24, 1, '−68.2'],
    [9999, 0, '9999'],
    [12345.6, 1, '12\u202f345.6'],
    [1234567, 0, '1\u202f234\u202f567'],
  ])('%f with %i decimals is %s', (value, decimals, text) => expect(number(value, decimals)).toBe(text));
  // JCGM 100:2008, 7.2.6 (from memory): m = 100.021 47 g with u = 0.35 mg; R = 10.057 62 Ω with u = 27 mΩ becomes 10.058 Ω;
  // two significant digits of the uncertainty at most, the value cut at the same place.
  test.each([
    [100.02147, 0.00035, 5, '100.02147', '0.00035'],
    [10.05762, 0.027, 5, '10.058', '0.027'],
    [-68.2412, 0.372, 1, '−68.2', '0.4'],
    [-68.2412, 0.372, 3, '−68.24', '0.37'],
    [345.6, 123.4, 1, '350', '120'],
    [345.6, 9.96, 3, '346', '10'],
    [1.2346, 0.0996, 3, '1.23', '0.10'],
    [-68.24, 0.003, 1, '−68.2', '0.1'],
    [0.25, 0, 1, '0.3', '0.0'],
    [12_345, 1234, 0, '12\u202f300', '1200'],
    [-0.02, 0.4, 1, '0.0', '0.4'],
  ])('%d ± %d with at most %i decimals is %s ± %s', (value, u95, most, text, half) =>
    expect(cutTogether(value, u95, most)).toMatchObject({ value: text, u95: half }),
  );
  test('a half-width that is not known is not printed', () => {
    expect(cutTogether(1.25, undefined, 1)).toEqual({ value: '1.3', u95: '', decimals: 1 });
    expect(cutTogether(1.25, Number.NaN, 1).u95).toBe('');
  });
  test('cut together, value ± half-width still says within half a place what it said before', () =>
    fc.assert(
      fc.property(
        fc.double({ min: -900, max: 900, noNaN: true }),
        fc.double({ min: 1e-4, max: 500, noNaN: true }),
        fc.integer({ min: 0, max: 4 }),
        (value, u95, most) => {
          const plain = (text: string): number => Number(text.replace('−', '-').replaceAll('\u202f', ''));
          const cut = cutTogether(value, u95, most);
          const half = 0.5 * 10 ** -cut.decimals * 1.001;
          expect(Math.abs(plain(cut.value) - value)).toBeLessThanOrEqual(half);
          expect(plain(cut.u95)).toBeGreaterThan(0);
          expect(cut.decimals).toBeLessThanOrEqual(most);
          expect(
            cut.u95
              .replace(/^[0.]+/, '')
              .replace('.', '')
              .replaceAll('\u202f', '')
              .replace(/0+$/, '').length,
          ).toBeLessThanOrEqual(2);
          if (u95 >= half) expect(Math.abs(plain(cut.u95) - u95)).toBeLessThanOrEqual(half);
        },
      ),
      { seed: 21 },
    ));
  test('a reading in print: nothing stands where nothing is known', () => {
    expect(printedReading('peak_mv', { value: 31.26 })).toEqual({ value: '31.3', u95: '', sd: '', n: '' });
    expect(printedReading('peak_mv', { value: null, why: 'no-spikes' })).toBeNull();
    expect(printedReading('spikes', { value: 3, n: 4, u95: 2 })).toEqual({ value: '3', u95: '', sd: '', n: '4' });
  });
  test('a half-width is printed of every quantity whose entry says how it is had, and of no other', () => {
    for (const { id, uncertainty } of quantities)
      expect(printedReading(id, { value: 1, u95: 0.5 })!.u95 !== '', id).toBe(uncertainty !== undefined);
  });
  test('every number of a spike, or why there is none', () =>
    expect(
      spikeValues({
        spike: 0,
        values: { threshold_mv: -45.23, peak_mv: null, apd50_ms: null },
        why: { peak_mv: 'clipped', apd50_ms: 'not-this-class' },
        phases: [],
      }).map((one) => [one.id, one.printed?.value ?? one.why]),
    ).toEqual([
      ['threshold_mv', '−45.2'],
      ['peak_mv', absenceSentences.clipped],
    ]));
  test('a unit stands after a space that does not break', () =>
    expect(withUnit('peak_mv', 31.26)).toBe('31.3\u00a0mV'));
  test('sizes of files', () =>
    expect([999, 1500, 45_200, 3_400_000].map(bytes)).toEqual([
      '999\u00a0B',
      '1.5\u00a0kB',
      '45\u00a0kB',
      '3.4\u00a0MB',
    ]));
  test('dates', () => {
    expect(longDate('2026-03-09')).toBe('9 March 2026');
    expect(longDate('some day')).toBe('some day');
    expect(['2026-03-09', '2026-03-15', '2026-03-16', '2026-01-01'].map(mondayOf)).toEqual([
      '2026-03-09',
      '2026-03-09',
      '2026-03-16',
      '2025-12-29',
    ]);
  });
  test('cells are never counted without their subjects', () => {
    expect(sizesText({ cells: 0, subjects: 0, withoutSubject: 0 })).toBe('No cell');
    expect(sizesText({ cells: 1, subjects: 1, withoutSubject: 0 })).toBe('1 cell from 1 subject');
    expect(sizesText({ cells: 3, subjects: 0, withoutSubject: 3 })).toBe('3 cells (no subject stated)');
    expect(sizesText({ cells: 9, subjects: 2, withoutSubject: 1 })).toBe(
      '9 cells from 2 subjects (1 cell without a stated subject)',
    );
  });
});

describe('symbols', () => {
  const marked = (text: string) =>
    pieces(text)
      .map((piece) => (piece.lowered ? `<${piece.text}>` : piece.text))
      .join('');
  test.each([
    ['', ''],
    ['E_Na − V_peak', 'E<Na> − V<peak>'],
    ['ln([Na]_out/[Na]_in)', 'ln([Na]<out>/[Na]<in>)'],
    ['dV_base/dt', 'dV<base>/dt'],
    ['(I_{k+1} − I_k)', '(I<k+1> − I<k>)'],
    ['resting_potential_mv stays', 'resting_potential_mv stays'],
  ])('%j becomes %j', (text, expected) => expect(marked(text)).toBe(expected));
});

describe('notes on the site', () => {
  const almanac = {
    cellById: new Map([['a/b', { id: 'a/b', page: 'cells/a-b/index.html' }]]),
    noteById: new Map([['one', { id: 'one', page: 'notes/one/index.html' }]]),
  } as never;
  const link = (to: string) => `../../${to}`;
  const images = {
    'notes/p 1.png': { file: 'assets/p.webp', width: 10, height: 5 },
    'notes/bad.png': { failure: 'not a picture' },
  };
  const resolve = (html: string) => resolvedHtml(html, almanac, images, link);
  test.each([
    ['<a href="cell:a%2Fb">x</a>', '<a href="../../cells/a-b/index.html">x</a>'],
    ['<a href="note:one#part">x</a>', '<a href="../../notes/one/index.html#part">x</a>'],
    ['<a href="quantity:peak_mv">x</a>', '<a href="../../methods/index.html#quantity-peak_mv">x</a>'],
    ['<input type="checkbox" disabled> a', '<span class="task">to do:</span> a'],
    ['<input type="checkbox" checked disabled> b', '<span class="task">done:</span> b'],
    ['<a href="#fn-1" id="r">x</a>', '<a href="#fn-1" id="r">x</a>'],
    ['<a href="https://example.org/?a=1&amp;b=2">x</a>', '<a href="https://example.org/?a=1&amp;b=2">x</a>'],
    ['<a href="cell:gone">x</a>', '<span class="lost" title="leads nowhere: cell:gone">x</span>'],
    ['<a href="javascript:alert(1)">x</a>', '<span class="lost" title="leads nowhere: javascript:alert(1)">x</span>'],
    [
      '<img src="file:notes/p%201.png" alt="A">',
      '<img src="../../assets/p.webp" width="10" height="5" loading="lazy" alt="A">',
    ],
  ])('%s', (html, expected) => expect(resolve(html)).toBe(expected));
  test('a picture that cannot be shown says so', () => {
    expect(resolve('<img src="file:notes/bad.png" alt="">')).toMatch(/could not be shown: not a picture/);
    expect(resolve('<img src="file:notes/none.png" alt="">')).toMatch(/notes\/none.png could not be shown/);
  });
  test('figures stand in their places', () =>
    expect(withFigures('<p>a</p><figure data-figure="1"></figure>', (index) => `<b>${index}</b>`)).toBe(
      '<p>a</p><figure><b>1</b></figure>',
    ));
  test('escaping', () => expect(escaped('<"&>')).toBe('&lt;&quot;&amp;&gt;'));
});
